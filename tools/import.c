/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/import.h"

#include <stdio.h>
#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode.h"
#include "core/wire/writer.h"
#include "tools/instant.h"

/* --- heading ------------------------------------------------------------- */

/* "z3" and 'z' give 3, -1 for anything else. */
static int component_of(struct text name, char letter)
{
    if (name.len != 2 || name.at[0] != letter)
        return -1;
    return name.at[1] >= '0' && name.at[1] <= '9' ? name.at[1] - '0' : -1;
}

static enum import_role role_of(struct text name, int *component)
{
    static const struct {
        const char *name;
        enum import_role role;
    } words[] = {
        {"time_ns", IMPORT_TIME_NS},
        {"t", IMPORT_TIME},
        {"arrival_ns", IMPORT_ARRIVAL_NS},
        {"arrival", IMPORT_ARRIVAL},
        {"sensor", IMPORT_SENSOR},
        {"track", IMPORT_TRACK},
        {"seq", IMPORT_SEQ},
    };
    *component = 0;
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++)
        if (csv_equals(name, words[i].name))
            return words[i].role;
    *component = component_of(name, 'z');
    if (*component >= 0)
        return IMPORT_Z;
    *component = component_of(name, 'u');
    return *component >= 0 ? IMPORT_U : IMPORT_IGNORED;
}

static bool has_role(const struct import_columns *columns,
                     enum import_role role, int component)
{
    for (int i = 0; i < columns->n; i++)
        if (columns->column[i].role == role &&
            columns->column[i].component == component)
            return true;
    return false;
}

static status check_heading(const struct import_columns *columns,
                            bool has_sensor, struct err *err)
{
    bool has_time = has_role(columns, IMPORT_TIME_NS, 0) ||
                    has_role(columns, IMPORT_TIME, 0) ||
                    has_role(columns, IMPORT_ARRIVAL_NS, 0) ||
                    has_role(columns, IMPORT_ARRIVAL, 0);
    if (!has_time)
        return err_set(err, ST_PARSE,
                       "no column of time; name one time_ns, t, "
                       "arrival_ns or arrival, or rename one with --map");
    if (!has_sensor && !has_role(columns, IMPORT_SENSOR, 0))
        return err_set(err, ST_PARSE,
                       "no column 'sensor'; add one, rename one "
                       "with --map, or give --sensor NAME");
    if (!has_role(columns, IMPORT_Z, 0))
        return err_set(err, ST_PARSE,
                       "no column 'z0'; name the readings z0, "
                       "z1 .., or rename one with --map");
    return ST_OK;
}

status import_heading(struct import_columns *columns,
                      const struct csv_line *line,
                      const struct import_rename *rename, int n_rename,
                      bool has_sensor, struct err *err)
{
    memset(columns, 0, sizeof *columns);
    if (line->n > CSV_FIELDS_MAX)
        return err_set(err, ST_PARSE,
                       "%d columns, %d allowed; leave out those "
                       "that are not needed",
                       line->n, CSV_FIELDS_MAX);
    for (int i = 0; i < line->n; i++) {
        struct text name = line->field[i];
        for (int k = 0; k < n_rename; k++)
            if (rename[k].from.len == name.len &&
                memcmp(rename[k].from.at, name.at, (size_t)name.len) == 0)
                name = rename[k].to;
        int component;
        enum import_role role = role_of(name, &component);
        if (component >= READS_MAX)
            return err_set(err, ST_PARSE,
                           "column '%.*s': a sensor reads %d "
                           "components at most, 0 to %d",
                           name.len, name.at, READS_MAX, READS_MAX - 1);
        if (role != IMPORT_IGNORED && has_role(columns, role, component))
            return err_set(err, ST_PARSE,
                           "column '%.*s' stands twice; leave "
                           "one out",
                           name.len, name.at);
        columns->n_ignored += role == IMPORT_IGNORED;
        columns->column[columns->n].role = role;
        columns->column[columns->n++].component = component;
    }
    return check_heading(columns, has_sensor, err);
}

/* --- rows ---------------------------------------------------------------- */

static status bad_field(struct text field, const char *want, struct err *err)
{
    return err_set(err, ST_PARSE, "'%.*s' is no %s", field.len, field.at, want);
}

static status parse_time(struct text field, bool is_ns, int64_t *t_ns,
                         struct err *err)
{
    size_t len = (size_t)field.len;
    if (is_ns)
        return instant_parse_ns(field.at, len, t_ns)
                   ? ST_OK
                   : bad_field(field,
                               "whole number of nanoseconds; seconds "
                               "belong into a column 't'",
                               err);
    return instant_parse(field.at, len, t_ns)
               ? ST_OK
               : bad_field(field,
                           "time; write seconds since 1970 or "
                           "2026-03-01T10:00:00Z",
                           err);
}

