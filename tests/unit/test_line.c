/* The arrival line, driven by made-up clocks. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/line.h"
#include "tests/suite.h"

#define MS 1000000ll

static const int64_t real0_ns = 1700000000000000000, mono0_ns = 5000000000;

static struct line line;

static void begin(void)
{
    line_start(&line, (struct line_reading){real0_ns, mono0_ns});
}

/* The clocks after so long, the host's realtime having been moved by step. */
static struct line_reading after(int64_t elapsed_ns, int64_t step_ns)
{
    return (struct line_reading){real0_ns + elapsed_ns + step_ns,
                                 mono0_ns + elapsed_ns};
}

START_TEST(the_line_begins_at_realtime_and_runs_on_through_a_step)
{
    ck_assert_int_eq(line_now(&line, after(0, 0)), real0_ns);
    ck_assert_int_eq(line_now(&line, after(7 * MS, -3600000 * MS)),
                     real0_ns + 7 * MS);
}
END_TEST

START_TEST(a_datagram_arrived_as_long_ago_as_its_stamp_is_old)
{
    struct line_reading now = after(500 * MS, 0);
    ck_assert_int_eq(line_arrival(&line, now, now.real_ns - 3 * MS),
                     real0_ns + 497 * MS);
    now = after(500 * MS, 40 * MS); /* clock and stamp moved together */
    ck_assert_int_eq(line_arrival(&line, now, now.real_ns - 3 * MS),
                     real0_ns + 497 * MS);
}
END_TEST

START_TEST(a_stamp_ahead_of_the_clock_arrived_now)
{
    struct line_reading now = after(500 * MS, 0);
    ck_assert_int_eq(line_arrival(&line, now, now.real_ns + 20 * MS),
                     real0_ns + 500 * MS);
}
END_TEST

START_TEST(no_datagram_arrived_more_than_a_second_ago)
{
    struct line_reading now = after(5000 * MS, 0);
    ck_assert_int_eq(line_arrival(&line, now, now.real_ns - 1000 * MS),
                     real0_ns + 4000 * MS);
    ck_assert_int_eq(line_arrival(&line, now, now.real_ns - 1001 * MS),
                     real0_ns + 4000 * MS);
}
END_TEST

static const int64_t sides[] = {1, -1};

START_TEST(a_clock_off_by_more_than_100_ms_for_more_than_2_s_was_stepped)
{
    int64_t off_ns = sides[_i] * 101 * MS;
    ck_assert(!line_is_stepped(&line, after(0, 0)));
    ck_assert(!line_is_stepped(&line, after(1000 * MS, off_ns)));
    ck_assert(!line_is_stepped(&line, after(3000 * MS, off_ns)));
    ck_assert(line_is_stepped(&line, after(3000 * MS + 1, off_ns)));
}
END_TEST

START_TEST(a_clock_off_by_100_ms_was_not_stepped)
{
    for (int64_t t = 0; t < 10000; t += 500)
        ck_assert(!line_is_stepped(&line, after(t * MS, sides[_i] * 100 * MS)));
}
END_TEST

START_TEST(a_clock_that_comes_back_in_time_was_not_stepped)
{
    ck_assert(!line_is_stepped(&line, after(1000 * MS, 500 * MS)));
    ck_assert(!line_is_stepped(&line, after(2900 * MS, 0)));
    ck_assert(!line_is_stepped(&line, after(3000 * MS, 500 * MS)));
    ck_assert(!line_is_stepped(&line, after(4900 * MS, 500 * MS)));
    ck_assert(line_is_stepped(&line, after(5001 * MS, 500 * MS)));
}
END_TEST

START_TEST(a_new_start_takes_the_step_in)
{
    struct line_reading now = after(4000 * MS, -7000 * MS);
    line_is_stepped(&line, after(1000 * MS, -7000 * MS));
    ck_assert(line_is_stepped(&line, now));
    line_start(&line, now);
    ck_assert(!line_is_stepped(&line, now));
    ck_assert_int_eq(line_now(&line, now), now.real_ns);
}
END_TEST

START_TEST(the_clocks_of_this_host_run)
{
    struct line_reading a = line_read(), b = line_read();
    ck_assert_int_ge(b.mono_ns, a.mono_ns);
    ck_assert_int_gt(a.real_ns, 1600000000000000000);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("line");
    TCase *t = tcase_create("line");
    tcase_add_checked_fixture(t, begin, NULL);
    tcase_add_test(t, the_line_begins_at_realtime_and_runs_on_through_a_step);
    tcase_add_test(t, a_datagram_arrived_as_long_ago_as_its_stamp_is_old);
    tcase_add_test(t, a_stamp_ahead_of_the_clock_arrived_now);
    tcase_add_test(t, no_datagram_arrived_more_than_a_second_ago);
    tcase_add_loop_test(
        t, a_clock_off_by_more_than_100_ms_for_more_than_2_s_was_stepped, 0, 2);
    tcase_add_loop_test(t, a_clock_off_by_100_ms_was_not_stepped, 0, 2);
    tcase_add_test(t, a_clock_that_comes_back_in_time_was_not_stepped);
    tcase_add_test(t, a_new_start_takes_the_step_in);
    tcase_add_test(t, the_clocks_of_this_host_run);
    suite_add_tcase(s, t);
    return s;
}
