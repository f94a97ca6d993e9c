/* What the engine promises: cost of late arrivals, no allocation, honest u,
 * recovery, verdicts, ledgers. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "tests/suite.h"
#include "tests/support/drive.h"

#define MS 1000000
#define T0 ((int64_t)1700000000 * 1000000000)

static const char one_axis[] =
    "{\"order\": {\"horizon\": \"1 s\"},"
    " \"tracks\": {\"carriage\": {\"state\": [{\"model\":"
    "   \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\","
    "   \"q\": \"0.02 m2/s3\"}],"
    "   \"good\": {\"u\": {\"x\": \"0.1 m\"}},"
    "   \"lost\": {\"u\": {\"x\": \"20 m\"}, \"after\": \"2 s\"}}},"
    " \"sensors\": {\"laser\": {\"track\": \"carriage\", \"reads\": \"x\","
    "   \"unit\": \"m\", \"u\": \"0.01 m\", \"rate\": \"100 Hz\"}}}";

/* Nine states, so that checkpoints are sparse. */
static const char three_axes[] =
    "{\"order\": {\"horizon\": \"1 s\"},"
    " \"tracks\": {\"rig\": {\"state\": ["
    "  {\"model\": \"constant-acceleration\", \"name\": \"x\","
    "   \"unit\": \"m\", \"q\": \"1 m2/s5\"},"
    "  {\"model\": \"constant-acceleration\", \"name\": \"y\","
    "   \"unit\": \"m\", \"q\": \"1 m2/s5\"},"
    "  {\"model\": \"constant-acceleration\", \"name\": \"z\","
    "   \"unit\": \"m\", \"q\": \"1 m2/s5\"}]}},"
    " \"sensors\": {\"frame\": {\"track\": \"rig\","
    "   \"reads\": [\"x\", \"y\", \"z\"], \"unit\": \"m\","
    "   \"u\": \"0.01 m\", \"rate\": \"100 Hz\"}}}";

/* --- cost -------------------------------------------------------------------
 */

static void feed_one(struct drive *d, bool is_wide, int64_t t_ns, int64_t a_ns)
{
    if (is_wide)
        drive_feed(d, a_ns, "{\"sensor\":\"frame\",\"z\":[1,2,3],\"ns\":%lld}",
                   (long long)t_ns);
    else
        drive_feed(d, a_ns, "{\"sensor\":\"laser\",\"z\":1,\"ns\":%lld}",
                   (long long)t_ns);
}

START_TEST(a_late_arrival_k_deep_costs_at_most_k_plus_8_steps)
{
    struct drive d;
    bool is_wide = _i == 1;
    drive_init(&d, is_wide ? three_axes : one_axis);
    d.keeps_text = false;
    drive_start(&d, T0);
    int64_t t_ns = T0;
    for (int i = 0; i < 90; i++, t_ns += 10 * MS)
        feed_one(&d, is_wide, t_ns + 10 * MS, t_ns + 10 * MS);
    for (int k = 0; k < 85; k++) {
        uint64_t before = run_steps(d.run);
        feed_one(&d, is_wide, t_ns - k * 10 * MS - 5 * MS, t_ns);
        uint64_t cost = run_steps(d.run) - before;
        /* k + 1 whole steps and k late ones put in before lie behind it */
        ck_assert_msg(cost <= (uint64_t)(2 * k + 2 + 8), "k = %d: %llu steps",
                      k, (unsigned long long)cost);
        ck_assert_uint_ge(cost, (uint64_t)k + 1);
    }
    drive_fini(&d);
}
END_TEST

START_TEST(one_late_arrival_in_a_full_ring_costs_its_depth_plus_8)
{
    struct drive d;
    bool is_wide = _i % 2 == 1;
    int k = 3 + 7 * (_i / 2);
    drive_init(&d, is_wide ? three_axes : one_axis);
    d.keeps_text = false;
    drive_start(&d, T0);
    int64_t t_ns = T0;
    for (int i = 0; i < 400; i++, t_ns += 10 * MS)
        feed_one(&d, is_wide, t_ns + 10 * MS, t_ns + 10 * MS);
    uint64_t before = run_steps(d.run);
    feed_one(&d, is_wide, t_ns - k * 10 * MS + 5 * MS, t_ns);
    uint64_t cost = run_steps(d.run) - before;
    ck_assert_uint_ge(cost, (uint64_t)k);
    ck_assert_uint_le(cost, (uint64_t)k + 8);
    drive_fini(&d);
}
END_TEST

/* --- allocation --------------------------------------------------------------
 */

/* The loader's own allocations do not count: only what happens in between. */
static volatile bool is_counting; /* the compiler knows malloc: tell it */
static volatile uint64_t n_allocations;

void *__real_malloc(size_t size);
void *__real_calloc(size_t n, size_t size);
void *__real_realloc(void *p, size_t size);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t n, size_t size);
void *__wrap_realloc(void *p, size_t size);

