/* Reports and single values of the rig file. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* By place, then as they were made. */
static int by_place(const void *a, const void *b)
{
    const long *one = a, *other = b;
    if (one[0] != other[0])
        return one[0] < other[0] ? -1 : 1;
    return one[1] < other[1] ? -1 : one[1] > other[1];
}

void loading_sort(struct loading *l)
{
    struct problems *p = l->problems;
    long order[PROBLEMS_MAX][2]; /* place, index of the mark              */
    size_t first = l->n_marks > 0 ? l->mark[0].start : 0;
    if (l->n_marks < 2 || l->n_marks < p->n)
        return; /* nothing to sort, or not all are ours */
    char *copy = malloc(p->len - first);
    if (copy == NULL)
        return;
    memcpy(copy, p->text + first, p->len - first);
    for (int i = 0; i < l->n_marks; i++) {
        order[i][0] = l->mark[i].place;
        order[i][1] = i;
    }
    qsort(order, (size_t)l->n_marks, sizeof *order, by_place);
    size_t len = first, last = 0, last_len = 0;
    for (int i = 0; i < l->n_marks; i++) {
        const char *text = copy + l->mark[order[i][1]].start - first;
        size_t n = l->mark[order[i][1]].len;
        if (n == last_len && memcmp(p->text + last, text, n) == 0) {
            p->n--;
            continue;
        }
        memcpy(p->text + len, text, n);
        last = len;
        last_len = n;
        len += n;
    }
    p->len = len;
    p->text[len] = '\0';
    free(copy);
}

/* Remembers the report that was added since `start`. */
static void mark(struct loading *l, int place, size_t start)
{
    if (l->n_marks == PROBLEMS_MAX)
        return;
    l->mark[l->n_marks].place =
        place <= LOADING_CHANGE ? LOADING_BYTES_MAX - place : place;
    l->mark[l->n_marks].start = start;
    l->mark[l->n_marks++].len = l->problems->len - start;
}

static void report_change(struct loading *l, int i, const char *what,
                          const char *remedy)
{
    char text[1600];
    snprintf(text, sizeof text,
             "--set %.200s: error: %.600s\n       = %.600s\n",
             l->changes[i].path, what, remedy);
    problems_append(l->problems, text);
}

static void report(struct loading *l, const cJSON *at, bool at_key,
                   const char *fmt, va_list args)
{
    char text[1200], none[] = "";
    vsnprintf(text, sizeof text, fmt, args);
    char *remedy = none;
    for (char *s = text; (s = strstr(s, "; ")) != NULL; s += 2)
        remedy = s;
    if (remedy != none) {
        *remedy = '\0';
        remedy += 2;
    }
    int place = at->valueint;
    size_t start = l->problems->len;
    if (place <= LOADING_CHANGE) {
        report_change(l, LOADING_CHANGE - place, text, remedy);
        mark(l, place, start);
        return;
    }
    size_t offset = place < 0 ? 0 : (size_t)place;
    if (at_key)
        offset = textpos_key(l->text, offset);
    const struct textpos_report r = {l->path, l->raw, l->len, text, remedy};
    textpos_report(l->problems, &r, offset);
    mark(l, (int)offset, start);
}

void loading_error(struct loading *l, const cJSON *at, const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    report(l, at, false, fmt, args);
    va_end(args);
}

void loading_error_key(struct loading *l, const cJSON *at, const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    report(l, at, true, fmt, args);
    va_end(args);
}

void loading_unknown(struct loading *l, const cJSON *at, bool at_key,
                     const char *what, const char *name,
                     const char *const *list)
{
    char all[400] = "";
    size_t n = 0;
    const char *nearest = textpos_nearest(name, list);
    void (*error)(struct loading *, const cJSON *, const char *, ...) =
        at_key ? loading_error_key : loading_error;
    if (nearest != NULL) {
        error(l, at, "unknown %s \"%.64s\"; did you mean \"%s\"?", what, name,
              nearest);
        return;
    }
    for (int i = 0; list[i] != NULL && n < sizeof all - 70; i++)
        n += (size_t)snprintf(all + n, sizeof all - n, "%s%.60s",
                              i > 0 ? ", " : "", list[i]);
    error(l, at, "unknown %s \"%.64s\"; known here: %s", what, name,
          list[0] == NULL ? "none" : all);
}

