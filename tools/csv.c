/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/csv.h"

#include <string.h>

void csv_init(struct csv *csv, const char *bytes, size_t len)
{
    *csv = (struct csv){bytes, bytes + len, 0};
    if (len >= 3 && memcmp(bytes, "\xef\xbb\xbf", 3) == 0)
        csv->at += 3; /* the mark that some spreadsheets write first */
}

static bool is_blank(char c)
{
    return c == ' ' || c == '\t' || c == '\r';
}

static struct text trim(const char *from, const char *to)
{
    while (from < to && is_blank(*from))
        from++;
    while (from < to && is_blank(to[-1]))
        to--;
    if (to - from >= 2 && from[0] == '"' && to[-1] == '"') {
        from++;
        to--;
    }
    return (struct text){from, (int)(to - from)};
}

static void split(const char *from, const char *to, struct csv_line *line)
{
    bool is_quoted = false;
    const char *first = from;
    line->n = 0;
    for (const char *c = from; c <= to; c++) {
        if (c < to && *c == '"')
            is_quoted = !is_quoted;
        if (c < to && (*c != ',' || is_quoted))
            continue;
        if (line->n < CSV_FIELDS_MAX)
            line->field[line->n] = trim(first, c);
        line->n++;
        first = c + 1;
    }
}

bool csv_next(struct csv *csv, struct csv_line *line)
{
    while (csv->at < csv->end) {
        const char *from = csv->at;
        const char *to = memchr(from, '\n', (size_t)(csv->end - from));
        to = to == NULL ? csv->end : to;
        csv->at = to < csv->end ? to + 1 : csv->end;
        csv->line++;
        struct text all = trim(from, to);
        if (all.len == 0 || all.at[0] == '#')
            continue;
        line->number = csv->line;
        split(from, to, line);
        return true;
    }
    return false;
}

bool csv_equals(struct text field, const char *word)
{
    return strlen(word) == (size_t)field.len &&
           memcmp(field.at, word, (size_t)field.len) == 0;
}