void *__wrap_malloc(size_t size)
{
    n_allocations += is_counting;
    return __real_malloc(size);
}

void *__wrap_calloc(size_t n, size_t size)
{
    n_allocations += is_counting;
    return __real_calloc(n, size);
}

void *__wrap_realloc(void *p, size_t size)
{
    n_allocations += is_counting;
    return __real_realloc(p, size);
}

START_TEST(a_million_measurements_allocate_nothing)
{
    struct drive d;
    struct random r;
    random_init(&r, 5, 0);
    drive_init(&d, one_axis);
    d.keeps_text = false;
    drive_start(&d, T0);
    uint64_t probe = n_allocations;
    is_counting = true;
    void *volatile block = malloc(1); /* not optimised away */
    is_counting = false;
    free(block);
    ck_assert_uint_eq(n_allocations, probe + 1); /* the shim does count */
    n_allocations = 0;
    is_counting = true;
    for (int i = 0; i < 1000000; i++) {
        int64_t a_ns = T0 + (int64_t)i * 10 * MS;
        int64_t t_ns = a_ns - (int64_t)random_below(&r, 90) * MS;
        char text[96];
        int len = snprintf(text, sizeof text,
                           "{\"sensor\":\"laser\",\"z\":%d.5,\"ns\":%lld,"
                           "\"seq\":%d}",
                           i % 3 == 0 ? 900 : 1, (long long)t_ns, i);
        drive_feed_bytes(&d, a_ns, text, (size_t)len);
    }
    run_stop(d.run, T0 + (int64_t)1000001 * 10 * MS);
    is_counting = false;
    printf("allocations: %llu in 1000000 measurements\n",
           (unsigned long long)n_allocations);
    ck_assert_uint_eq(n_allocations, 0);
    drive_check_ledgers(&d, 1000000, 1000000);
    drive_fini(&d);
}
END_TEST

/* --- honest u ----------------------------------------------------------------
 */

struct truth {
    double x, v;
};

/* Exact step of white acceleration of density q [BSLK01] ch. 6. */
static void move(struct random *r, struct truth *s, double q, double dt)
{
    double a = random_normal(r) * sqrt(q * dt);
    double b = random_normal(r) * sqrt(q * dt * dt * dt / 12);
    s->x += s->v * dt + a * dt / 2 + b;
    s->v += a;
}

static void keep_last(void *ctx, const struct message *m)
{
    struct estimate *copy = ctx;
    if (m->type == MESSAGE_ESTIMATE &&
        ((const struct estimate *)(const void *)m)->stream == STREAM_LIVE)
        memcpy(copy, m, m->bytes);
}

/* How many of 200 tracks hold the truth within 2 u after 10 s. */
static int covered(const char *rig_text, double q)
{
    static union {
        struct estimate e;
        char room[4096];
    } last;
    int n = 0;
    for (int k = 0; k < 200; k++) {
        struct random r;
        struct drive d;
        struct truth s = {5, 1};
        random_init(&r, 900, (uint64_t)k);
        drive_init(&d, rig_text);
        d.keeps_text = false;
        d.on_message = keep_last;
        d.ctx = &last;
        drive_start(&d, T0);
        for (int i = 1; i <= 500; i++) {
            int64_t t_ns = T0 + (int64_t)i * 20 * MS;
            move(&r, &s, q, 0.02);
            drive_feed(&d, t_ns,
                       "{\"sensor\":\"laser\",\"z\":%.9f,"
                       "\"ns\":%lld}",
                       s.x + 0.01 * random_normal(&r), (long long)t_ns);
        }
        double u = sqrt(ud_variance(2, last.e.v + 2, 1));
        n += fabs(last.e.v[1] - s.v) <= 2 * u; /* the rate: most sensitive */
        drive_fini(&d);
    }
    return n;
}

/* k = 2 holds 95.45 % of a normal quantity; 200 tracks: 99.9 % of the time
 * within 181..199 (binomial). */
START_TEST(two_u_hold_the_truth_as_often_as_they_say)
{
    int n = covered(one_axis, 0.02);
    printf("coverage: %d of 200 tracks within 2 u\n", n);
    ck_assert_msg(n >= 181 && n <= 199, "%d of 200", n);
}
END_TEST

START_TEST(with_q_ten_times_wrong_two_u_fail_to_hold_the_truth)
{
    int n = covered(one_axis, 0.2);
    printf("coverage: %d of 200 with q ten times too small\n", n);
    ck_assert_msg(n < 181, "%d of 200: a wrong q passed", n);
}
END_TEST

/* --- recovery
 * ------------------------------------------------------------------ */

