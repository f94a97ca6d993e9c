/* SPDX-License-Identifier: Apache-2.0 */
#include "config/textpos.h"

#include <ctype.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NAME_SIZE = 64, LINE_SHOWN = 160 };

long textpos_strip(char *text, size_t len)
{
    bool in_string = false;
    for (size_t i = 0; i < len; i++) {
        if (in_string) {
            if (text[i] == '\\')
                i++;
            else if (text[i] == '"' || text[i] == '\n')
                in_string = false;
        } else if (text[i] == '"') {
            in_string = true;
        } else if (text[i] == '/' && i + 1 < len && text[i + 1] == '/') {
            for (; i < len && text[i] != '\n'; i++)
                text[i] = ' ';
        } else if (text[i] == '/' && i + 1 < len && text[i + 1] == '*') {
            size_t end = i + 2;
            while (end + 1 < len && (text[end] != '*' || text[end + 1] != '/'))
                end++;
            if (end + 1 >= len)
                return (long)i;
            for (; i < end + 2; i++)
                text[i] = text[i] == '\n' ? '\n' : ' ';
            i--;
        }
    }
    return TEXTPOS_NONE;
}

/* Length of the character at s, 0 if it is not UTF-8 (RFC 3629) or NUL. */
static size_t character(const unsigned char *s, size_t len)
{
    if (s[0] < 0x80)
        return s[0] != 0;
    size_t n = s[0] >= 0xf0 ? 4 : s[0] >= 0xe0 ? 3 : 2;
    if (s[0] < 0xc2 || s[0] > 0xf4 || n > len)
        return 0;
    for (size_t i = 1; i < n; i++)
        if ((s[i] & 0xc0) != 0x80)
            return 0;
    if ((s[0] == 0xe0 && s[1] < 0xa0) || (s[0] == 0xed && s[1] > 0x9f) ||
        (s[0] == 0xf0 && s[1] < 0x90) || (s[0] == 0xf4 && s[1] > 0x8f))
        return 0; /* overlong, surrogate or beyond U+10FFFF */
    return n;
}

long textpos_bad_utf8(const char *text, size_t len)
{
    for (size_t i = 0; i < len;) {
        size_t n = character((const unsigned char *)text + i, len - i);
        if (n == 0)
            return (long)i;
        i += n;
    }
    return TEXTPOS_NONE;
}

static const char *blanks(const char *s)
{
    while (*s == ' ' || *s == '\t' || *s == '\n' || *s == '\r')
        s++;
    return s;
}

/* From the opening quote to after the closing one; buf gets the content. */
static const char *string(const char *s, char *buf, size_t size)
{
    size_t n = 0;
    for (s++; *s != '"' && *s != '\0'; s++) {
        if (*s == '\\' && s[1] != '\0' && *++s == 'u' && s[1] == '0' &&
            s[2] == '0' && isxdigit((unsigned char)s[3]) &&
            isxdigit((unsigned char)s[4])) {
            char hex[3] = {s[3], s[4], '\0'};
            unsigned long code = strtoul(hex, NULL, 16);
            s += 4;
            if (n + 1 < size)
                buf[n++] = (char)code;
        } else if (n + 1 < size) {
            buf[n++] = *s;
        }
    }
    buf[n] = '\0';
    return *s == '"' ? s + 1 : s;
}

/* Over one value of any kind. */
static const char *over(const char *s)
{
    char unused[2];
    int depth = 0;
    s = blanks(s);
    do {
        if (*s == '"') {
            s = string(s, unused, sizeof unused);
            continue;
        }
        if (*s == '{' || *s == '[')
            depth++;
        else if (*s == '}' || *s == ']')
            depth--;
        else if (*s == '\0')
            return s;
        else if (depth == 0)
            return s + strcspn(s, ",]} \t\r\n");
        s++;
    } while (depth > 0);
    return s;
}

/* Next step inside the object or array at *s (which stands after '{', '[' or
 * ','): the key is read, *s stands at the value.  False at the end. */
static bool next(const char **s, bool is_object, char *name, const char **key)
{
    const char *p = blanks(*s);
    if (*p == ',')
        p = blanks(p + 1);
    if (*p == '}' || *p == ']' || *p == '\0')
        return false;
    *key = p;
    if (is_object) {
        p = blanks(string(p, name, NAME_SIZE));
        p = blanks(*p == ':' ? p + 1 : p);
    }
    *s = p;
    return true;
}

void textpos_mark(cJSON *tree, const char *text)
{
    /* Down first; the way back up is kept in `above`. */
    struct {
        cJSON *child;
        const char *s;
        bool is_object;
    } above[TEXTPOS_DEPTH_MAX + 1];
    char name[NAME_SIZE];
    const char *s = blanks(text), *key;
    int depth = 0;
    tree->valueint = (int)(s - text);
    above[0].child = tree->child;
    above[0].s = s + 1;
    above[0].is_object = cJSON_IsObject(tree);
    while (depth >= 0) {
        cJSON *node = above[depth].child;
        s = above[depth].s;
        if (node == NULL || !next(&s, above[depth].is_object, name, &key)) {
            depth--;
            continue;
        }
        node->valueint = (int)(s - text);
        above[depth].child = node->next;
        above[depth].s = over(s);
        if (node->child != NULL && depth < TEXTPOS_DEPTH_MAX) {
            depth++;
            above[depth].child = node->child;
            above[depth].s = s + 1;
            above[depth].is_object = cJSON_IsObject(node);
        }
    }
}

