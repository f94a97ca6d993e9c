/* MessagePack, pulled from the bytes in place: nothing is reserved for what a
 * length claims, so ten bytes cannot ask for gigabytes, and time is linear in
 * the datagram. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/decode_form.h"

struct cursor {
    const uint8_t *begin, *at, *end;
    const char *broken; /* first reason, NULL while all is well            */
    struct pattern *pattern; /* learns the one map; NULL in a list         */
};

static const char truncated[] =
    "the MessagePack ends in the middle: send the whole datagram, and lengths "
    "that are true";
static const char too_deep[] = "nested deeper than 8 levels: send flat maps";

static bool fail(struct cursor *c, const char *reason)
{
    if (!c->broken)
        c->broken = reason;
    return false;
}

static inline size_t left(const struct cursor *c)
{
    return (size_t)(c->end - c->at);
}

static inline size_t whole(const struct cursor *c)
{
    return (size_t)(c->end - c->begin);
}

/* An unsigned number of 1, 2, 4 or 8 bytes that are there. */
static inline uint64_t big_endian(const uint8_t *p, int n)
{
    uint64_t v8;
    uint32_t v4;
    uint16_t v2;
    switch (n) {
    case 1:
        return p[0];
    case 2:
        memcpy(&v2, p, 2);
        return __builtin_bswap16(v2);
    case 4:
        memcpy(&v4, p, 4);
        return __builtin_bswap32(v4);
    default:
        memcpy(&v8, p, 8);
        return __builtin_bswap64(v8);
    }
}

/* --- what a first byte opens ------------------------------------------------
 */

enum opened_kind {
    OPENED_VALUE, /* complete in itself                                    */
    OPENED_LIST,
    OPENED_MAP
};

struct opened {
    enum opened_kind kind;
    uint64_t n; /* children of a list, pairs of a map                       */
};

/* Type byte and payload, n bytes in all.  Timestamps are type -1 in three
 * sizes; every other extension is a value that no key takes. */
static void extension(const uint8_t *p, uint64_t n, struct value *v)
{
    uint64_t ns = 0;
    int64_t s = 0;
    v->kind = VALUE_OTHER;
    if (p[0] != 0xff)
        return;
    if (n == 5) {
        s = (int64_t)big_endian(p + 1, 4);
    } else if (n == 9) {
        uint64_t both = big_endian(p + 1, 8);
        ns = both >> 34;
        s = (int64_t)(both & 0x3ffffffff);
    } else if (n == 13) {
        ns = big_endian(p + 1, 4);
        s = (int64_t)big_endian(p + 5, 8);
    } else {
        return;
    }
    if (ns > 999999999 || s > 9000000000 || s < -9000000000)
        return;
    v->kind = VALUE_TIME;
    v->i = s * 1000000000 + (int64_t)ns;
}

enum payload { PAYLOAD_TEXT, PAYLOAD_BYTES, PAYLOAD_EXTENSION };

static bool take_payload(struct cursor *c, enum payload what, uint64_t n,
                         struct value *v)
{
    n += what == PAYLOAD_EXTENSION; /* its type byte */
    if (n > left(c))
        return fail(c, truncated);
    if (what == PAYLOAD_TEXT) {
        if (!decode_is_utf8(c->at, n))
            return fail(c, "a string is not UTF-8: send text as UTF-8");
        v->kind = VALUE_TEXT;
        v->text = (struct text){(const char *)c->at, (int)n};
    } else if (what == PAYLOAD_EXTENSION) {
        extension(c->at, n, v);
    } else {
        v->kind = VALUE_OTHER;
    }
    c->at += n;
    return true;
}

/* A length of `width` bytes. */
static bool take_length(struct cursor *c, int width, uint64_t *n)
{
    if (left(c) < (size_t)width)
        return fail(c, truncated);
    *n = big_endian(c->at, width);
    c->at += width;
    return true;
}

