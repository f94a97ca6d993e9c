/* What is laid over the tree before the checks: names in braces, changes,
 * and `like`. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "config/syntax.h"

enum { TEXT_SIZE = 1024, LIKE_MAX = 8, EXPAND_MAX = 256 };

/* "{1..6}" in a name; false if there is none. */
struct braces {
    char text[32];
    int first, last;
};

static bool braces_find(const char *name, struct braces *b)
{
    const char *s = strchr(name, '{'), *end = s ? strchr(s, '}') : NULL;
    int used = 0;
    if (end == NULL || end - s >= (long)sizeof b->text - 1)
        return false;
    snprintf(b->text, sizeof b->text, "%.*s", (int)(end - s) + 1, s);
    return sscanf(b->text, "{%5d..%5d}%n", &b->first, &b->last, &used) == 2 &&
           used == (int)strlen(b->text);
}

/* Copies `from` with the braces replaced by the number. */
static void braces_put(const struct braces *b, int i, const char *from,
                       char out[TEXT_SIZE])
{
    size_t n = 0, len = strlen(b->text);
    while (*from != '\0' && n + 12 < TEXT_SIZE) {
        if (strncmp(from, b->text, len) == 0) {
            n += (size_t)snprintf(out + n, TEXT_SIZE - n, "%d", i);
            from += len;
        } else {
            out[n++] = *from++;
        }
    }
    out[n] = '\0';
}

static bool replace(struct loading *l, char **text, const struct braces *b,
                    int i)
{
    char out[TEXT_SIZE];
    if (*text == NULL || strstr(*text, b->text) == NULL ||
        strlen(*text) >= TEXT_SIZE)
        return true;
    braces_put(b, i, *text, out);
    char *copy = cJSON_malloc(strlen(out) + 1);
    if (copy == NULL) {
        l->is_out_of_memory = true;
        return false;
    }
    memcpy(copy, out, strlen(out) + 1);
    cJSON_free(*text);
    *text = copy;
    return true;
}

/* Every key and text below the node. */
static void substitute(struct loading *l, cJSON *node, const struct braces *b,
                       int i)
{
    if (cJSON_IsString(node))
        replace(l, &node->valuestring, b, i);
    for (cJSON *child = node->child; child != NULL; child = child->next) {
        replace(l, &child->string, b, i);
        substitute(l, child, b, i);
    }
}

/* Adds a key; a node that cannot be added is freed. */
static void add(struct loading *l, cJSON *object, const char *key, cJSON *node)
{
    if (node != NULL && cJSON_AddItemToObject(object, key, node))
        return;
    cJSON_Delete(node);
    l->is_out_of_memory = true;
}

static void expand(struct loading *l, cJSON *group, cJSON *entry,
                   const struct braces *b)
{
    char name[TEXT_SIZE];
    for (int i = b->first; i <= b->last && !l->is_out_of_memory; i++) {
        braces_put(b, i, entry->string, name);
        const cJSON *other = loading_get(group, name);
        if (other != NULL) {
            loading_error_key(l, entry,
                              "\"%.64s\" makes \"%.64s\", which "
                              "stands in the file as well; rename one",
                              entry->string, name);
            continue;
        }
        cJSON *copy = cJSON_Duplicate(entry, 1);
        if (copy != NULL)
            substitute(l, copy, b, i);
        add(l, group, name, copy);
    }
}

void loading_expand(struct loading *l, cJSON *group)
{
    cJSON *next;
    struct braces b;
    if (!cJSON_IsObject(group))
        return;
    for (cJSON *entry = group->child; entry != NULL; entry = next) {
        next = entry->next;
        if (strchr(entry->string, '{') == NULL)
            continue;
        if (!braces_find(entry->string, &b) || b.last < b.first ||
            b.last - b.first >= EXPAND_MAX) {
            loading_error_key(l, entry,
                              "\"%.64s\" is not a row of names; "
                              "write it like \"laser{1..6}\", %d at most",
                              entry->string, EXPAND_MAX);
        } else {
            expand(l, group, entry, &b);
            next = entry->next;
        }
        cJSON_Delete(cJSON_DetachItemViaPointer(group, entry));
    }
}

static void mark(cJSON *node, int place)
{
    node->valueint = place;
    for (cJSON *child = node->child; child != NULL; child = child->next)
        mark(child, place);
}

/* The element of a list at this place from 0, or with this "name". */
static cJSON *element(const cJSON *list, const char *path, size_t len)
{
    size_t digits = strspn(path, "0123456789");
    if (digits == len && len > 0 && len < 6)
        return cJSON_GetArrayItem(list, (int)strtol(path, NULL, 10));
    for (cJSON *each = list->child; each != NULL; each = each->next) {
        const char *name = loading_text(loading_get(each, "name"));
        if (len > 0 && strlen(name) == len && strncmp(name, path, len) == 0)
            return each;
    }
    return NULL;
}

/* The child whose key begins the path; the longest wins, since names may
 * hold dots. */
static cJSON *step(const cJSON *node, const char *path, size_t *len)
{
    cJSON *best = NULL;
    *len = strcspn(path, ".");
    if (cJSON_IsArray(node))
        return element(node, path, *len);
    for (cJSON *child = node->child; child != NULL; child = child->next) {
        size_t n = child->string != NULL ? strlen(child->string) : 0;
        if (n > 0 && strncmp(path, child->string, n) == 0 &&
            (path[n] == '.' || path[n] == '\0') && (best == NULL || n > *len)) {
            best = child;
            *len = n;
        }
    }
    return best;
}

/* What a change's value means: JSON, or else a text. */
static cJSON *change_value(const struct settings_change *change)
{
    size_t at;
    const char *what;
    cJSON *node = NULL;
    if (syntax_check(change->value, &at, &what))
        node = cJSON_ParseWithOpts(change->value, NULL, 1);
    return node != NULL ? node : cJSON_CreateString(change->value);
}