size_t textpos_key(const char *text, size_t value)
{
    size_t i = value;
    while (i > 0 && isspace((unsigned char)text[i - 1]))
        i--;
    if (i == 0 || text[i - 1] != ':')
        return value;
    for (i--; i > 0 && isspace((unsigned char)text[i - 1]);)
        i--;
    if (i < 2)
        return value;
    for (i -= 2; i > 0 && (text[i] != '"' || text[i - 1] == '\\');)
        i--;
    return i;
}

/* Keys of one object: reports those that stand twice; `s` is at '{'. */
static void duplicates_of(const char *text, const char *s,
                          void (*found)(void *, size_t, const char *),
                          void *ctx)
{
    char name[NAME_SIZE], earlier[NAME_SIZE];
    const char *key, *start = s + 1;
    for (s++; next(&s, true, name, &key); s = over(s)) {
        const char *p = start, *other;
        while (next(&p, true, earlier, &other) && other < key) {
            if (strcmp(name, earlier) == 0) {
                found(ctx, (size_t)(key - text), name);
                break;
            }
            p = over(p);
        }
    }
}

void textpos_duplicates(const char *text,
                        void (*found)(void *ctx, size_t at, const char *name),
                        void *ctx)
{
    char unused[2];
    for (const char *s = text; *s != '\0';) {
        if (*s == '{')
            duplicates_of(text, s, found, ctx);
        s = *s == '"' ? string(s, unused, sizeof unused) : s + 1;
    }
}

void textpos_place(const char *text, size_t len, size_t at, int *line,
                   int *column)
{
    *line = 1;
    *column = 1;
    for (size_t i = 0; i < at && i < len; i++) {
        if (text[i] == '\n') {
            (*line)++;
            *column = 1;
        } else if (((unsigned char)text[i] & 0xc0) != 0x80) {
            (*column)++;
        }
    }
}

/* The line around `at`, cut to what fits; returns the blanks before the
 * caret. */
static int source_line(const struct textpos_report *r, size_t at, char *out,
                       size_t size)
{
    size_t start = at, end = at;
    while (start > 0 && r->text[start - 1] != '\n')
        start--;
    while (end < r->len && r->text[end] != '\n' && r->text[end] != '\r')
        end++;
    if (at - start > LINE_SHOWN / 2)
        start = at - LINE_SHOWN / 2;
    while (start < at && ((unsigned char)r->text[start] & 0xc0) == 0x80)
        start++;
    if (end - start > LINE_SHOWN)
        end = start + LINE_SHOWN;
    int before = 0;
    size_t n = 0;
    for (size_t i = start; i < end && n + 1 < size; i++) {
        unsigned char c = (unsigned char)r->text[i];
        out[n++] = c < 32 || c == 127 ? ' ' : r->text[i];
        before += i < at && (c & 0xc0) != 0x80;
    }
    out[n] = '\0';
    return before;
}

void textpos_report(struct problems *p, const struct textpos_report *r,
                    size_t at)
{
    char source[LINE_SHOWN + 1], remedy[512] = "", report[2048];
    int line, column;
    at = at > r->len ? r->len : at;
    textpos_place(r->text, r->len, at, &line, &column);
    int before = source_line(r, at, source, sizeof source);
    if (r->remedy != NULL && r->remedy[0] != '\0')
        snprintf(remedy, sizeof remedy, "       = %s\n", r->remedy);
    snprintf(report, sizeof report,
             "%.512s:%d:%d: error: %.600s\n%6d | %s\n       | %*s^\n%s",
             r->file, line, column, r->what, line, source, before, "", remedy);
    problems_append(p, report);
}

/* Edits (insert, delete, replace, swap of neighbours) between two names. */
static int edits(const char *a, const char *b)
{
    int row[3][NAME_SIZE + 1];
    int la = (int)strlen(a), lb = (int)strlen(b);
    if (la >= NAME_SIZE || lb >= NAME_SIZE || abs(la - lb) > 2)
        return NAME_SIZE;
    for (int j = 0; j <= lb; j++)
        row[0][j] = j;
    for (int i = 1; i <= la; i++) {
        int *now = row[i % 3], *last = row[(i + 2) % 3];
        now[0] = i;
        for (int j = 1; j <= lb; j++) {
            int best = last[j - 1] + (a[i - 1] != b[j - 1]);
            best = last[j] + 1 < best ? last[j] + 1 : best;
            best = now[j - 1] + 1 < best ? now[j - 1] + 1 : best;
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] &&
                a[i - 2] == b[j - 1] && row[(i + 1) % 3][j - 2] + 1 < best)
                best = row[(i + 1) % 3][j - 2] + 1;
            now[j] = best;
        }
    }
    return row[la % 3][lb];
}

const char *textpos_nearest(const char *name, const char *const *list)
{
    int least = strlen(name) <= 3 ? 2 : 3;
    const char *nearest = NULL;
    for (int i = 0; list[i] != NULL; i++) {
        int n = edits(name, list[i]);
        if (n < least && n < (int)strlen(list[i])) {
            least = n;
            nearest = list[i];
        }
    }
    return nearest;
}
