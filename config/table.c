/* The settings table: look-up, help and JSON Schema. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/table.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "config/load.h"

const struct table_row *table_find(const char *path)
{
    for (int i = 0; i < table_n; i++)
        if (strcmp(table_rows[i].path, path) == 0)
            return &table_rows[i];
    return NULL;
}

const struct table_row *table_child(const char *path, int i)
{
    size_t n = strlen(path);
    for (int k = 0; k < table_n; k++) {
        const char *rest = table_rows[k].path;
        if (n > 0) {
            if (strncmp(rest, path, n) != 0 || rest[n] != '.')
                continue;
            rest += n + 1;
        }
        if (strchr(rest, '.') == NULL && i-- == 0)
            return &table_rows[k];
    }
    return NULL;
}

const char *table_key(const struct table_row *row)
{
    const char *dot = strrchr(row->path, '.');
    return dot == NULL ? row->path : dot + 1;
}

const char *table_takes(const struct table_row *row)
{
    switch (row->value) {
    case TABLE_OBJECT:
        return row->is_list ? "an object {...} or a list of them"
                            : "an object {...}";
    case TABLE_NAMED:
        return "an object {...}";
    case TABLE_TEXT:
        return row->is_list ? "a text in quotation marks or a list of them"
                            : "a text in quotation marks";
    case TABLE_CHOICE:
        return "one of its words in quotation marks";
    case TABLE_INTEGER:
        return "a whole number";
    case TABLE_NUMBER:
        return "a number";
    case TABLE_QUANTITY:
        return row->is_list ? "a number, a text like \"2 mm\", or a list of "
                              "them"
                            : "a number, or a text with its unit";
    case TABLE_ANY:
        break;
    }
    return "a text, a number, a list or an object";
}

/* A line made by printf goes to the caller's function. */
struct out {
    void (*line)(void *ctx, const char *text);
    void *ctx;
};

static void say(const struct out *out, const char *fmt, ...)
    __attribute__((format(printf, 2, 3)));

static void say(const struct out *out, const char *fmt, ...)
{
    char text[1024];
    va_list args;
    va_start(args, fmt);
    vsnprintf(text, sizeof text, fmt, args);
    va_end(args);
    out->line(out->ctx, text);
}

static void help_of(const struct out *out, const struct table_row *row)
{
    say(out, "%s%s", row->path,
        row->is_planned ? "  (planned, not built yet)" : "");
    say(out, "    %s", row->help);
    if (row->is_planned)
        return;
    if (row->value == TABLE_CHOICE)
        say(out, "    one of: %s", row->of);
    else if (row->value == TABLE_QUANTITY)
        say(out, "    takes %s; unit: %s", table_takes(row), row->of);
    else if (row->value != TABLE_ANY)
        say(out, "    takes %s", table_takes(row));
    if (row->default_text != NULL && row->default_text[0] != '\0')
        say(out, "    default: %s", row->default_text);
}

/* True if a key the user writes, "sensors.laser.u", names this row: "*"
 * stands for any one part. */
static bool names_row(const char *key, const char *path)
{
    while (*key != '\0' && *path != '\0') {
        size_t n = strcspn(key, "."), m = strcspn(path, ".");
        bool is_any = m == 1 && *path == '*' && n > 0;
        if (!is_any && (n != m || strncmp(key, path, n) != 0))
            return false;
        key += n + (key[n] == '.');
        path += m + (path[m] == '.');
    }
    return *key == '\0' && *path == '\0';
}

bool settings_help(const char *key, void (*line)(void *ctx, const char *text),
                   void *ctx)
{
    const struct out out = {line, ctx};
    if (key == NULL) {
        for (int i = 0; i < table_n; i++)
            help_of(&out, &table_rows[i]);
        return true;
    }
    const struct table_row *row = table_find(key);
    for (int i = 0; row == NULL && i < table_n; i++)
        if (names_row(key, table_rows[i].path))
            row = &table_rows[i];
    if (row == NULL)
        return false;
    help_of(&out, row);
    const struct table_row *child;
    for (int i = 0; (child = table_child(row->path, i)) != NULL; i++)
        help_of(&out, child);
    return true;
}