const cJSON *loading_get(const cJSON *object, const char *key)
{
    return cJSON_GetObjectItemCaseSensitive(object, key);
}

const char *loading_text(const cJSON *node)
{
    return cJSON_IsString(node) ? node->valuestring : "";
}

bool loading_quantity(struct loading *l, const cJSON *node, const char *to,
                      enum quantity_role role, double *value)
{
    struct err err;
    if (cJSON_IsNumber(node)) {
        *value = node->valuedouble;
        return true;
    }
    if (!cJSON_IsString(node))
        return false;
    if (quantity_parse(l->units, node->valuestring, to, role, value, &err) !=
        ST_OK) {
        loading_error(l, node, "%s", err.text);
        return false;
    }
    if (isfinite(*value))
        return true;
    loading_error(l, node, "\"%.64s\" is too large; give a smaller value",
                  node->valuestring);
    return false;
}

bool loading_size(struct loading *l, const cJSON *node, const char *to,
                  bool is_positive, double *value)
{
    if (!loading_quantity(l, node, to, QUANTITY_DIFFERENCE, value))
        return false;
    if (*value > 0 || (*value == 0 && !is_positive))
        return true;
    const char *key = node->string != NULL ? node->string : "this";
    loading_error(l, node, "\"%.64s\" must %s; give it in %s", key,
                  is_positive ? "be greater than 0" : "not be below 0", to);
    return false;
}

/* The row's node in the object (NULL if absent) and its default. */
static const cJSON *find(const cJSON *object, const char *path,
                         const char **default_text)
{
    const struct table_row *row = table_find(path);
    *default_text = row->default_text;
    return loading_get(object, table_key(row));
}

bool loading_time(struct loading *l, const cJSON *object, const char *row,
                  double least_s, int64_t *ns)
{
    const char *standard;
    const cJSON *node = find(object, row, &standard);
    struct err err;
    double s;
    if (node == NULL)
        return standard != NULL &&
               quantity_time_ns(l->units, standard, ns, &err) == ST_OK;
    if (!loading_quantity(l, node, "s", QUANTITY_DIFFERENCE, &s))
        return false;
    if (s < least_s || !(s < 4e9)) {
        loading_error(l, node,
                      "\"%.64s\" must be a time from %g s to 4e9 s; "
                      "write it like \"20 ms\"",
                      node->string, least_s);
        return false;
    }
    *ns = llround(s * 1e9);
    return true;
}

bool loading_bytes(struct loading *l, const cJSON *object, const char *row,
                   int64_t *bytes)
{
    const char *standard;
    const cJSON *node = find(object, row, &standard);
    struct err err;
    double n;
    if (node == NULL) {
        if (quantity_parse(l->units, standard, "B", QUANTITY_DIFFERENCE, &n,
                           &err) != ST_OK)
            return false;
    } else if (!loading_quantity(l, node, "B", QUANTITY_DIFFERENCE, &n)) {
        return false;
    }
    if (n < 0 || n > 1e18) {
        loading_error(l, node,
                      "\"%.64s\" must be from 0 B to 1e18 B; write "
                      "it like \"4 MiB\"",
                      node->string);
        return false;
    }
    *bytes = llround(n);
    return true;
}

bool loading_integer(struct loading *l, const cJSON *object, const char *row,
                     int least, int most, int *value)
{
    const char *standard;
    const cJSON *node = find(object, row, &standard);
    struct err err;
    double n;
    if (node == NULL) {
        if (standard == NULL ||
            quantity_parse(l->units, standard, "1", QUANTITY_POINT, &n, &err) !=
                ST_OK)
            return false;
        *value = (int)n;
        return true;
    }
    if (!cJSON_IsNumber(node) || node->valuedouble != floor(node->valuedouble))
        return false;
    n = node->valuedouble;
    if (least == most && n != least) {
        loading_error(l, node, "\"%.64s\" must be %d; no other is built",
                      node->string, least);
        return false;
    }
    if (n < least || n > most) {
        loading_error(l, node,
                      "\"%.64s\" must be a whole number from %d to "
                      "%d; correct it",
                      node->string, least, most);
        return false;
    }
    *value = (int)n;
    return true;
}