static void no_such(struct loading *l, const cJSON *group, const cJSON *mine,
                    const char *what, const char *name)
{
    const char *list[LOADING_LIST_MAX + 1] = {NULL};
    int n = 0;
    const cJSON *each;
    cJSON_ArrayForEach(each, group)
    {
        if (n < LOADING_LIST_MAX)
            list[n++] = each->string;
    }
    loading_unknown(l, mine, false, what, name, list);
}

/* Puts the value into the node in the place of the child, if any. */
static void put_last(struct loading *l, cJSON *node, cJSON *child,
                     const char *key, cJSON *value)
{
    if (cJSON_IsArray(node)) {
        cJSON_ReplaceItemViaPointer(node, child, value);
    } else if (child == NULL) {
        add(l, node, key, value);
    } else {
        cJSON_ReplaceItemInObjectCaseSensitive(node, key, value);
        if (value->string == NULL)
            l->is_out_of_memory = true; /* its key could not be copied */
    }
}

/* Puts the value at the end of the path, making objects on the way. */
static void put(struct loading *l, const char *path, cJSON *value)
{
    cJSON *node = l->root;
    for (;;) {
        size_t len;
        char key[TEXT_SIZE];
        cJSON *child = step(node, path, &len);
        bool is_last = path[len] == '\0';
        snprintf(key, sizeof key, "%.*s", (int)len, path);
        bool is_named = node == loading_get(l->root, "sensors") ||
                        node == loading_get(l->root, "tracks");
        if (child == NULL && is_named && !is_last) {
            no_such(l, node, value,
                    node == loading_get(l->root, "tracks") ? "track" : "sensor",
                    key);
            break;
        }
        if ((child == NULL && !cJSON_IsObject(node)) || len == 0) {
            loading_error(l, value,
                          "there is no \"%.64s\"; join keys by "
                          "dots, a block by its name or place from 0",
                          path);
            break;
        }
        if (is_last) {
            put_last(l, node, child, key, value);
            return;
        }
        if (child == NULL) {
            child = cJSON_CreateObject();
            if (child != NULL)
                child->valueint = value->valueint;
            add(l, node, key, child);
            if (l->is_out_of_memory)
                break;
        }
        node = child;
        path += len + 1;
    }
    cJSON_Delete(value);
}

static bool is_removal(const struct settings_change *change)
{
    return strcmp(change->value, "null") == 0;
}

void loading_change(struct loading *l)
{
    for (int i = 0; i < l->n_changes; i++) {
        if (is_removal(&l->changes[i]))
            continue;
        const char *text = l->changes[i].value;
        cJSON nothing = {.valueint = LOADING_CHANGE - i};
        if (textpos_bad_utf8(text, strlen(text)) >= 0) {
            loading_error(l, &nothing, "the value is not UTF-8; correct it");
            continue;
        }
        cJSON *value = change_value(&l->changes[i]);
        if (value == NULL) {
            l->is_out_of_memory = true;
            return;
        }
        mark(value, LOADING_CHANGE - i);
        put(l, l->changes[i].path, value);
    }
}

void loading_remove(struct loading *l)
{
    for (int i = 0; i < l->n_changes; i++) {
        if (!is_removal(&l->changes[i]))
            continue;
        const char *path = l->changes[i].path;
        cJSON nothing = {.valueint = LOADING_CHANGE - i};
        cJSON *node = l->root, *above = NULL;
        size_t len = 0;
        for (; node != NULL && *path != '\0'; path += *path == '.') {
            above = node;
            node = step(above, path, &len);
            if (node == NULL)
                break;
            path += len;
        }
        if (node != NULL && above != NULL) {
            cJSON_Delete(cJSON_DetachItemViaPointer(above, node));
        } else if (above == loading_get(l->root, "sensors") && above != NULL) {
            no_such(l, above, &nothing, "sensor", path);
        } else {
            loading_error(l, &nothing,
                          "there is nothing to remove at "
                          "\"%.64s\"; leave this change out",
                          path);
        }
    }
}

/* Copies into the entry what it lacks and its model has. */
static void copy_absent(struct loading *l, cJSON *entry, const cJSON *model)
{
    const cJSON *each;
    cJSON_ArrayForEach(each, model)
    {
        if (loading_get(entry, each->string) == NULL)
            add(l, entry, each->string, cJSON_Duplicate(each, 1));
        if (l->is_out_of_memory)
            return;
    }
}

static void like(struct loading *l, cJSON *group, cJSON *entry,
                 const char *what)
{
    for (int i = 0;; i++) {
        cJSON *node = cJSON_GetObjectItemCaseSensitive(entry, "like");
        if (!cJSON_IsString(node))
            return;
        const cJSON *model = loading_get(group, node->valuestring);
        if (model == NULL) {
            no_such(l, group, node, what, node->valuestring);
        } else if (model == entry || i == LIKE_MAX) {
            loading_error(l, node,
                          "\"like\" leads back to itself; name a %s "
                          "that is written out",
                          what);
            return; /* what stays says that the entry is not whole */
        }
        if (model == NULL)
            return;
        /* `node` goes first, so that a chain copies the model's own. */
        cJSON_DetachItemViaPointer(entry, node);
        if (cJSON_IsObject(model))
            copy_absent(l, entry, model);
        cJSON_Delete(node);
    }
}

void loading_like(struct loading *l, cJSON *group, const char *what)
{
    cJSON *entry;
    if (!cJSON_IsObject(group))
        return;
    cJSON_ArrayForEach(entry, group)
    {
        if (cJSON_IsObject(entry))
            like(l, group, entry, what);
    }
}
