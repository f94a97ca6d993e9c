/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/element.h"

#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode.h"

enum key {
    KEY_SENSOR,
    KEY_TRACK,
    KEY_Z,
    KEY_T,
    KEY_NS,
    KEY_SEQ,
    KEY_U,
    KEY_COV,
    KEY_MARK,
    KEY_NAME,
    KEY_TEXT,
    KEY_V,
    KEY_SAMPLES,
    KEY_TICK,
    KEY_OTHER
};

/* Seconds whose nanoseconds fit an int64. */
static const double seconds_max = 9.2e9;

void element_begin(struct element *e, struct measurement *m)
{
    e->m = m;
    memset(m, 0, offsetof(struct measurement, z));
    e->m->n_u = 0;
    e->m->has_cov = false;
    e->seen = 0;
    e->is_wrong_version = false;
    e->reason = NULL;
}

static void wrong(struct element *e, const char *reason)
{
    if (!e->reason)
        e->reason = reason;
}

static bool is_key(const struct text *key, const char *name, int len)
{
    return key->len == len && memcmp(key->at, name, (size_t)len) == 0;
}

static enum key key_of(const struct text *key)
{
    if (key->len == 0)
        return KEY_OTHER;
    switch (key->at[0]) {
    case 'c':
        return is_key(key, "cov", 3) ? KEY_COV : KEY_OTHER;
    case 'm':
        return is_key(key, "mark", 4) ? KEY_MARK : KEY_OTHER;
    case 'n':
        return is_key(key, "ns", 2)     ? KEY_NS
               : is_key(key, "name", 4) ? KEY_NAME
                                        : KEY_OTHER;
    case 's':
        return is_key(key, "sensor", 6)    ? KEY_SENSOR
               : is_key(key, "seq", 3)     ? KEY_SEQ
               : is_key(key, "samples", 7) ? KEY_SAMPLES
                                           : KEY_OTHER;
    case 't':
        return is_key(key, "t", 1)       ? KEY_T
               : is_key(key, "track", 5) ? KEY_TRACK
               : is_key(key, "text", 4)  ? KEY_TEXT
               : is_key(key, "tick", 4)  ? KEY_TICK
                                         : KEY_OTHER;
    case 'u':
        return is_key(key, "u", 1) ? KEY_U : KEY_OTHER;
    case 'v':
        return is_key(key, "v", 1) ? KEY_V : KEY_OTHER;
    case 'z':
        return is_key(key, "z", 1) ? KEY_Z : KEY_OTHER;
    default:
        return KEY_OTHER;
    }
}

bool value_number(const struct value *v, double *number)
{
    switch (v->kind) {
    case VALUE_NULL:
        *number = real_nan();
        return true;
    case VALUE_INT:
        *number = (double)v->i;
        return true;
    case VALUE_UINT:
        *number = (double)v->u;
        return true;
    case VALUE_DOUBLE:
    case VALUE_FLOAT:
        *number = v->d;
        return true;
    case VALUE_BOOL:
    case VALUE_TEXT:
    case VALUE_TIME:
    case VALUE_LIST:
    case VALUE_OTHER:
        break;
    }
    return false;
}

/* --- values of single keys --------------------------------------------------- */

static void set_id(struct element *e, struct text *id, const struct value *v,
                   const char *reason)
{
    if (v->kind == VALUE_TEXT && wire_is_id(v->text.at, (size_t)v->text.len))
        *id = v->text;
    else
        wrong(e, reason);
}

static int set_numbers(struct element *e, double *to, const struct value *v,
                       const char *reason)
{
    if (v->kind == VALUE_LIST) {
        int n = v->n < READS_MAX ? v->n : READS_MAX;
        memcpy(to, v->list, (size_t)n * sizeof *to);
        return v->n;
    }
    if (value_number(v, to))
        return 1;
    wrong(e, reason);
    return 0;
}

static void set_z(struct element *e, const struct value *v)
{
    e->m->n_z = 0;
    if (v->kind == VALUE_NULL)
        return;
    e->m->n_z = set_numbers(e, e->m->z, v,
                           "z is neither a number nor a list of numbers: send "
                           "a number, a list, or null for no reading");
    if (e->m->n_z == 0)
        wrong(e, "z is an empty list: send null for no reading");
}

static bool set_seconds(struct element *e, double s)
{
    if (!(real_abs(s) < seconds_max)) {
        wrong(e, real_abs(s) < 1e4 * seconds_max
                     ? "t looks like milliseconds: send seconds since 1970 "
                       "UTC"
                     : "t looks like micro- or nanoseconds: send seconds "
                       "since 1970 UTC, or integer nanoseconds as `ns`");
        return false;
    }
    double whole = real_floor(s);                /* exact                 */
    double part = (s - whole) * 1e9;             /* of a second, in ns    */
    e->m->t_ns = (int64_t)whole * 1000000000 + (int64_t)real_floor(part + 0.5);
    return true;
}

