/* Unknown and planned keys and wrong types, by the settings table. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { PATH_SIZE = 128, KEYS_MAX = 64 };

/* The row of a key below a path: its own, or that of any name. */
static const struct table_row *row_of(const char *path, const char *key)
{
    char full[PATH_SIZE];
    const char *dot = path[0] == '\0' ? "" : ".";
    const struct table_row *row = NULL;
    if (strcmp(key, "*") != 0 && strchr(key, '.') == NULL &&
        snprintf(full, sizeof full, "%s%s%s", path, dot, key) < PATH_SIZE)
        row = table_find(full);
    if (row == NULL) {
        snprintf(full, sizeof full, "%s%s*", path, dot);
        row = table_find(full);
    }
    return row;
}

static void unknown_key(struct loading *l, const cJSON *node, const char *path)
{
    const char *keys[KEYS_MAX + 1] = {NULL};
    const struct table_row *row;
    int n = 0;
    for (int i = 0; n < KEYS_MAX && (row = table_child(path, i)) != NULL; i++)
        if (!row->is_planned)
            keys[n++] = table_key(row);
    loading_unknown(l, node, true, "setting", node->string, keys);
}

static bool is_choice(const char *choices, const char *text)
{
    size_t len = strlen(text);
    for (const char *s = choices; *s != '\0';) {
        size_t n = strcspn(s, "|");
        if (n == len && strncmp(s, text, n) == 0)
            return true;
        s += n + (s[n] == '|');
    }
    return false;
}

/* Words that are planned are no choices, yet refused by their name. */
static bool is_planned_choice(const struct table_row *row, const char *text)
{
    if (strcmp(row->path, "sensors.*.time.stamp") == 0)
        return strcmp(text, "counter") == 0;
    return strcmp(row->path, "tracks.*.state.model") == 0 &&
           is_choice("coordinated-turn", text);
}

static void unknown_choice(struct loading *l, const cJSON *node,
                           const struct table_row *row)
{
    char words[12][32] = {""};
    const char *list[13] = {NULL};
    int n = 0;
    for (const char *s = row->of; *s != '\0' && n < 12; n++) {
        size_t len = strcspn(s, "|");
        snprintf(words[n], sizeof words[n], "%.*s", (int)len, s);
        list[n] = words[n];
        s += len + (s[len] == '|');
    }
    char what[64];
    snprintf(what, sizeof what, "%s", table_key(row));
    loading_unknown(l, node, false, what, node->valuestring, list);
}

static void check_choice(struct loading *l, const cJSON *node,
                         const struct table_row *row)
{
    if (is_planned_choice(row, node->valuestring))
        loading_error(l, node,
                      "\"%s\" is planned but not built yet; use "
                      "another %s",
                      node->valuestring, table_key(row));
    else if (!is_choice(row->of, node->valuestring))
        unknown_choice(l, node, row);
}

static bool has_type(const cJSON *node, const struct table_row *row)
{
    switch (row->value) {
    case TABLE_OBJECT:
    case TABLE_NAMED:
        return cJSON_IsObject(node);
    case TABLE_TEXT:
    case TABLE_CHOICE:
        return cJSON_IsString(node);
    case TABLE_INTEGER:
        return cJSON_IsNumber(node) &&
               node->valuedouble == floor(node->valuedouble);
    case TABLE_NUMBER:
        return cJSON_IsNumber(node);
    case TABLE_QUANTITY:
        return cJSON_IsNumber(node) || cJSON_IsString(node);
    case TABLE_ANY:
        return !cJSON_IsNull(node) && !cJSON_IsBool(node);
    }
    return true;
}

static void check_value(struct loading *l, const cJSON *node,
                        const struct table_row *row, const char *key);

static void check_keys(struct loading *l, const cJSON *object, const char *path)
{
    const cJSON *node;
    cJSON_ArrayForEach(node, object)
    {
        const struct table_row *row = row_of(path, node->string);
        if (row == NULL)
            unknown_key(l, node, path);
        else if (row->is_planned)
            loading_error_key(l, node,
                              "\"%s\" is planned but not built yet; "
                              "remove it",
                              node->string);
        else
            check_value(l, node, row, node->string);
    }
}

/* "u" as an object and the like: known forms that are not built. */
static bool is_planned_form(const cJSON *node, const struct table_row *row)
{
    if (!cJSON_IsObject(node))
        return false;
    return strcmp(row->path, "sensors.*.time.delay") == 0 &&
           loading_get(node, "mean") != NULL;
}

static void check_value(struct loading *l, const cJSON *node,
                        const struct table_row *row, const char *key)
{
    const cJSON *each;
    if (row->is_list && cJSON_IsArray(node)) {
        const struct table_row one = {row->path, row->value, false,
                                      false,     row->of,    row->default_text,
                                      row->help};
        if (node->child == NULL)
            loading_error(l, node, "\"%.64s\" is an empty list; give a value",
                          key);
        cJSON_ArrayForEach(each, node) check_value(l, each, &one, key);
        return;
    }
    if (is_planned_form(node, row)) {
        loading_error(l, node,
                      "\"%.64s\" as an object is planned but not "
                      "built yet; give one value",
                      key);
        return;
    }
    if (!has_type(node, row)) {
        loading_error(l, node, "\"%.64s\" must be %s; meant here: %.*s", key,
                      table_takes(row), (int)strcspn(row->help, ";"),
                      row->help);
        return;
    }
    if (row->value == TABLE_CHOICE)
        check_choice(l, node, row);
    if (row->value == TABLE_OBJECT || row->value == TABLE_NAMED)
        check_keys(l, node, row->path);
}

void loading_check(struct loading *l)
{
    check_keys(l, l->root, "");
}
