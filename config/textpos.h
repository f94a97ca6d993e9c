/* textpos.h - places in the text of a rig file, and reports that show them.
 *
 * Comments are overwritten with blanks, so every byte keeps its offset; the
 * place of a value is found by scanning the text again along its path of keys
 * and indices.  Columns count characters (code points), from 1.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_TEXTPOS_H
#define CONFIG_TEXTPOS_H

#include <cJSON.h>
#include <stdbool.h>
#include <stddef.h>

#include "config/err.h"

enum {
    PROBLEMS_MAX = 100,     /* reports shown; the rest is counted          */
    TEXTPOS_DEPTH_MAX = 32, /* nesting of a rig file                      */
    TEXTPOS_NONE = -1
};

/* Adds a whole report, which ends with a newline. */
void problems_append(struct problems *p, const char *report);

/* Overwrites comments with blanks; newlines stay.  Returns TEXTPOS_NONE, or
 * the offset of a comment that does not end. */
long textpos_strip(char *text, size_t len);

/* Offset of the first byte that is not UTF-8 (or is NUL), or TEXTPOS_NONE. */
long textpos_bad_utf8(const char *text, size_t len);

/* Calls found(ctx, offset, name) for every key that stands twice in its
 * object; text is sound JSON.  The name is cut to 63 bytes. */
void textpos_duplicates(const char *text,
                        void (*found)(void *ctx, size_t at, const char *name),
                        void *ctx);

/* Writes into `valueint` of every node of the tree where its value begins in
 * the text that it was parsed from.  The text is sound JSON. */
void textpos_mark(cJSON *tree, const char *text);

/* Where the key of the value at this offset begins; the same offset if it has
 * none. */
size_t textpos_key(const char *text, size_t value);

/* Line and column, from 1, of a byte. */
void textpos_place(const char *text, size_t len, size_t at, int *line,
                   int *column);

/* Reports "file:line:column: error: what", the line, a caret and the remedy
 * (NULL: none). */
struct textpos_report {
    const char *file;
    const char *text; /* as the user wrote it */
    size_t len;
    const char *what, *remedy;
};
void textpos_report(struct problems *p, const struct textpos_report *r,
                    size_t at);

/* The name of the list (ends with NULL) nearest to `name`, at most two edits
 * away (one for names of up to 3 letters); NULL if there is none. */
const char *textpos_nearest(const char *name, const char *const *list);

#endif
