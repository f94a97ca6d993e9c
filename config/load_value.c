/* Reports and single values of the rig file. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static void report_change(struct loading *l, int i, const char *what,
                          const char *remedy)
{
    char text[1600];
    snprintf(text, sizeof text, "--set %.200s: error: %.600s\n       = %.600s\n",
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
    if (place <= LOADING_CHANGE) {
        report_change(l, LOADING_CHANGE - place, text, remedy);
        return;
    }
    size_t offset = place < 0 ? 0 : (size_t)place;
    if (at_key)
        offset = textpos_key(l->text, offset);
    const struct textpos_report r = {l->path, l->raw, l->len, text, remedy};
    textpos_report(l->problems, &r, offset);
}

void loading_error(struct loading *l, const cJSON *at, const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    report(l, at, false, fmt, args);
    va_end(args);
}

void loading_error_key(struct loading *l, const cJSON *at, const char *fmt,
                       ...)
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
        loading_error(l, node, "\"%.64s\" must be a time from %g s to 4e9 s; "
                      "write it like \"20 ms\"", node->string, least_s);
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
        loading_error(l, node, "\"%.64s\" must be from 0 B to 1e18 B; write "
                      "it like \"4 MiB\"", node->string);
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
            quantity_parse(l->units, standard, "1", QUANTITY_POINT, &n,
                           &err) != ST_OK)
            return false;
        *value = (int)n;
        return true;
    }
    if (!cJSON_IsNumber(node))
        return false;
    n = node->valuedouble;
    if (n < least || n > most || n != floor(n)) {
        loading_error(l, node, "\"%.64s\" must be a whole number from %d to "
                      "%d; correct it", node->string, least, most);
        return false;
    }
    *value = (int)n;
    return true;
}