static void set_t(struct element *e, const struct value *v)
{
    bool is_good = true;
    switch (v->kind) {
    case VALUE_NULL:
        return; /* no stamp */
    case VALUE_INT:
        is_good = set_seconds(e, (double)v->i);
        break;
    case VALUE_UINT:
        is_good = set_seconds(e, (double)v->u);
        break;
    case VALUE_DOUBLE:
        is_good = set_seconds(e, v->d);
        break;
    case VALUE_TIME:
        e->m->t_ns = v->i;
        break;
    case VALUE_TEXT:
        is_good = wire_parse_time(v->text.at, (size_t)v->text.len, &e->m->t_ns);
        if (!is_good)
            wrong(e, "t is no RFC 3339 time: send for example "
                     "2026-05-04T10:00:00.250Z");
        break;
    case VALUE_FLOAT:
        wrong(e, "t is a 32-bit float, which resolves 128 s: send a 64-bit "
                 "float, or integer nanoseconds as `ns`");
        return;
    case VALUE_BOOL:
    case VALUE_LIST:
    case VALUE_OTHER:
        wrong(e, "t is no time: send seconds since 1970 UTC or an RFC 3339 "
                 "string");
        return;
    }
    e->m->has_t = is_good;
}

static bool digits(const struct text *text, int64_t *out)
{
    int i = text->len > 0 && text->at[0] == '-';
    bool is_negative = i > 0;
    if (i == text->len || text->len - i > 19)
        return false;
    uint64_t value = 0;
    for (; i < text->len; i++) {
        if (text->at[i] < '0' || text->at[i] > '9')
            return false;
        value = value * 10 + (uint64_t)(text->at[i] - '0');
    }
    if (value > INT64_MAX)
        return false;
    *out = is_negative ? -(int64_t)value : (int64_t)value;
    return true;
}

static void set_ns(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_INT)
        e->m->t_ns = v->i;
    else if (v->kind != VALUE_TEXT || !digits(&v->text, &e->m->t_ns)) {
        wrong(e, "ns is no integer of nanoseconds since 1970: send an integer "
                 "or a string of digits");
        return;
    }
    e->m->has_t = true;
}

static void set_seq(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_INT && v->i >= 0)
        e->m->seq = (uint64_t)v->i;
    else if (v->kind == VALUE_UINT)
        e->m->seq = v->u;
    else {
        wrong(e, "seq is no counter: send an integer from 0");
        return;
    }
    e->m->has_seq = true;
}

static void set_u(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_NULL)
        return;
    int n = set_numbers(e, e->m->u, v,
                        "u is neither a number nor a list of numbers");
    e->m->n_u = n < READS_MAX ? n : READS_MAX;
}

static void set_mark(struct element *e, const struct value *v)
{
    static const struct {
        const char *word;
        enum mark_kind mark;
    } marks[] = {{"start", MARK_START},
                 {"stop", MARK_STOP},
                 {"zero", MARK_ZERO},
                 {"note", MARK_NOTE}};
    for (int i = 0; i < 4 && v->kind == VALUE_TEXT; i++)
        if (is_key(&v->text, marks[i].word, (int)strlen(marks[i].word)))
            e->m->mark = marks[i].mark;
    if (e->m->mark == MARK_NONE)
        wrong(e, "mark is none of start, stop, zero, note");
}

static void set_text(struct element *e, struct text *to, const struct value *v)
{
    if (v->kind == VALUE_TEXT)
        *to = v->text;
    else
        wrong(e, "name and text of a mark are strings");
}

static void set_version(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_INT && v->i == WIRE_VERSION)
        return;
    e->is_wrong_version = true;
    wrong(e, "v is not 1, the only wire version that is spoken here");
}

void element_set(struct element *e, const struct text *key,
                 const struct value *v)
{
    enum key k = key_of(key);
    if (k == KEY_OTHER)
        return;
    if (e->seen >> k & 1) {
        wrong(e, "a key stands twice in one element");
        return;
    }
    e->seen |= 1u << k;
    switch (k) {
    case KEY_SENSOR:
        set_id(e, &e->m->sensor, v,
               "sensor is no id: letters, digits and _ . : - only, at most 63, "
               "first a letter or digit");
        break;
    case KEY_TRACK:
        set_id(e, &e->m->track, v,
               "track is no id: letters, digits and _ . : - only, at most 63, "
               "first a letter or digit");
        break;
    case KEY_Z:
        set_z(e, v);
        break;
    case KEY_T:
        set_t(e, v);
        break;
    case KEY_NS:
        set_ns(e, v);
        break;
    case KEY_SEQ:
        set_seq(e, v);
        break;
    case KEY_U:
        set_u(e, v);
        break;
    case KEY_COV:
        e->m->has_cov = true;
        break;
    case KEY_MARK:
        set_mark(e, v);
        break;
    case KEY_NAME:
        set_text(e, &e->m->name, v);
        break;
    case KEY_TEXT:
        set_text(e, &e->m->note, v);
        break;
    case KEY_V:
        set_version(e, v);
        break;
    case KEY_SAMPLES:
        wrong(e, "samples are not built yet: send one element per reading");
        break;
    case KEY_TICK:
        wrong(e, "tick is not built yet: send t, or leave it out");
        break;
    case KEY_OTHER:
        break;
    }
}

bool element_end(struct element *e)
{
    bool is_mark = e->seen >> KEY_MARK & 1;
    if ((e->seen >> KEY_T & 1) && (e->seen >> KEY_NS & 1))
        wrong(e, "both t and ns stand in one element: send one of them");
    if (!is_mark && !(e->seen >> KEY_SENSOR & 1))
        wrong(e, "no `sensor`: send the name that the rig file uses");
    if (!is_mark && !(e->seen >> KEY_Z & 1))
        wrong(e, "no `z`: send the reading, or null for none");
    return e->reason == NULL;
}
