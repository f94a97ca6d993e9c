/* The queue between two threads, alone and with both at work; the list of
 * host messages and the pool of shared bytes beside it. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <pthread.h>
#include <sched.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "daemon/host.h"
#include "daemon/ring.h"
#include "daemon/shared.h"
#include "tests/suite.h"

static struct ring ring;

static void begin(void)
{
    ck_assert_int_eq(ring_init(&ring, 4096), ST_OK);
}

static void end(void)
{
    ring_fini(&ring);
}

/* A record that says who it is in every byte. */
static bool put(unsigned number, size_t len)
{
    uint8_t *at = ring_reserve(&ring, len);
    if (!at)
        return false;
    ck_assert_uint_eq((uintptr_t)at % 8, 0);
    memset(at, (int)(number % 251), len);
    ring_commit(&ring, len);
    return true;
}

static bool is_next(unsigned number, size_t len)
{
    size_t got;
    const uint8_t *at = ring_front(&ring, &got);
    bool is_same = at && got == len;
    for (size_t i = 0; is_same && i < len; i++)
        is_same = at[i] == (uint8_t)(number % 251);
    if (at)
        ring_pop(&ring);
    return is_same;
}

START_TEST(an_empty_ring_gives_nothing)
{
    size_t len;
    ck_assert_ptr_null(ring_front(&ring, &len));
    ck_assert(put(1, 0));
    ck_assert(is_next(1, 0));
    ck_assert_ptr_null(ring_front(&ring, &len));
    ck_assert_uint_eq(ring_used(&ring), 0);
}
END_TEST

START_TEST(records_of_any_length_come_out_as_they_went_in)
{
    struct random random;
    size_t len[4096];
    unsigned in = 0, out = 0;
    random_init(&random, 7, 0);
    for (int i = 0; i < 200000; i++) {
        size_t want = (size_t)random_below(&random, 700);
        if (random_below(&random, 2) == 0 && in - out < 4096 && put(in, want))
            len[in++ % 4096] = want;
        else if (out < in) {
            ck_assert(is_next(out, len[out % 4096]));
            out++;
        }
    }
    ck_assert_uint_gt(out, 50000);
}
END_TEST

/* 8 bytes of head and 120 of record: 32 of them fill 4096 bytes exactly. */
START_TEST(a_full_ring_refuses_and_overwrites_nothing)
{
    size_t len;
    for (int round = 0; round < 3; round++) {
        for (unsigned i = 0; i < 32; i++)
            ck_assert(put(i, 120));
        ck_assert(!put(99, 0));
        ck_assert_uint_eq(ring_used(&ring), 4096);
        for (unsigned i = 0; i < 32; i++)
            ck_assert(is_next(i, 120));
        ck_assert_ptr_null(ring_front(&ring, &len));
    }
}
END_TEST

START_TEST(a_record_that_does_not_fit_before_the_end_stands_at_the_beginning)
{
    ck_assert(put(1, 2000));
    ck_assert(put(2, 1000));
    ck_assert(is_next(1, 2000));
    ck_assert(put(3, 1500)); /* 1072 bytes are left before the end */
    ck_assert(!put(4, 600)); /* in front of the second there is no room */
    ck_assert(is_next(2, 1000));
    ck_assert(is_next(3, 1500));
}
END_TEST

START_TEST(a_record_of_more_than_half_the_ring_is_refused)
{
    ck_assert(!put(2, 2041));
    ck_assert(put(1, 2040));
    ck_assert(is_next(1, 2040));
}
END_TEST

START_TEST(less_may_be_committed_than_was_reserved)
{
    uint8_t *at = ring_reserve(&ring, 1000);
    ck_assert_ptr_nonnull(at);
    memset(at, 5, 10);
    ring_commit(&ring, 10);
    ck_assert(put(6, 20));
    ck_assert(is_next(5, 10));
    ck_assert(is_next(6, 20));
}
END_TEST

enum { N_THREADED = 1000000 };

static void *write_all(void *ctx)
{
    (void)ctx;
    for (uint64_t i = 0; i < N_THREADED;) {
        size_t len = 8 + i % 90;
        uint8_t *at = ring_reserve(&ring, len);
        if (!at) {
            sched_yield();
            continue;
        }
        memcpy(at, &i, 8);
        memset(at + 8, (int)(i % 251), len - 8);
        ring_commit(&ring, len);
        i++;
    }
    return NULL;
}

