/* csv.h - lines of comma-separated fields, read from memory.
 *
 * Fields may be quoted ("a,b", "" inside for a quote mark: such a field keeps
 * its doubled marks); blanks around a field and a carriage return at the end
 * fall away.  Empty lines and lines that begin with '#' are passed over.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_CSV_H
#define TOOLS_CSV_H

#include <stdbool.h>
#include <stddef.h>

#include "core/model/message.h"

enum { CSV_FIELDS_MAX = 64 };

struct csv {
    const char *at, *end; /* what is still to be read                     */
    int line;             /* number of the last line, from 1              */
};

struct csv_line {
    int number; /* of the line in the file                      */
    int n;      /* fields; more than CSV_FIELDS_MAX are counted,
                   not kept                                     */
    struct text field[CSV_FIELDS_MAX];
};

void csv_init(struct csv *csv, const char *bytes, size_t len);

/* False at the end. */
bool csv_next(struct csv *csv, struct csv_line *line);

bool csv_equals(struct text field, const char *word);

#endif
