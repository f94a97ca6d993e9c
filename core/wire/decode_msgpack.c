/* MessagePack, pulled from the bytes in place: nothing is reserved for what a
 * length claims, so ten bytes cannot ask for gigabytes. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode_form.h"

struct cursor {
    const uint8_t *at, *end;
    const char *broken; /* first reason, NULL while all is well            */
};

static const char truncated[] =
    "the MessagePack ends in the middle: the datagram was cut, or a length is "
    "wrong";

static bool fail(struct cursor *c, const char *reason)
{
    if (!c->broken)
        c->broken = reason;
    return false;
}

static bool need(struct cursor *c, size_t n)
{
    return (size_t)(c->end - c->at) >= n || fail(c, truncated);
}

static uint64_t big_endian(const uint8_t *p, int n)
{
    uint64_t v = 0;
    for (int i = 0; i < n; i++)
        v = v << 8 | p[i];
    return v;
}

/* Reads n bytes as an unsigned number; the caller asked need(). */
static uint64_t take(struct cursor *c, int n)
{
    uint64_t v = big_endian(c->at, n);
    c->at += n;
    return v;
}

/* What a first byte opens: n children, or n bytes of payload. */
enum opened_kind { OPENED_NONE, OPENED_LIST, OPENED_MAP, OPENED_TEXT,
                   OPENED_BYTES, OPENED_EXT };

struct opened {
    enum opened_kind kind;
    uint64_t n;
};

static bool holds_values(const struct opened *o)
{
    return o->kind == OPENED_LIST || o->kind == OPENED_MAP;
}

static uint64_t children(const struct opened *o)
{
    return o->kind == OPENED_MAP ? 2 * o->n : o->n;
}

static bool open_sized(struct cursor *c, uint8_t first, struct opened *o)
{
    int width = 0;
    switch (first) {
    case 0xc4: case 0xc5: case 0xc6:
        o->kind = OPENED_BYTES;
        width = 1 << (first - 0xc4);
        break;
    case 0xc7: case 0xc8: case 0xc9:
        o->kind = OPENED_EXT;
        width = 1 << (first - 0xc7);
        break;
    case 0xd4: case 0xd5: case 0xd6: case 0xd7: case 0xd8:
        o->kind = OPENED_EXT;
        o->n = (uint64_t)1 << (first - 0xd4);
        return true;
    case 0xd9: case 0xda: case 0xdb:
        o->kind = OPENED_TEXT;
        width = 1 << (first - 0xd9);
        break;
    case 0xdc: case 0xdd:
        o->kind = OPENED_LIST;
        width = 2 << (first - 0xdc);
        break;
    case 0xde: case 0xdf:
        o->kind = OPENED_MAP;
        width = 2 << (first - 0xde);
        break;
    default:
        return fail(c, "a byte that MessagePack never uses");
    }
    if (!need(c, (size_t)width))
        return false;
    o->n = take(c, width);
    return true;
}

