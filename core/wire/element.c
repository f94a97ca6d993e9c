/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/element.h"

#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode.h"

/* Seconds whose nanoseconds fit an int64. */
static const double seconds_max = 9.2e9;

void element_begin(struct element *e, struct measurement *m)
{
    /* Not z and u, which are long; memset would cost more than these. */
    const struct text none = {NULL, 0};
    e->m = m;
    m->sensor = none;
    m->track = none;
    m->name = none;
    m->note = none;
    m->mark = MARK_NONE;
    m->has_t = m->has_seq = m->has_cov = false;
    m->t_ns = 0;
    m->seq = 0;
    m->n_z = m->n_u = 0;
    e->seen = 0;
    e->is_wrong_version = false;
    e->reason = NULL;
    e->here = e->at = 0;
}

void element_wrong(struct element *e, const char *reason)
{
    if (e->reason)
        return;
    e->reason = reason;
    e->at = e->here;
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

/* --- values of single keys ---------------------------------------------------
 */

static void set_id(struct element *e, struct text *id, const struct value *v,
                   const char *reason)
{
    if (v->kind == VALUE_TEXT && wire_is_id(v->text.at, (size_t)v->text.len))
        *id = v->text;
    else
        element_wrong(e, reason);
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
    element_wrong(e, reason);
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
        element_wrong(e, "z is an empty list: send null for no reading");
}

/* The nearest ns, exactly: a double is an integer times a power of two, and
 * that integer times 10^9 has 83 bits.  |s| is below seconds_max. */
static int64_t seconds_to_ns(double s)
{
    uint64_t bits;
    memcpy(&bits, &s, sizeof bits);
    int power = (int)(bits >> 52 & 0x7ff) - 1075;
    uint64_t whole = (bits & 0xfffffffffffff) | (uint64_t)1 << 52;
    if (power < -84)
        return 0; /* below half a nanosecond, denormals too */
    unsigned __int128 ns = (unsigned __int128)whole * 1000000000;
    ns = (ns + ((unsigned __int128)1 << (-power - 1))) >> -power;
    return s < 0 ? -(int64_t)ns : (int64_t)ns;
}

bool element_seconds(double s, int64_t *t_ns)
{
    if (!(real_abs(s) < seconds_max))
        return false;
    *t_ns = seconds_to_ns(s);
    return true;
}

static bool set_seconds(struct element *e, double s)
{
    if (element_seconds(s, &e->m->t_ns))
        return true;
    if (!real_is_finite(s))
        element_wrong(e, "t is NaN or infinite: send seconds since 1970 UTC, "
                         "or leave t out");
    else if (real_abs(s) < 1e4 * seconds_max)
        element_wrong(e, "t looks like milliseconds: send seconds since 1970 "
                         "UTC");
    else
        element_wrong(e, "t looks like micro- or nanoseconds: send seconds "
                         "since 1970 UTC, or integer nanoseconds as `ns`");
    return false;
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
            element_wrong(e, "t is no RFC 3339 time: send for example "
                             "2026-05-04T10:00:00.250Z");
        break;
    case VALUE_FLOAT:
        element_wrong(
            e, "t is a 32-bit float, which resolves 128 s: send a 64-bit "
               "float, or integer nanoseconds as `ns`");
        return;
    case VALUE_BOOL:
    case VALUE_LIST:
    case VALUE_OTHER:
        element_wrong(
            e, "t is no time: send seconds since 1970 UTC or an RFC 3339 "
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
        element_wrong(
            e, "ns is no integer of nanoseconds since 1970: send an integer "
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
        element_wrong(e, "seq is no counter: send an integer from 0");
        return;
    }
    e->m->has_seq = true;
}

static void set_u(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_NULL)
        return;
    int n = set_numbers(e, e->m->u, v,
                        "u is neither a number nor a list of numbers: send the "
                        "standard uncertainty in the sensor's unit, or leave u "
                        "out");
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
        if ((size_t)v->text.len == strlen(marks[i].word) &&
            memcmp(v->text.at, marks[i].word, (size_t)v->text.len) == 0)
            e->m->mark = marks[i].mark;
    if (e->m->mark == MARK_NONE)
        element_wrong(e, "mark is none of start, stop, zero, note: send one of "
                         "them");
}

static void set_text(struct element *e, struct text *to, const struct value *v)
{
    if (v->kind == VALUE_TEXT)
        *to = v->text;
    else
        element_wrong(e,
                      "name or text of a mark is no string: send it in quotes");
}

static void set_version(struct element *e, const struct value *v)
{
    if (v->kind == VALUE_INT && v->i == WIRE_VERSION)
        return;
    e->is_wrong_version = true;
    element_wrong(e, "v is not 1, the only wire version that is spoken here: "
                     "send 1, or leave v out");
}

void element_set(struct element *e, enum element_key k, const struct value *v)
{
    if (k == ELEMENT_OTHER)
        return;
    if (e->seen >> k & 1) {
        element_wrong(e, "a key stands twice in one element: send it once");
        return;
    }
    e->seen |= 1u << k;
    switch (k) {
    case ELEMENT_SENSOR:
        set_id(e, &e->m->sensor, v,
               "sensor is no id: letters, digits and _ . : - only, at most 63, "
               "first a letter or digit");
        break;
    case ELEMENT_TRACK:
        set_id(e, &e->m->track, v,
               "track is no id: letters, digits and _ . : - only, at most 63, "
               "first a letter or digit");
        break;
    case ELEMENT_Z:
        set_z(e, v);
        break;
    case ELEMENT_T:
        set_t(e, v);
        break;
    case ELEMENT_NS:
        set_ns(e, v);
        break;
    case ELEMENT_SEQ:
        set_seq(e, v);
        break;
    case ELEMENT_U:
        set_u(e, v);
        break;
    case ELEMENT_COV:
        e->m->has_cov = v->kind != VALUE_NULL;
        break;
    case ELEMENT_MARK:
        set_mark(e, v);
        break;
    case ELEMENT_NAME:
        set_text(e, &e->m->name, v);
        break;
    case ELEMENT_TEXT:
        set_text(e, &e->m->note, v);
        break;
    case ELEMENT_V:
        set_version(e, v);
        break;
    case ELEMENT_SAMPLES:
        element_wrong(
            e, "samples are not built yet: send one element per reading");
        break;
    case ELEMENT_TICK:
        element_wrong(e, "tick is not built yet: send t, or leave it out");
        break;
    case ELEMENT_OTHER:
        break;
    }
}

bool element_end(struct element *e)
{
    bool is_mark = e->seen >> ELEMENT_MARK & 1;
    if ((e->seen >> ELEMENT_T & 1) && (e->seen >> ELEMENT_NS & 1))
        element_wrong(e,
                      "both t and ns stand in one element: send one of them");
    if (!is_mark && !(e->seen >> ELEMENT_SENSOR & 1))
        element_wrong(e, "no `sensor`: send the name that the rig file uses");
    if (!is_mark && !(e->seen >> ELEMENT_Z & 1))
        element_wrong(e, "no `z`: send the reading, or null for none");
    return e->reason == NULL;
}
