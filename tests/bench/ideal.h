/* ideal.h - the least that reading a bench's datagram can cost: a decoder that
 * knows which keys and forms come. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_BENCH_IDEAL_H
#define TESTS_BENCH_IDEAL_H

#include <endian.h>
#include <stdbool.h>
#include <stdint.h>
#include <string.h>

struct ideal_measurement {
    int track;
    int64_t t_ns;
    uint32_t seq;
    double z[2];
};

static inline uint64_t ideal_u64(const uint8_t *at)
{
    uint64_t value;
    memcpy(&value, at, sizeof value);
    return be64toh(value);
}

static inline double ideal_double(const uint8_t *at)
{
    uint64_t bits = ideal_u64(at);
    double value;
    memcpy(&value, &bits, sizeof value);
    return value;
}

/* One value by its key; NULL if it is not of the form that bench_datagram
 * writes. */
static inline const uint8_t *ideal_value(const uint8_t *key, size_t len,
                                         const uint8_t *at, const uint8_t *end,
                                         struct ideal_measurement *m)
{
    if (len == 1 && *key == 'z') {
        if (end - at < 19 || at[0] != 0x92 || at[1] != 0xcb || at[10] != 0xcb)
            return NULL;
        m->z[0] = ideal_double(at + 2);
        m->z[1] = ideal_double(at + 11);
        return at + 19;
    }
    if (len == 2 && memcmp(key, "ns", 2) == 0) {
        if (end - at < 9 || *at != 0xcf)
            return NULL;
        m->t_ns = (int64_t)ideal_u64(at + 1);
        return at + 9;
    }
    if (len == 3 && memcmp(key, "seq", 3) == 0) {
        if (end - at < 5 || *at != 0xce)
            return NULL;
        memcpy(&m->seq, at + 1, sizeof m->seq);
        m->seq = be32toh(m->seq);
        return at + 5;
    }
    if (end - at < 1 || (*at & 0xe0) != 0xa0 || end - at <= (*at & 0x1f))
        return NULL;
    size_t text = *at & 0x1f;
    if (len == 5 && text == 5 && memcmp(key, "track", 5) == 0)
        m->track = (at[3] - '0') * 100 + (at[4] - '0') * 10 + at[5] - '0';
    return at + 1 + text;
}

static inline bool ideal_decode(const uint8_t *at, size_t len,
                                struct ideal_measurement *m)
{
    const uint8_t *end = at + len;
    if (len < 1 || (*at & 0xf0) != 0x80)
        return false;
    int n = *at++ & 0x0f;
    while (n-- > 0) {
        if (end - at < 2 || (*at & 0xe0) != 0xa0)
            return false;
        size_t key = *at & 0x1f;
        if ((size_t)(end - at) <= key)
            return false;
        at = ideal_value(at + 1, key, at + 1 + key, end, m);
        if (at == NULL)
            return false;
    }
    return at == end;
}

#endif