static bool take_number(struct cursor *c, uint8_t first, struct value *v)
{
    /* float 4 8, unsigned 1 2 4 8, signed 1 2 4 8 */
    static const uint8_t widths[] = {4, 8, 1, 2, 4, 8, 1, 2, 4, 8};
    int width = widths[first - 0xca];
    if (left(c) < (size_t)width)
        return fail(c, truncated);
    uint64_t bits = big_endian(c->at, width);
    c->at += width;
    if (first == 0xcb) {
        v->kind = VALUE_DOUBLE;
        memcpy(&v->d, &bits, sizeof v->d);
    } else if (first == 0xca) {
        uint32_t narrow = (uint32_t)bits;
        float f;
        memcpy(&f, &narrow, sizeof f);
        v->kind = VALUE_FLOAT;
        v->d = (double)f;
    } else if (first <= 0xcf) {
        v->kind = bits > INT64_MAX ? VALUE_UINT : VALUE_INT;
        v->u = bits;
        v->i = (int64_t)bits;
    } else {
        int shift = 64 - 8 * width;
        v->kind = VALUE_INT;
        v->i = (int64_t)(bits << shift) >> shift;
    }
    return true;
}

/* The forms whose length stands in bytes of its own, and the unused byte. */
static bool take_sized(struct cursor *c, uint8_t first, struct value *v,
                       struct opened *o)
{
    uint64_t n;
    if (first >= 0xc4 && first <= 0xc6)
        return take_length(c, 1 << (first - 0xc4), &n) &&
               take_payload(c, PAYLOAD_BYTES, n, v);
    if (first >= 0xc7 && first <= 0xc9)
        return take_length(c, 1 << (first - 0xc7), &n) &&
               take_payload(c, PAYLOAD_EXTENSION, n, v);
    if (first >= 0xd4 && first <= 0xd8)
        return take_payload(c, PAYLOAD_EXTENSION, 1u << (first - 0xd4), v);
    if (first >= 0xd9 && first <= 0xdb)
        return take_length(c, 1 << (first - 0xd9), &n) &&
               take_payload(c, PAYLOAD_TEXT, n, v);
    if (first >= 0xdc) {
        o->kind = first <= 0xdd ? OPENED_LIST : OPENED_MAP;
        return take_length(c, first & 1 ? 4 : 2, &o->n);
    }
    return fail(c, "a byte that MessagePack never uses: check the encoder");
}

/* One value, or the beginning of a list or map. */
static inline bool take(struct cursor *c, struct value *v, struct opened *o)
{
    if (c->at == c->end)
        return fail(c, truncated);
    uint8_t first = *c->at++;
    o->kind = OPENED_VALUE;
    if (first < 0x80 || first >= 0xe0) {
        v->kind = VALUE_INT;
        v->i = (int8_t)first;
        return true;
    }
    if (first < 0xa0) {
        o->kind = first < 0x90 ? OPENED_MAP : OPENED_LIST;
        o->n = first & 15;
        return true;
    }
    if (first < 0xc0)
        return take_payload(c, PAYLOAD_TEXT, first & 31, v);
    if (first >= 0xca && first <= 0xd3)
        return take_number(c, first, v);
    if (first == 0xc0 || first == 0xc2 || first == 0xc3) {
        v->kind = first == 0xc0 ? VALUE_NULL : VALUE_BOOL;
        return true;
    }
    return take_sized(c, first, v, o);
}

/* --- what nobody reads ------------------------------------------------------
 */

/* The children of a list or map that stands at this depth. */
static bool skip_inside(struct cursor *c, const struct opened *o, int depth)
{
    uint64_t n = o->kind == OPENED_MAP ? 2 * o->n : o->n;
    if (n > left(c))
        return fail(c, truncated);
    if (depth >= WIRE_DEPTH_MAX)
        return fail(c, too_deep);
    for (uint64_t i = 0; i < n; i++) {
        struct value v;
        struct opened inner;
        if (!take(c, &v, &inner) ||
            (inner.kind != OPENED_VALUE && !skip_inside(c, &inner, depth + 1)))
            return false;
    }
    return true;
}

/* --- elements ---------------------------------------------------------------
 */