START_TEST(two_threads_pass_a_million_records_without_a_fault)
{
    pthread_t writer;
    ck_assert_int_eq(pthread_create(&writer, NULL, write_all, NULL), 0);
    for (uint64_t i = 0; i < N_THREADED;) {
        size_t len;
        uint64_t number;
        const uint8_t *at = ring_front(&ring, &len);
        if (!at) {
            sched_yield();
            continue;
        }
        memcpy(&number, at, 8);
        bool is_good = number == i && len == 8 + i % 90;
        for (size_t k = 8; is_good && k < len; k++)
            is_good = at[k] == i % 251;
        ck_assert_msg(is_good, "record %llu", (unsigned long long)i);
        ring_pop(&ring);
        i++;
    }
    pthread_join(writer, NULL);
}
END_TEST

START_TEST(host_messages_beyond_the_list_are_counted_and_told)
{
    struct host host;
    struct host_message list[HOST_MAX + 1];
    host_init(&host);
    for (uint64_t i = 0; i < HOST_MAX + 5; i++)
        host_say(&host, "gap", "a sentence", i);
    ck_assert_int_eq(host_take(&host, list), HOST_MAX + 1);
    ck_assert_str_eq(list[0].what, "gap");
    ck_assert_str_eq(list[0].text, "a sentence");
    ck_assert_uint_eq(list[HOST_MAX - 1].n, HOST_MAX - 1);
    ck_assert_str_eq(list[HOST_MAX].what, "skipped");
    ck_assert_uint_eq(list[HOST_MAX].n, 5);
    ck_assert_int_eq(host_take(&host, list), 0);
    host_fini(&host);
}
END_TEST

START_TEST(shared_bytes_live_until_the_last_user_and_are_used_again)
{
    struct pool pool = {0};
    static char big[100000];
    struct shared *a = shared_new(&pool, "abc", 3);
    a->n_users++;
    shared_drop(a);
    ck_assert_mem_eq(a->bytes, "abc", 3);
    shared_drop(a);
    struct shared *b = shared_new(&pool, "defg", 4);
    ck_assert_ptr_eq(a, b);
    struct shared *c = shared_new(&pool, big, sizeof big);
    ck_assert_uint_eq(c->len, sizeof big);
    shared_drop(c);
    shared_drop(b);
    shared_drop(NULL);
    pool_fini(&pool);
}
END_TEST

START_TEST(a_pool_keeps_no_more_than_its_bound)
{
    enum { N = 2000 }; /* of 8 KiB: twice the bound */
    static struct shared *all[N];
    static char bytes[8000];
    struct pool pool = {0};
    for (int i = 0; i < N; i++)
        all[i] = shared_new(&pool, bytes, sizeof bytes);
    for (int i = 0; i < N; i++)
        shared_drop(all[i]);
    ck_assert_uint_le(pool.kept, POOL_KEPT_MAX);
    ck_assert_uint_gt(pool.kept, POOL_KEPT_MAX / 2);
    pool_fini(&pool);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("ring");
    TCase *t = tcase_create("ring");
    tcase_set_timeout(t, 60);
    tcase_add_checked_fixture(t, begin, end);
    tcase_add_test(t, an_empty_ring_gives_nothing);
    tcase_add_test(t, records_of_any_length_come_out_as_they_went_in);
    tcase_add_test(t, a_full_ring_refuses_and_overwrites_nothing);
    tcase_add_test(
        t, a_record_that_does_not_fit_before_the_end_stands_at_the_beginning);
    tcase_add_test(t, a_record_of_more_than_half_the_ring_is_refused);
    tcase_add_test(t, less_may_be_committed_than_was_reserved);
    tcase_add_test(t, two_threads_pass_a_million_records_without_a_fault);
    tcase_add_test(t, host_messages_beyond_the_list_are_counted_and_told);
    tcase_add_test(t, shared_bytes_live_until_the_last_user_and_are_used_again);
    tcase_add_test(t, a_pool_keeps_no_more_than_its_bound);
    suite_add_tcase(s, t);
    return s;
}
