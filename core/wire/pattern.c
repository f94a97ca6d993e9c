/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/pattern.h"

#include <string.h>

#include "core/wire/decode.h"

/* --- reading ----------------------------------------------------------------
 */

static inline uint64_t word(const uint8_t *at)
{
    uint64_t value;
    memcpy(&value, at, sizeof value);
    return value;
}

static inline uint64_t difference(const struct pattern *p, const uint8_t *bytes,
                                  size_t at)
{
    return (word(bytes + at) ^ word(p->bytes + at)) & word(p->mask + at);
}

/* Equal under the mask; the last word overlaps the one before it. */
static inline bool is_alike(const struct pattern *p, const uint8_t *bytes,
                            size_t len)
{
    uint64_t all = difference(p, bytes, len - 8);
    for (size_t at = 0; at + 8 < len; at += 8)
        all |= difference(p, bytes, at);
    return all == 0;
}

static inline uint64_t whole(const uint8_t *at, int len)
{
    uint64_t v8;
    uint32_t v4;
    switch (len) {
    case 8:
        memcpy(&v8, at, 8);
        return __builtin_bswap64(v8);
    case 4:
        memcpy(&v4, at, 4);
        return __builtin_bswap32(v4);
    case 2:
        return (uint64_t)(at[0] << 8 | at[1]);
    default:
        return at[0];
    }
}

static inline double real(const uint8_t *at)
{
    uint64_t bits = whole(at, 8);
    double value;
    memcpy(&value, &bits, sizeof value);
    return value;
}

static inline bool set_id(struct text *id, const uint8_t *at, int len)
{
    *id = (struct text){(const char *)at, len};
    return wire_is_id(id->at, (size_t)len);
}

static inline bool set_seconds(struct measurement *m, double s)
{
    m->has_t = element_seconds(s, &m->t_ns);
    return m->has_t;
}

static inline bool fill(const struct pattern_hole *h, const uint8_t *at,
                        struct measurement *m)
{
    switch (h->key) {
    case ELEMENT_SENSOR:
        return set_id(&m->sensor, at, h->len);
    case ELEMENT_TRACK:
        return set_id(&m->track, at, h->len);
    case ELEMENT_Z:
        m->n_z = h->kind == VALUE_LIST ? h->len : 1;
        for (int i = 0; i < m->n_z; i++)
            m->z[i] = real(at + 9 * i); /* a type byte before each          */
        return true;
    case ELEMENT_T:
        return set_seconds(m, real(at));
    case ELEMENT_NS:
        m->t_ns = (int64_t)whole(at, h->len);
        m->has_t = true;
        return m->t_ns >= 0;
    default: /* ELEMENT_SEQ */
        m->seq = whole(at, h->len);
        m->has_seq = true;
        return true;
    }
}

bool pattern_read(const struct pattern *p, const uint8_t *bytes, size_t len,
                  struct measurement *m)
{
    struct element e;
    if (len < PATTERN_LEN_MIN || p->len != len || !is_alike(p, bytes, len))
        return false;
    element_begin(&e, m);
    for (int i = 0; i < p->n_holes; i++)
        if (!fill(&p->hole[i], bytes + p->hole[i].at, m))
            return false;
    return true;
}

/* --- learning ---------------------------------------------------------------
 */

void pattern_begin(struct pattern *p, const uint8_t *bytes, size_t len)
{
    p->len = 0;
    p->n_holes = 0;
    p->is_learning = len >= PATTERN_LEN_MIN && len <= PATTERN_LEN_MAX;
    if (!p->is_learning)
        return;
    memcpy(p->bytes, bytes, len);
    memset(p->mask, 0xff, len);
}

/* A list of 64-bit floats only: their type bytes stand 9 apart. */
static bool is_list_of_doubles(const uint8_t *bytes, size_t from, size_t to,
                               int n)
{
    if (n < 1 || n > READS_MAX || to - from != 1 + 9 * (size_t)n)
        return false;
    for (int i = 0; i < n; i++)
        if (bytes[from + 1 + 9 * (size_t)i] != 0xcb)
            return false;
    return true;
}

static bool is_unsigned(uint8_t type)
{
    return type >= 0xcc && type <= 0xcf;
}

/* The value's bytes become holes; its type bytes and lengths stay. */
static bool open_hole(struct pattern *p, enum element_key key,
                      const struct value *v, const uint8_t *bytes, size_t from,
                      size_t to)
{
    bool is_text = v->kind == VALUE_TEXT && (bytes[from] & 0xe0) == 0xa0;
    bool is_double = v->kind == VALUE_DOUBLE;
    bool is_list =
        v->kind == VALUE_LIST && is_list_of_doubles(bytes, from, to, v->n);
    bool is_integer = (v->kind == VALUE_INT || v->kind == VALUE_UINT) &&
                      is_unsigned(bytes[from]);
    bool is_good = key == ELEMENT_SENSOR || key == ELEMENT_TRACK ? is_text
                   : key == ELEMENT_Z ? is_double || is_list
                   : key == ELEMENT_T ? is_double
                   : key == ELEMENT_NS || key == ELEMENT_SEQ ? is_integer
                                                             : false;
    if (!is_good || p->n_holes == PATTERN_HOLES_MAX)
        return false;
    size_t at = from + (is_list ? 2 : 1);
    uint8_t n = (uint8_t)(is_list ? (size_t)v->n : to - at);
    p->hole[p->n_holes++] =
        (struct pattern_hole){(uint8_t)key, (uint8_t)v->kind, n, (uint8_t)at};
    for (size_t i = at; i < to; i++)
        if (!is_list || (i - at) % 9 != 8)
            p->mask[i] = 0;
    return true;
}

void pattern_note(struct pattern *p, enum element_key key,
                  const struct value *v, const uint8_t *bytes, size_t from,
                  size_t to)
{
    if (!p->is_learning || key == ELEMENT_OTHER || key == ELEMENT_V)
        return; /* without effect, and the same in every match */
    if (!open_hole(p, key, v, bytes, from, to))
        p->is_learning = false;
}

void pattern_end(struct pattern *p, size_t len)
{
    p->len = p->is_learning ? (uint8_t)len : 0;
    p->is_learning = false;
}