static status parse_value(struct text field, double *value, struct err *err)
{
    if (csv_equals(field, "nan") || csv_equals(field, "NaN") ||
        csv_equals(field, "NAN"))
        return ST_OK; /* NaN already: no reading of that component */
    return wire_parse_number(field.at, (size_t)field.len, value)
               ? ST_OK
               : bad_field(field, "number; write it as 1.25 with a point", err);
}

static status parse_id(struct text field, struct text *id, struct err *err)
{
    *id = field;
    return wire_is_id(field.at, (size_t)field.len)
               ? ST_OK
               : bad_field(field,
                           "name; use letters, digits and _.:- only, 63 "
                           "at most",
                           err);
}

static status parse_field(enum import_role role, int component,
                          struct text field, struct import_row *row,
                          struct err *err)
{
    struct measurement *m = &row->m;
    switch (role) {
    case IMPORT_IGNORED:
        return ST_OK;
    case IMPORT_TIME_NS:
    case IMPORT_TIME:
        m->has_t = true;
        return parse_time(field, role == IMPORT_TIME_NS, &m->t_ns, err);
    case IMPORT_ARRIVAL_NS:
    case IMPORT_ARRIVAL:
        row->has_arrival = true;
        return parse_time(field, role == IMPORT_ARRIVAL_NS, &row->arrival_ns,
                          err);
    case IMPORT_SENSOR:
        return parse_id(field, &m->sensor, err);
    case IMPORT_TRACK:
        return parse_id(field, &m->track, err);
    case IMPORT_SEQ: {
        int64_t seq;
        m->has_seq = true;
        if (!instant_parse_ns(field.at, (size_t)field.len, &seq) || seq < 0)
            return bad_field(field, "counter; seq is a whole number from 0",
                             err);
        m->seq = (uint64_t)seq;
        return ST_OK;
    }
    case IMPORT_Z:
        m->n_z = component + 1 > m->n_z ? component + 1 : m->n_z;
        return parse_value(field, &m->z[component], err);
    case IMPORT_U:
        m->n_u = component + 1 > m->n_u ? component + 1 : m->n_u;
        return parse_value(field, &m->u[component], err);
    }
    return ST_OK;
}

status import_parse(const struct import_columns *columns,
                    const struct csv_line *line, struct import_row *row,
                    struct err *err)
{
    *row = (struct import_row){.has_arrival = false};
    for (int i = 0; i < READS_MAX; i++)
        row->m.z[i] = row->m.u[i] = real_nan();
    if (line->n != columns->n)
        return err_set(err, ST_PARSE,
                       "%d fields, the heading has %d; a "
                       "decimal comma needs quotes or a point",
                       line->n, columns->n);
    for (int i = 0; i < line->n; i++) {
        if (line->field[i].len == 0)
            continue;
        status code =
            parse_field(columns->column[i].role, columns->column[i].component,
                        line->field[i], row, err);
        if (code != ST_OK)
            return code;
    }
    if (!row->has_arrival && !row->m.has_t)
        return err_set(err, ST_PARSE, "no time; fill the stamp or the arrival");
    if (!row->has_arrival)
        row->arrival_ns = row->m.t_ns;
    return ST_OK;
}

/* --- datagram ------------------------------------------------------------ */

static void write_values(struct writer *w, const char *key, int n,
                         const double *v)
{
    writer_key(w, key);
    if (n == 0)
        writer_null(w);
    if (n > 1)
        writer_open_array(w);
    for (int i = 0; i < n; i++)
        writer_number(w, v[i]);
    if (n > 1)
        writer_close(w);
}

size_t import_encode(const struct measurement *m, char *buf, size_t size)
{
    char name[RIG_ID_SIZE];
    struct writer w;
    writer_init(&w, WIRE_MSGPACK, buf, size);
    writer_open_map(&w);
    writer_key(&w, "sensor");
    snprintf(name, sizeof name, "%.*s", m->sensor.len, m->sensor.at);
    writer_text(&w, name);
    if (m->track.len > 0) {
        writer_key(&w, "track");
        snprintf(name, sizeof name, "%.*s", m->track.len, m->track.at);
        writer_text(&w, name);
    }
    if (m->has_t) {
        writer_key(&w, "t");
        writer_time(&w, m->t_ns);
    }
    if (m->has_seq) {
        writer_key(&w, "seq");
        writer_count(&w, m->seq);
    }
    write_values(&w, "z", m->n_z, m->z);
    if (m->n_u > 0)
        write_values(&w, "u", m->n_u, m->u);
    writer_close(&w);
    return writer_finish(&w);
}
