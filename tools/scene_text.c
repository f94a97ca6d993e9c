/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene_text.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "config/syntax.h"

enum { WHAT_SIZE = 600 };

/* --- places --------------------------------------------------------------- */

static void enter(struct scene_text *r, const cJSON *value)
{
    const cJSON *here = r->at[r->depth];
    if (r->depth < TEXTPOS_DEPTH_MAX)
        r->at[++r->depth] = value == NULL ? here : value;
}

void scene_text_enter(struct scene_text *r, const char *key)
{
    enter(r, cJSON_GetObjectItemCaseSensitive(r->at[r->depth], key));
}

void scene_text_enter_at(struct scene_text *r, int i)
{
    enter(r, cJSON_GetArrayItem(r->at[r->depth], i));
}

void scene_text_leave(struct scene_text *r)
{
    r->depth--;
}

static void report_at(struct scene_text *r, size_t at, const char *what,
                      const char *remedy)
{
    struct textpos_report report = {r->path, r->text, r->len, what, remedy};
    textpos_report(r->problems, &report, at);
    r->is_bad = true;
}

static void report(struct scene_text *r, bool is_key, const char *remedy,
                   const char *what)
{
    size_t at = (size_t)r->at[r->depth]->valueint;
    report_at(r, is_key ? textpos_key(r->plain, at) : at, what, remedy);
}

void scene_text_refuse(struct scene_text *r, const char *remedy,
                       const char *fmt, ...)
{
    char what[WHAT_SIZE];
    va_list list;
    va_start(list, fmt);
    vsnprintf(what, sizeof what, fmt, list);
    va_end(list);
    report(r, false, remedy, what);
}

void scene_text_refuse_key(struct scene_text *r, const char *remedy,
                           const char *fmt, ...)
{
    char what[WHAT_SIZE];
    va_list list;
    va_start(list, fmt);
    vsnprintf(what, sizeof what, fmt, list);
    va_end(list);
    report(r, true, remedy, what);
}

void scene_text_refuse_name(struct scene_text *r, bool is_key, const char *what,
                            const char *name, const char *const *list)
{
    char remedy[WHAT_SIZE] = "one of:", full[WHAT_SIZE];
    const char *near = textpos_nearest(name, list);
    if (near != NULL) {
        snprintf(remedy, sizeof remedy, "did you mean \"%s\"?", near);
    } else {
        for (int i = 0; list[i] != NULL; i++) {
            size_t n = strlen(remedy);
            snprintf(remedy + n, sizeof remedy - n, "%s %s", i > 0 ? "," : "",
                     list[i]);
        }
    }
    snprintf(full, sizeof full, "\"%.64s\" is no %s", name, what);
    report(r, is_key, remedy, full);
}

/* --- the whole text ------------------------------------------------------- */

static void found_twice(void *ctx, size_t at, const char *name)
{
    char what[WHAT_SIZE];
    snprintf(what, sizeof what, "the key \"%s\" stands twice", name);
    report_at(ctx, at, what, "leave one out");
}

/* Sound JSON in r->plain, an object; false after a report. */
static bool is_sound(struct scene_text *r)
{
    size_t at;
    const char *what;
    long bad = textpos_bad_utf8(r->text, r->len);
    if (bad != TEXTPOS_NONE) {
        report_at(r, (size_t)bad, "this is no UTF-8", "save it as UTF-8");
        return false;
    }
    bad = textpos_strip(r->plain, r->len);
    if (bad != TEXTPOS_NONE) {
        report_at(r, (size_t)bad, "the comment does not end", "close it");
        return false;
    }
    if (!syntax_check(r->plain, &at, &what)) {
        report_at(r, at, what, NULL);
        return false;
    }
    textpos_duplicates(r->plain, found_twice, r);
    return !r->is_bad;
}

bool scene_text_init(struct scene_text *r, const char *path, const char *text,
                     size_t len, struct problems *problems)
{
    struct err err = {ST_NOMEM, "out of memory"};
    *r = (struct scene_text){
        .path = path, .text = text, .len = len, .problems = problems};
    r->plain = calloc(len + 1, 1);
    r->units = r->plain == NULL ? NULL : quantity_units_new(&err);
    if (r->units == NULL) {
        report_at(r, 0, err.text, NULL);
        return false;
    }
    memcpy(r->plain, text, len);
    if (!is_sound(r))
        return false;
    r->root = cJSON_ParseWithLength(r->plain, len);
    if (!cJSON_IsObject(r->root)) {
        report_at(r, 0, "a rehearsal is an object", "begin it with {");
        return false;
    }
    textpos_mark(r->root, r->plain);
    r->at[0] = r->root;
    return true;
}

void scene_text_fini(struct scene_text *r)
{
    cJSON_Delete(r->root);
    quantity_units_free(r->units);
    free(r->plain);
}

/* --- values --------------------------------------------------------------- */

static bool is_in(const char *name, const char *const *list)
{
    for (int i = 0; list[i] != NULL; i++)
        if (strcmp(name, list[i]) == 0)
            return true;
    return false;
}

bool scene_text_is_left_out(const struct scene_text *r, const char *name)
{
    return r->left_out != NULL && name != NULL && is_in(name, r->left_out);
}

bool scene_text_keys(struct scene_text *r, const cJSON *object,
                     const char *const *list)
{
    const cJSON *item;
    if (!cJSON_IsObject(object)) {
        scene_text_refuse(r, "write it in { }", "this must be an object");
        return false;
    }
    cJSON_ArrayForEach(item, object)
    {
        if (is_in(item->string, list))
            continue;
        scene_text_enter(r, item->string);
        scene_text_refuse_name(r, true, "key here", item->string, list);
        scene_text_leave(r);
    }
    return true;
}

bool scene_text_quantity(struct scene_text *r, const cJSON *value,
                         const char *unit, enum quantity_role role, double *out)
{
    struct err err;
    if (cJSON_IsNumber(value)) {
        *out = value->valuedouble;
        return true;
    }
    if (!cJSON_IsString(value)) {
        scene_text_refuse(r, NULL,
                          "this must be a number or a text with a unit, "
                          "like \"1.5 %s\"",
                          unit);
        return false;
    }
    if (quantity_parse(r->units, value->valuestring, unit, role, out, &err) ==
        ST_OK)
        return true;
    scene_text_refuse(r, NULL, "%s", err.text);
    return false;
}

bool scene_text_time(struct scene_text *r, const cJSON *value, int64_t *ns)
{
    double s = 0;
    if (!scene_text_quantity(r, value, "s", QUANTITY_DIFFERENCE, &s))
        return false;
    if (!(s >= 0 && s <= 1e9)) {
        scene_text_refuse(r, NULL, "the time %g s is outside 0 .. 1e9 s", s);
        return false;
    }
    *ns = llround(s * 1e9);
    return true;
}

bool scene_text_share(struct scene_text *r, const cJSON *value, double *out)
{
    if (!scene_text_quantity(r, value, "1", QUANTITY_DIFFERENCE, out))
        return false;
    if (*out >= 0 && *out <= 1)
        return true;
    scene_text_refuse(r, NULL, "the share %g is outside 0 .. 1", *out);
    return false;
}

const char *scene_text_string(struct scene_text *r, const cJSON *value)
{
    if (!cJSON_IsString(value)) {
        scene_text_refuse(r, "write it in quotation marks",
                          "this must be a text");
        return NULL;
    }
    return value->valuestring;
}
