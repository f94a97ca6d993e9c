/* A rig file from its bytes to settings. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/load.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "config/loading.h"
#include "config/sha256.h"
#include "config/syntax.h"

/* A report without a place in the text. */
static status fail(struct problems *problems, status code, const char *path,
                   const char *what)
{
    char text[SETTINGS_PATH_SIZE + 256];
    snprintf(text, sizeof text, "%.1000s: error: %.200s\n", path, what);
    problems_append(problems, text);
    return code;
}

static void syntax_error(struct loading *l, size_t at, const char *what)
{
    cJSON place = {.valueint = (int)at};
    loading_error(l, &place, "%s", what);
}

static void duplicate(void *ctx, size_t at, const char *name)
{
    struct loading *l = ctx;
    cJSON place = {.valueint = (int)at};
    loading_error(l, &place,
                  "\"%.64s\" stands twice in this object; remove "
                  "one",
                  name);
}

/* Text to tree; false when that failed or a key stands twice. */
static bool parse_tree(struct loading *l)
{
    size_t at;
    const char *what;
    long bad = textpos_bad_utf8(l->text, l->len);
    if (bad >= 0) {
        syntax_error(l, (size_t)bad,
                     "this byte is not UTF-8 text; save the "
                     "file as UTF-8");
        return false;
    }
    bad = textpos_strip(l->text, l->len);
    if (bad >= 0) {
        syntax_error(l, (size_t)bad,
                     "this comment does not end; close it "
                     "with */");
        return false;
    }
    if (!syntax_check(l->text, &at, &what)) {
        syntax_error(l, at, what);
        return false;
    }
    int n = l->problems->n;
    textpos_duplicates(l->text, duplicate, l);
    l->root = cJSON_ParseWithOpts(l->text, NULL, 1);
    l->is_out_of_memory = l->root == NULL;
    if (l->root == NULL)
        return false;
    textpos_mark(l->root, l->text);
    if (!cJSON_IsObject(l->root))
        loading_error(l, l->root, "a rig file is one object; begin with {");
    return l->problems->n == n;
}

static void load_tree(struct loading *l)
{
    cJSON *tracks, *sensors;
    loading_expand(l, cJSON_GetObjectItemCaseSensitive(l->root, "tracks"));
    loading_expand(l, cJSON_GetObjectItemCaseSensitive(l->root, "sensors"));
    loading_change(l);
    tracks = cJSON_GetObjectItemCaseSensitive(l->root, "tracks");
    sensors = cJSON_GetObjectItemCaseSensitive(l->root, "sensors");
    loading_like(l, tracks, "track");
    loading_like(l, sensors, "sensor");
    loading_remove(l);
    if (l->is_out_of_memory)
        return;
    loading_check(l);
    loading_tracks(l);
    loading_sensors(l);
    loading_track_values(l);
    loading_check_starts(l);
    loading_host(l);
}

/* The BOM of UTF-8 counts as nothing. */
static const char *without_mark(const char *text, size_t *len)
{
    if (*len < 3 || memcmp(text, "\xef\xbb\xbf", 3) != 0)
        return text;
    *len -= 3;
    return text + 3;
}

static char *copy_bytes(const char *text, size_t len)
{
    char *copy = malloc(len + 1);
    if (copy != NULL) {
        memcpy(copy, text, len);
        copy[len] = '\0';
    }
    return copy;
}

status settings_parse(struct settings **out, const char *path, const char *text,
                      size_t len, const struct settings_change *changes,
                      int n_changes, struct problems *problems)
{
    struct loading l = {.path = path,
                        .problems = problems,
                        .raw = text,
                        .len = len,
                        .changes = changes,
                        .n_changes = n_changes};
    struct err err;
    int n = problems->n;
    status st = ST_NOMEM;
    *out = NULL;
    if (len > LOADING_BYTES_MAX)
        return fail(problems, ST_SCHEMA, path, "larger than 4 MiB");
    l.s = calloc(1, sizeof *l.s);
    if (l.s == NULL || (l.s->text = copy_bytes(text, len)) == NULL)
        goto out;
    l.s->text_len = len;
    l.raw = without_mark(text, &l.len);
    l.text = copy_bytes(l.raw, l.len);
    if (l.text == NULL)
        goto out;
    l.units = quantity_units_new(&err);
    if (l.units == NULL) {
        st = fail(problems, err.code, path, err.text);
        goto out;
    }
    snprintf(l.s->path, sizeof l.s->path, "%s", path);
    sha256_hex(text, len, l.s->rig.file_hash);
    if (parse_tree(&l))
        load_tree(&l);
    loading_sort(&l);
    if (!l.is_out_of_memory)
        st = problems->n > n ? ST_SCHEMA : ST_OK;
    if (st == ST_OK)
        rig_prepare(&l.s->rig);
out:
    if (st == ST_NOMEM)
        fail(problems, st, path, "out of memory");
    cJSON_Delete(l.root);
    quantity_units_free(l.units);
    free(l.text);
    if (st == ST_OK)
        *out = l.s;
    else
        settings_free(l.s);
    return st;
}

/* At most one byte more than a rig file may have. */
static char *read_bytes(FILE *file, size_t *len)
{
    size_t size = 65536, n = 0;
    char *text = malloc(size);
    while (text != NULL) {
        n += fread(text + n, 1, size - n, file);
        if (n < size || n > LOADING_BYTES_MAX)
            break;
        size *= 2;
        char *larger = realloc(text, size);
        if (larger == NULL)
            free(text);
        text = larger;
    }
    *len = n;
    return text;
}

status settings_load(struct settings **s, const char *path,
                     const struct settings_change *changes, int n_changes,
                     struct problems *problems)
{
    char *text = NULL;
    size_t len = 0;
    status st;
    *s = NULL;
    errno = 0;
    FILE *file = fopen(path, "rb");
    if (file == NULL)
        return fail(problems, ST_IO, path, strerror(errno));
    text = read_bytes(file, &len);
    if (text == NULL)
        st = fail(problems, ST_NOMEM, path, "out of memory");
    else if (ferror(file))
        st = fail(problems, ST_IO, path, strerror(errno));
    else
        st = settings_parse(s, path, text, len, changes, n_changes, problems);
    fclose(file);
    free(text);
    return st;
}

void settings_free(struct settings *s)
{
    if (s == NULL)
        return;
    free(s->text);
    free(s);
}