START_TEST(an_emergency_stop_is_followed_again)
{
    struct drive d;
    struct random r;
    static union {
        struct estimate e;
        char room[4096];
    } last;
    random_init(&r, 33, (uint64_t)_i);
    drive_init(&d, one_axis);
    d.keeps_text = false;
    d.on_message = keep_last;
    d.ctx = &last;
    drive_start(&d, T0);
    double x = 0, v = 3;
    for (int i = 1; i <= 1000; i++) {
        int64_t t_ns = T0 + (int64_t)i * 20 * MS;
        if (i > 500 && v > 0)
            v = v > 0.08 ? v - 0.08 : 0; /* 4 m/s2 */
        x += v * 0.02;
        double z = x + 0.01 * random_normal(&r);
        if (random_below(&r, 100) == 0)
            z += 0.3;
        drive_feed(&d, t_ns, "{\"sensor\":\"laser\",\"z\":%.6f,\"ns\":%lld}", z,
                   (long long)t_ns);
    }
    ck_assert_double_le(fabs(last.e.v[0] - x), 0.05);
    drive_fini(&d);
}
END_TEST

/* --- verdicts
 * ------------------------------------------------------------------ */

START_TEST(silence_makes_the_verdict_coast_and_then_lose)
{
    struct drive d;
    drive_init(&d, one_axis);
    drive_start(&d, T0);
    for (int i = 1; i <= 100; i++)
        feed_one(&d, false, T0 + (int64_t)i * 10 * MS,
                 T0 + (int64_t)i * 10 * MS);
    ck_assert_ptr_nonnull(strstr(d.live, "\"verdict\":\"starting\""));
    ck_assert_ptr_nonnull(strstr(d.live, "\"undetermined:x.rate\""));
    ck_assert_ptr_nonnull(strstr(d.live, "\"verdict\":\"good\""));
    run_advance(d.run, T0 + (int64_t)1200 * MS);
    ck_assert_ptr_nonnull(strstr(d.all, "\"silent:laser\""));
    ck_assert_ptr_nonnull(strstr(d.all, "\"verdict\":\"coasting\""));
    ck_assert_ptr_null(strstr(d.all, "\"verdict\":\"lost\""));
    run_advance(d.run, T0 + (int64_t)3200 * MS);
    ck_assert_ptr_nonnull(strstr(d.all, "\"verdict\":\"lost\""));
    drive_fini(&d);
}
END_TEST

/* --- the door
 * ------------------------------------------------------------------ */

START_TEST(every_refusal_has_its_own_account)
{
    struct drive d;
    drive_init(&d, one_axis);
    drive_start(&d, T0);
    int64_t a = T0 + 5000 * (int64_t)MS;
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"ns\":%lld,\"seq\":7}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"ns\":%lld,\"seq\":7}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":2,\"ns\":%lld,\"seq\":7}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":null,\"ns\":%lld}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"ns\":%lld}",
               (long long)(a - 1001 * (int64_t)MS));
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"ns\":%lld}",
               (long long)(a + 1001 * (int64_t)MS));
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":[1,2],\"ns\":%lld}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"t\":1234.5}");
    drive_feed(&d, a, "{\"sensor\":\"lasr\",\"z\":1,\"ns\":%lld}",
               (long long)a);
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"track\":\"cart\",\"z\":1}");
    drive_feed(&d, a, "{\"sensor\":");
    drive_feed(&d, a, "{\"sensor\":\"laser\",\"z\":1,\"v\":2}");
    ck_assert_uint_eq(drive_total(&d, OUTCOME_PENDING), 2);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_DUPLICATE), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_NO_READING), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_TOO_LATE), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_TOO_EARLY), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_WRONG_SIZE), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_IMPLAUSIBLE), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_UNKNOWN_SENSOR), 1);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_UNKNOWN_TRACK), 1);
    ck_assert_uint_eq(run_counts(d.run)->total.tally[TALLY_SEQ_CONFLICT], 1);
    drive_check_ledgers(&d, 10, 12);
    drive_fini(&d);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("engine");
    TCase *t = tcase_create("engine");
    tcase_set_timeout(t, 200);
    tcase_add_loop_test(t, a_late_arrival_k_deep_costs_at_most_k_plus_8_steps,
                        0, 2);
    tcase_add_loop_test(
        t, one_late_arrival_in_a_full_ring_costs_its_depth_plus_8, 0, 20);
    tcase_add_test(t, a_million_measurements_allocate_nothing);
    tcase_add_test(t, two_u_hold_the_truth_as_often_as_they_say);
    tcase_add_test(t, with_q_ten_times_wrong_two_u_fail_to_hold_the_truth);
    tcase_add_loop_test(t, an_emergency_stop_is_followed_again, 0, 20);
    tcase_add_test(t, silence_makes_the_verdict_coast_and_then_lose);
    tcase_add_test(t, every_refusal_has_its_own_account);
    suite_add_tcase(s, t);
    return s;
}
