/* import.h - rows of a table of measurements.
 *
 * Columns by name, in any order:
 *   time_ns | t           the sensor's stamp: whole ns | seconds or RFC 3339
 *   arrival_ns | arrival  when it was received; empty = the stamp
 *   sensor, track, seq
 *   z0 .. z7              the reading; empty at the end = fewer components,
 *                         empty before others = no reading of that one
 *   u0 .. u7              its standard uncertainty, where the rig allows it
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_IMPORT_H
#define TOOLS_IMPORT_H

#include "config/err.h"
#include "tools/csv.h"

enum import_role {
    IMPORT_IGNORED,
    IMPORT_TIME_NS,
    IMPORT_TIME,
    IMPORT_ARRIVAL_NS,
    IMPORT_ARRIVAL,
    IMPORT_SENSOR,
    IMPORT_TRACK,
    IMPORT_SEQ,
    IMPORT_Z,
    IMPORT_U
};

struct import_columns {
    int n, n_ignored;
    struct {
        enum import_role role;
        int component; /* of IMPORT_Z and IMPORT_U                    */
    } column[CSV_FIELDS_MAX];
};

/* A column's name in the file and the name that it should have. */
struct import_rename {
    struct text to, from;
};

/* What the heading says.  ST_PARSE when a needed column is missing, or one
 * stands twice; `sensor` is not needed when has_sensor. */
status import_heading(struct import_columns *columns,
                      const struct csv_line *line,
                      const struct import_rename *rename, int n_rename,
                      bool has_sensor, struct err *err) MUST_USE;

struct import_row {
    struct measurement m; /* mark, name, note and cov unused             */
    bool has_arrival;
    int64_t arrival_ns;
};

/* One row as it stands, stamps without any origin added. */
status import_parse(const struct import_columns *columns,
                    const struct csv_line *line, struct import_row *row,
                    struct err *err) MUST_USE;

/* The datagram of a row, a MessagePack map; 0 if it does not fit. */
size_t import_encode(const struct measurement *m, char *buf, size_t size);

#endif
