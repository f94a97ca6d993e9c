/* Patterns give what decoding gives: a decoder that has seen many datagrams
 * against one that sees each first. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/math/random.h"
#include "core/wire/decode.h"
#include "tests/suite.h"

enum { SIZE = 160 };

static struct wire_decoder used, fresh;

struct datagram {
    uint8_t bytes[SIZE];
    size_t len;
};

static void put(struct datagram *d, uint8_t head, uint64_t value, int n)
{
    d->bytes[d->len++] = head;
    for (int shift = 8 * (n - 1); shift >= 0; shift -= 8)
        d->bytes[d->len++] = (uint8_t)(value >> shift);
}

static void put_text(struct datagram *d, const char *text)
{
    size_t len = strlen(text);
    d->bytes[d->len++] = (uint8_t)(0xa0 | len);
    memcpy(d->bytes + d->len, text, len);
    d->len += len;
}

static void put_double(struct datagram *d, double x)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    put(d, 0xcb, bits, 8);
}

/* One of several forms that senders use, with random values. */
static void make(struct random *r, struct datagram *d)
{
    static const char *const ids[] = {"laser", "wheel", "r-017", "r-018"};
    int form = (int)random_below(r, 4);
    d->len = 0;
    d->bytes[d->len++] = (uint8_t)(0x84 + (form == 2) + (form == 3));
    put_text(d, "sensor");
    put_text(d, ids[random_below(r, 2)]);
    put_text(d, form == 1 ? "t" : "ns");
    if (form == 1)
        put_double(d, 1.7e9 + random_uniform(r));
    else
        put(d, 0xcf, 1700000000000000000 + random_below(r, 1000000000), 8);
    put_text(d, "seq");
    put(d, 0xce, random_below(r, 1u << 31), 4);
    if (form == 2) {
        put_text(d, "track");
        put_text(d, ids[2 + random_below(r, 2)]);
    }
    put_text(d, "z");
    if (form == 2) {
        d->bytes[d->len++] = 0x92;
        put_double(d, random_normal(r));
    }
    put_double(d, random_normal(r));
    if (form == 3) {
        put_text(d, "v");
        d->bytes[d->len++] = 1;
    }
}

static bool is_same_text(struct text a, struct text b)
{
    return a.len == b.len &&
           (a.len == 0 || memcmp(a.at, b.at, (size_t)a.len) == 0);
}

static bool is_same_list(const double *a, const double *b, int n)
{
    n = n < READS_MAX ? n : READS_MAX;
    return memcmp(a, b, (size_t)n * sizeof *a) == 0;
}

static bool is_same(const struct measurement *a, const struct measurement *b)
{
    return is_same_text(a->sensor, b->sensor) &&
           is_same_text(a->track, b->track) && is_same_text(a->name, b->name) &&
           is_same_text(a->note, b->note) && a->mark == b->mark &&
           a->has_t == b->has_t && (!a->has_t || a->t_ns == b->t_ns) &&
           a->has_seq == b->has_seq && (!a->has_seq || a->seq == b->seq) &&
           a->n_z == b->n_z && is_same_list(a->z, b->z, a->n_z) &&
           a->n_u == b->n_u && is_same_list(a->u, b->u, a->n_u) &&
           a->has_cov == b->has_cov;
}

/* True if the datagram was good; fails the test if the two differ. */
static bool compare(const struct datagram *d)
{
    memset(fresh.pattern, 0, sizeof fresh.pattern);
    enum datagram_outcome a = wire_decode(&used, d->bytes, d->len);
    enum datagram_outcome b = wire_decode(&fresh, d->bytes, d->len);
    bool is_good = a == b && used.n == fresh.n && used.n_bad == fresh.n_bad &&
                   used.at == fresh.at && used.reason == fresh.reason;
    for (int i = 0; i < used.n && is_good; i++)
        is_good = is_same(&used.element[i], &fresh.element[i]);
    ck_assert(is_good);
    return a == DATAGRAM_DECODED;
}

START_TEST(good_datagrams_give_the_same)
{
    struct random r;
    random_init(&r, 41, 0);
    for (int i = 0; i < 20000; i++) {
        struct datagram d;
        make(&r, &d);
        ck_assert(compare(&d));
    }
}
END_TEST

/* Nearly alike is what a pattern could be wrong about: one byte changed, the
 * end cut off, or bytes added. */
START_TEST(mutants_give_the_same)
{
    struct random r;
    int n_good = 0, n = 50000;
    random_init(&r, 42, 0);
    for (int i = 0; i < n; i++) {
        struct datagram d;
        make(&r, &d);
        compare(&d); /* learn */
        size_t at = random_below(&r, d.len);
        switch (random_below(&r, 4)) {
        case 0:
            d.bytes[at] = (uint8_t)random_below(&r, 256);
            break;
        case 1:
            d.bytes[at] ^= (uint8_t)(1u << random_below(&r, 8));
            break;
        case 2:
            d.len = at;
            break;
        default:
            d.bytes[d.len++] = (uint8_t)random_below(&r, 2);
        }
        n_good += compare(&d);
    }
    ck_assert_int_gt(n_good, n / 10);
    ck_assert_int_lt(n_good, n * 9 / 10);
}
END_TEST

/* Values that the ordinary way refuses although their form is the same. */
START_TEST(values_in_doubt_are_refused_as_ever)
{
    struct random r;
    struct datagram d;
    random_init(&r, 43, 0);
    static const double stamps[] = {1.7e9, 1.7e12, 1.0 / 0.0, 0.0 / 0.0};
    for (int i = 0; i < 8; i++) {
        d.len = 0;
        d.bytes[d.len++] = 0x83;
        put_text(&d, "sensor");
        put_text(&d, i < 4 ? "laser" : "las/r");
        put_text(&d, "t");
        put_double(&d, stamps[i % 4]);
        put_text(&d, "z");
        put_double(&d, 1.5);
        ck_assert_int_eq(compare(&d), i == 0);
    }
    d.len = 0;
    d.bytes[d.len++] = 0x83;
    put_text(&d, "sensor");
    put_text(&d, "laser");
    put_text(&d, "z");
    put_double(&d, 1.5);
    put_text(&d, "ns");
    put(&d, 0xcf, 5, 8);
    ck_assert(compare(&d));
    d.bytes[d.len - 8] = 0x80; /* beyond an int64 */
    ck_assert(!compare(&d));
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("pattern");
    TCase *c = tcase_create("pattern");
    tcase_add_test(c, good_datagrams_give_the_same);
    tcase_add_test(c, mutants_give_the_same);
    tcase_add_test(c, values_in_doubt_are_refused_as_ever);
    suite_add_tcase(s, c);
    return s;
}