/* `text` as the content of a JSON string. */
static const char *quoted(const char *text, char *buf, size_t size)
{
    size_t n = 0;
    for (; *text != '\0' && n + 3 < size; text++) {
        if (*text == '"' || *text == '\\')
            buf[n++] = '\\';
        buf[n++] = *text;
    }
    buf[n] = '\0';
    return buf;
}

static void schema_choices(const char *choices, char *buf, size_t size)
{
    size_t n = 0;
    for (const char *s = choices; *s != '\0' && n + 4 < size;) {
        size_t len = strcspn(s, "|");
        n += (size_t)snprintf(buf + n, size - n, "%s\"%.*s\"",
                              n > 0 ? ", " : "", (int)len, s);
        s += len + (s[len] == '|');
    }
}

/* The type of a row that has no keys of its own. */
static void schema_type(const struct table_row *row, char *buf, size_t size)
{
    char choices[256] = "";
    switch (row->value) {
    case TABLE_TEXT:
        snprintf(buf, size, "\"type\": %s",
                 row->is_list ? "[\"string\", \"array\"]" : "\"string\"");
        break;
    case TABLE_CHOICE:
        schema_choices(row->of, choices, sizeof choices);
        snprintf(buf, size, "\"enum\": [%s]", choices);
        break;
    case TABLE_INTEGER:
        snprintf(buf, size, "\"type\": \"integer\"");
        break;
    case TABLE_NUMBER:
        snprintf(buf, size, "\"type\": \"number\"");
        break;
    case TABLE_QUANTITY:
        snprintf(buf, size, "\"type\": [\"number\", \"string\"%s]",
                 row->is_list ? ", \"array\"" : "");
        break;
    case TABLE_OBJECT:
    case TABLE_NAMED:
        snprintf(buf, size, "\"type\": %s",
                 row->is_list ? "[\"object\", \"array\"]" : "\"object\"");
        break;
    case TABLE_ANY:
        snprintf(buf, size,
                 "\"type\": [\"number\", \"string\", \"object\", \"array\"]");
        break;
    }
}

static void schema_keys(const struct out *out, const char *path, int depth);

/* One row, with what stands below it; `end` closes it. */
static void schema_row(const struct out *out, const struct table_row *row,
                       int depth, const char *end)
{
    char help[512], type[512];
    int pad = 2 * depth;
    quoted(row->help, help, sizeof help);
    schema_type(row, type, sizeof type);
    if (row->value != TABLE_OBJECT && row->value != TABLE_NAMED) {
        say(out, "%*s{\"description\": \"%s\", %s}%s", pad, "", help, type,
            end);
        return;
    }
    say(out, "%*s{\"description\": \"%s\", %s,", pad, "", help, type);
    if (row->is_list) {
        say(out, "%*s\"items\": {\"type\": \"object\",", pad + 1, "");
        schema_keys(out, row->path, depth + 1);
        say(out, "%*s},", pad + 1, "");
    }
    schema_keys(out, row->path, depth);
    say(out, "%*s}%s", pad, "", end);
}

/* "properties" and "additionalProperties" of what stands below a path. */
static void schema_keys(const struct out *out, const char *path, int depth)
{
    const struct table_row *row, *any = NULL, *last = NULL;
    int pad = 2 * depth;
    for (int i = 0; (row = table_child(path, i)) != NULL; i++) {
        if (strcmp(table_key(row), "*") == 0)
            any = row;
        else if (!row->is_planned)
            last = row;
    }
    say(out, "%*s\"properties\": {", pad + 1, "");
    for (int i = 0; (row = table_child(path, i)) != NULL; i++) {
        if (row->is_planned || row == any)
            continue;
        say(out, "%*s\"%s\":", pad + 2, "", table_key(row));
        schema_row(out, row, depth + 1, row == last ? "" : ",");
    }
    say(out, "%*s},", pad + 1, "");
    say(out, "%*s\"additionalProperties\":%s", pad + 1, "",
        any == NULL ? " false" : "");
    if (any != NULL)
        schema_row(out, any, depth + 1, "");
}

void settings_schema(void (*line)(void *ctx, const char *text), void *ctx)
{
    const struct out out = {line, ctx};
    say(&out, "{\"$schema\": \"http://json-schema.org/draft-07/schema#\",");
    say(&out, " \"title\": \"rig file\", \"type\": \"object\",");
    say(&out, " \"required\": [\"tracks\", \"sensors\"],");
    schema_keys(&out, "", 0);
    say(&out, "}");
}