/* A list of numbers and nulls; anything else in it makes it OTHER. */
static bool take_list(struct cursor *c, uint64_t n, int depth, struct value *v)
{
    bool is_numbers = true;
    if (n > left(c))
        return fail(c, truncated);
    v->n = n < 255 ? (int)n : 255;
    for (uint64_t i = 0; i < n; i++) {
        struct value item;
        struct opened o;
        double x = 0;
        if (!take(c, &item, &o))
            return false;
        if (o.kind != OPENED_VALUE) {
            is_numbers = false;
            if (!skip_inside(c, &o, depth + 1))
                return false;
        } else {
            is_numbers = value_number(&item, &x) && is_numbers;
        }
        if (i < READS_MAX)
            v->list[i] = x;
    }
    v->kind = is_numbers ? VALUE_LIST : VALUE_OTHER;
    return true;
}

/* A map at this depth: its keys and values into the element. */
static bool take_map(struct cursor *c, uint64_t n, int depth, struct element *e)
{
    for (uint64_t i = 0; i < n; i++) {
        struct value key, v;
        struct opened o;
        const uint8_t *here = c->at;
        if (!take(c, &key, &o))
            return false;
        if (o.kind != OPENED_VALUE)
            return fail(c, "a key of a map is a list or a map: send strings");
        const uint8_t *from = c->at;
        if (!take(c, &v, &o))
            return false;
        if (o.kind == OPENED_LIST && !take_list(c, o.n, depth + 1, &v))
            return false;
        if (o.kind == OPENED_MAP) {
            v.kind = VALUE_OTHER;
            if (!skip_inside(c, &o, depth + 1))
                return false;
        }
        if (key.kind != VALUE_TEXT)
            continue;
        e->here = (int)(here - c->begin);
        enum element_key k = element_key(key.text.at, (size_t)key.text.len);
        element_set(e, k, &v);
        if (c->pattern)
            pattern_note(c->pattern, k, &v, c->begin, (size_t)(from - c->begin),
                         (size_t)(c->at - c->begin));
    }
    return true;
}

/* The elements of the outer list, or the one map. */
static bool take_elements(struct cursor *c, struct wire_decoder *d,
                          bool *is_wrong_version)
{
    struct opened outer, o;
    struct value v;
    struct element e;
    if (!take(c, &v, &outer))
        return false;
    if (outer.kind == OPENED_MAP) {
        decode_begin(d, &e);
        c->pattern = &d->pattern[whole(c) % PATTERNS];
        pattern_begin(c->pattern, c->begin, whole(c));
        if (!take_map(c, outer.n, 0, &e))
            return false;
        decode_take(d, &e, is_wrong_version);
        if (d->n == 1 && c->at == c->end)
            pattern_end(c->pattern, whole(c));
        return true;
    }
    if (outer.kind != OPENED_LIST)
        return fail(c, "neither a map nor a list of maps: send one of them");
    for (uint64_t i = 0; i < outer.n; i++) {
        decode_begin(d, &e);
        e.here = (int)(c->at - c->begin);
        if (!take(c, &v, &o))
            return false;
        if (o.kind != OPENED_MAP)
            element_wrong(&e, "an element of the list is no map: send maps");
        if (o.kind == OPENED_MAP
                ? !take_map(c, o.n, 1, &e)
                : o.kind == OPENED_LIST && !skip_inside(c, &o, 1))
            return false;
        decode_take(d, &e, is_wrong_version);
    }
    return true;
}

const char *decode_msgpack(struct wire_decoder *d, const uint8_t *bytes,
                           size_t len, bool *is_wrong_version)
{
    struct cursor c = {bytes, bytes, bytes + len, NULL, NULL};
    struct pattern *p = &d->pattern[len % PATTERNS];
    if (pattern_read(p, bytes, len, &d->element[0])) {
        d->n = 1;
        return NULL;
    }
    if (!take_elements(&c, d, is_wrong_version)) {
        d->at = (int)(c.at - bytes);
        return c.broken;
    }
    while (c.at < c.end && (*c.at == 0 || *c.at == '\n' || *c.at == '\r'))
        c.at++;
    if (c.at == c.end)
        return NULL;
    d->at = (int)(c.at - bytes);
    return "more bytes behind the end: send one map or one list";
}