static bool number(struct cursor *c, uint8_t first, struct value *v)
{
    static const uint8_t widths[] = {4, 8, 1, 2, 4, 8, 1, 2, 4, 8};
    int width = widths[first - 0xca];
    if (!need(c, (size_t)width))
        return false;
    uint64_t bits = take(c, width);
    if (first == 0xca) {
        uint32_t narrow = (uint32_t)bits;
        float f;
        memcpy(&f, &narrow, sizeof f);
        v->kind = VALUE_FLOAT;
        v->d = (double)f;
    } else if (first == 0xcb) {
        v->kind = VALUE_DOUBLE;
        memcpy(&v->d, &bits, sizeof v->d);
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

/* Timestamp extension type -1 in its three sizes. */
static void timestamp(const uint8_t *p, uint64_t n, struct value *v)
{
    uint64_t ns = 0;
    int64_t s = 0;
    v->kind = VALUE_OTHER;
    if (n == 4) {
        s = (int64_t)big_endian(p, 4);
    } else if (n == 8) {
        uint64_t both = big_endian(p, 8);
        ns = both >> 34;
        s = (int64_t)(both & 0x3ffffffff);
    } else if (n == 12) {
        ns = big_endian(p, 4);
        s = (int64_t)big_endian(p + 4, 8);
    } else {
        return;
    }
    if (ns > 999999999 || s > 9000000000 || s < -9000000000)
        return;
    v->kind = VALUE_TIME;
    v->i = s * 1000000000 + (int64_t)ns;
}

static bool skip(struct cursor *c, int depth);

static bool skip_children(struct cursor *c, uint64_t n, int depth)
{
    if (depth >= WIRE_DEPTH_MAX)
        return fail(c, "nested deeper than 8 levels");
    if (n > (uint64_t)(c->end - c->at))
        return fail(c, truncated);
    for (uint64_t i = 0; i < n; i++)
        if (!skip(c, depth + 1))
            return false;
    return true;
}

static bool payload(struct cursor *c, const struct opened *o, struct value *v)
{
    uint64_t n = o->n + (o->kind == OPENED_EXT ? 1 : 0);
    if (n > (uint64_t)(c->end - c->at))
        return fail(c, truncated);
    v->kind = VALUE_OTHER;
    if (o->kind == OPENED_TEXT) {
        if (!decode_is_utf8(c->at, n))
            return fail(c, "a string is not UTF-8");
        v->kind = VALUE_TEXT;
        v->text = (struct text){(const char *)c->at, (int)n};
    } else if (o->kind == OPENED_EXT && c->at[0] == 0xff) {
        timestamp(c->at + 1, o->n, v);
    }
    c->at += n;
    return true;
}

/* Everything that is no list and no map; *o says when it is one. */
static bool leaf(struct cursor *c, struct value *v, struct opened *o)
{
    if (!need(c, 1))
        return false;
    uint8_t first = *c->at++;
    o->kind = OPENED_NONE;
    o->n = 0;
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
    if (first < 0xc0) {
        o->kind = OPENED_TEXT;
        o->n = first & 31;
        return payload(c, o, v);
    }
    if (first == 0xc0 || first == 0xc2 || first == 0xc3) {
        v->kind = first == 0xc0 ? VALUE_NULL : VALUE_BOOL;
        return true;
    }
    if (first >= 0xca && first <= 0xd3)
        return number(c, first, v);
    if (!open_sized(c, first, o))
        return false;
    return holds_values(o) || payload(c, o, v);
}

static bool skip(struct cursor *c, int depth)
{
    struct value v;
    struct opened o;
    if (!leaf(c, &v, &o))
        return false;
    return !holds_values(&o) || skip_children(c, children(&o), depth);
}

/* A list of numbers and nulls; anything else in it makes it OTHER. */
static bool list(struct cursor *c, uint64_t n, struct value *v)
{
    bool is_numbers = true;
    if (n > (uint64_t)(c->end - c->at))
        return fail(c, truncated);
    v->n = n < 255 ? (int)n : 255;
    for (uint64_t i = 0; i < n; i++) {
        struct value item;
        struct opened o;
        double x = 0;
        if (!leaf(c, &item, &o))
            return false;
        if (holds_values(&o)) {
            is_numbers = false;
            if (!skip_children(c, children(&o), 3))
                return false;
            continue;
        }
        is_numbers = is_numbers && value_number(&item, &x);
        if (i < READS_MAX)
            v->list[i] = x;
    }
    v->kind = is_numbers ? VALUE_LIST : VALUE_OTHER;
    return true;
}

static bool value(struct cursor *c, struct value *v)
{
    struct opened o;
    if (!leaf(c, v, &o))
        return false;
    if (o.kind == OPENED_LIST)
        return list(c, o.n, v);
    if (o.kind == OPENED_MAP) {
        v->kind = VALUE_OTHER;
        return skip_children(c, children(&o), 2);
    }
    return true;
}

static bool map(struct cursor *c, uint64_t n, struct element *e)
{
    for (uint64_t i = 0; i < n; i++) {
        struct value key, v;
        struct opened o;
        if (!leaf(c, &key, &o))
            return false;
        if (holds_values(&o))
            return fail(c, "a key of a map is a list or a map");
        if (!value(c, &v))
            return false;
        if (key.kind == VALUE_TEXT)
            element_set(e, &key.text, &v);
    }
    return true;
}

/* The elements of the outer list, or the one map. */
static bool elements(struct cursor *c, struct wire_decoder *d,
                     bool *is_wrong_version)
{
    struct opened outer, o;
    struct value v;
    struct element e;
    if (!leaf(c, &v, &outer))
        return false;
    decode_begin(d, &e);
    if (outer.kind == OPENED_MAP) {
        if (!map(c, outer.n, &e))
            return false;
        decode_take(d, &e, is_wrong_version);
        return true;
    }
    if (outer.kind != OPENED_LIST)
        return fail(c, "neither a map nor a list of maps");
    if (outer.n > (uint64_t)(c->end - c->at))
        return fail(c, truncated);
    for (uint64_t i = 0; i < outer.n; i++) {
        if (!leaf(c, &v, &o))
            return false;
        decode_begin(d, &e);
        bool is_map = o.kind == OPENED_MAP;
        e.reason = is_map ? NULL : "an element of the list is no map";
        if (is_map ? !map(c, o.n, &e)
                   : o.kind == OPENED_LIST && !skip_children(c, o.n, 1))
            return false;
        decode_take(d, &e, is_wrong_version);
    }
    return true;
}

const char *decode_msgpack(struct wire_decoder *d, const uint8_t *bytes,
                           size_t len, bool *is_wrong_version)
{
    struct cursor c = {bytes, bytes + len, NULL};
    if (elements(&c, d, is_wrong_version))
        while (c.at < c.end &&
               (*c.at == 0 || *c.at == '\n' || *c.at == '\r'))
            c.at++;
    if (!c.broken && c.at < c.end)
        fail(&c, "more bytes behind the end: send one map or one list");
    d->at = (int)(c.at - bytes);
    return c.broken;
}
