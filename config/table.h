/* table.h - every setting of a rig file, once.
 *
 * The rows drive the checks of unknown and planned keys and of types, the
 * defaults, the help and the JSON Schema.  A path joins keys by dots; "*"
 * stands for a name of the user's.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_TABLE_H
#define CONFIG_TABLE_H

#include <stdbool.h>

enum table_value {
    TABLE_OBJECT, /* keys as in the table                               */
    TABLE_NAMED,  /* an object whose keys the user chooses              */
    TABLE_TEXT,
    TABLE_CHOICE, /* one of the texts in `of`, split by '|'             */
    TABLE_INTEGER,
    TABLE_NUMBER,
    TABLE_QUANTITY, /* a number, or a text with a unit                    */
    TABLE_ANY
};

struct table_row {
    const char *path;
    enum table_value value;
    bool is_list; /* a list of such values is allowed as well */
    bool is_planned;
    const char *of;           /* quantity: its unit, or in words; choice: the
                                 choices                                  */
    const char *default_text; /* NULL: none                               */
    const char *help;
};

extern const struct table_row table_rows[];
extern const int table_n;

/* The row at this path, or NULL. */
const struct table_row *table_find(const char *path);

/* The i-th row directly below a path ("" is the top), or NULL. */
const struct table_row *table_child(const char *path, int i);

/* The last part of a row's path. */
const char *table_key(const struct table_row *row);

/* "a number", "a text", ...: what the row takes. */
const char *table_takes(const struct table_row *row);

#endif
