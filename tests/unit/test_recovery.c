/* Tracks that go wrong, restart, retire or are outvoted; numbers that come
 * twice or never. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/support/drive.h"

#define S     ((int64_t)1000000000)
#define START (1700000000 * S)

static void see(struct drive *d, double at_s, double t_s, const char *sensor,
                const char *more)
{
    drive_feed(d, START + (int64_t)(at_s * 1e9 + 0.5),
               "{\"sensor\":\"%s\",\"ns\":%lld,%s}", sensor,
               (long long)(START + (int64_t)(t_s * 1e9 + 0.5)), more);
}

static void begin(struct drive *d, const char *rig)
{
    drive_init(d, rig);
    d->keeps_text = true;
    drive_start(d, START);
}

static bool has(const struct drive *d, const char *text)
{
    return strstr(d->all, text) != NULL;
}

/* --- one sensor, and many
 * ------------------------------------------------------ */

static const char one[] =
    "{\"tracks\": {\"t\": {\"state\": [{\"model\": \"random-walk\", \"name\":"
    " \"x\", \"unit\": \"m\", \"q\": \"1e-4 m2/s\"}], \"lost\": {\"after\":"
    " \"1 s\"}}}, \"sensors\": {\"s\": {\"reads\": \"x\", \"u\": 1, \"rate\":"
    " \"10 Hz\"}}}";

/* Widening does not make it good again, and a lone sensor is not set aside. */
START_TEST(a_track_whose_all_is_refused_is_never_good)
{
    struct drive d;
    begin(&d, one);
    for (int i = 0; i < 20; i++)
        see(&d, 1 + 0.1 * i, 1 + 0.1 * i, "s", "\"z\":0");
    size_t before = d.n_live;
    for (int i = 0; i < 13; i++)
        see(&d, 3 + 0.1 * i, 3 + 0.1 * i, "s", "\"z\":100000");
    const char *doubtful = strstr(d.live + before, "\"verdict\":\"doubtful\"");
    ck_assert_ptr_nonnull(doubtful);
    ck_assert_ptr_nonnull(strstr(doubtful, "\"verdict\":\"lost\""));
    ck_assert_ptr_null(strstr(doubtful, "\"verdict\":\"good\""));
    ck_assert(!has(&d, "set-aside"));
    drive_fini(&d);
}
END_TEST

/* Three places against one rate: the rate cannot vouch for the place. */
START_TEST(most_sensors_refused_is_the_tracks_fault)
{
    struct drive d;
    begin(&d,
          "{\"tracks\": {\"t\": {\"state\": [{\"model\":"
          " \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\", \"q\":"
          " 0.01}], \"start\": {\"x\": {\"mean\": 0, \"u\": \"0.1 m\"},"
          " \"x.rate\": {\"mean\": 0, \"u\": 1}}}}, \"sensors\": {\"a\":"
          " {\"reads\": \"x\", \"u\": \"0.01 m\"}, \"b\": {\"like\": \"a\"},"
          " \"c\": {\"like\": \"a\"}, \"v\": {\"reads\": \"x.rate\", \"u\":"
          " \"0.01 m/s\"}}}");
    static const char *const names[] = {"a", "b", "c", "v"};
    for (int i = 0; i < 400; i++) { /* it stands at 1 m, not at 0 */
        double t_s = 1 + 0.01 * i;
        see(&d, t_s, t_s, names[i % 4], i % 4 == 3 ? "\"z\":0" : "\"z\":1");
    }
    run_stop(d.run, START + 10 * S);
    ck_assert(has(&d, "\"event\":\"widened\""));
    ck_assert_uint_gt(drive_total(&d, OUTCOME_USED), 350);
    drive_fini(&d);
}
END_TEST

/* A constant before others, one sum read: what a restart keeps of it must not
 * outgrow the state. */
START_TEST(a_restart_keeps_as_many_unknowns_as_there_are_states)
{
    struct drive d;
    begin(&d,
          "{\"tracks\": {\"t\": {\"state\": [{\"model\": \"constant\","
          " \"name\": \"c\", \"unit\": \"m\"}, {\"model\": \"random-walk\","
          " \"name\": \"x\", \"unit\": \"m\", \"q\": 1}, {\"model\":"
          " \"random-walk\", \"name\": \"y\", \"unit\": \"m\", \"q\": 1},"
          " {\"model\": \"random-walk\", \"name\": \"z\", \"unit\": \"m\","
          " \"q\": 1}]}}, \"sensors\": {\"s\": {\"reads\": {\"c\": 1, \"x\": 1,"
          " \"y\": 1, \"z\": 1}, \"u\": 1}, \"f\": {\"reads\": [\"c\", \"x\","
          " \"y\", \"z\"], \"u\": 1}}}");
    see(&d, 1, 1, "s", "\"z\":10");
    run_reanchor(d.run, START + 10 * S);
    for (int i = 0; i < 3; i++)
        see(&d, 11 + 0.1 * i, 11 + 0.1 * i, "f", "\"z\":[1,2,3,4]");
    run_stop(d.run, START + 20 * S);
    ck_assert(has(&d, "\"x\":[1,2,3,4],\"u\":[1,1,1,1]"));
    ck_assert_uint_eq(drive_total(&d, OUTCOME_USED), 4);
    drive_fini(&d);
}
END_TEST

/* --- tracks of a prefix
 * -------------------------------------------------------- */

static const char prefix[] =
    "{\"order\": {\"horizon\": \"2 s\"}, \"limits\": {\"tracks\": 2},"
    " \"tracks\": {\"p-*\": {\"state\": [{\"model\": \"random-walk\", \"name\":"
    " \"x\", \"unit\": \"m\", \"q\": \"1 m2/s\"}]}}, \"sensors\": {\"s\":"
    " {\"track\": \"p-*\", \"reads\": \"x\", \"u\": 1}}}";

/* Times of arrival and stamps of three measurements, in two orders. */
static void same_settled(const double (*a)[2], const double (*b)[2])
{
    struct drive one_way, other;
    begin(&one_way, prefix);
    begin(&other, prefix);
    for (int i = 0; i < 3; i++) {
        see(&one_way, a[i][0], a[i][1], "s", "\"z\":1,\"track\":\"p-1\"");
        see(&other, b[i][0], b[i][1], "s", "\"z\":1,\"track\":\"p-1\"");
    }
    run_stop(one_way.run, START + 100 * S);
    run_stop(other.run, START + 100 * S);
    ck_assert_uint_gt(one_way.n_settled, 0);
    ck_assert_str_eq(one_way.settled, other.settled);
    ck_assert_uint_eq(drive_total(&one_way, OUTCOME_UNKNOWN_TRACK),
                      drive_total(&other, OUTCOME_UNKNOWN_TRACK));
    drive_fini(&one_way);
    drive_fini(&other);
}

START_TEST(a_lone_first_is_left_out_whenever_it_comes)
{
    static const double in_order[][2] = {{10, 10}, {11.5, 11.5}, {11.6, 11.6}};
    static const double late[][2] = {{11.5, 11.5}, {11.6, 11.6}, {11.9, 10}};
    same_settled(in_order, late);
}
END_TEST

START_TEST(what_follows_a_long_gap_begins_anew_whenever_it_comes)
{
    static const double at_once[][2] = {{10, 10}, {10.1, 10.1}, {76.5, 76.5}};
    static const double later[][2] = {{10, 10}, {10.1, 10.1}, {78.2, 76.5}};
    same_settled(at_once, later);
}
END_TEST

START_TEST(tracks_retire_after_the_line_jumped)
{
    struct drive d;
    begin(&d, prefix);
    see(&d, 1, 1, "s", "\"z\":1,\"track\":\"p-1\"");
    see(&d, 1.1, 1.1, "s", "\"z\":1,\"track\":\"p-1\"");
    run_reanchor(d.run, START + 10 * S);
    run_advance(d.run, START + 200 * S);
    ck_assert(has(&d, "\"event\":\"retired\""));
    drive_fini(&d);
}
END_TEST

/* --- numbers
 * ------------------------------------------------------------------- */

START_TEST(a_number_before_the_first_makes_up_for_none)
{
    struct drive d;
    begin(&d, one);
    see(&d, 1, 1, "s", "\"z\":0,\"seq\":10");
    see(&d, 1.1, 1.1, "s", "\"z\":0,\"seq\":12");
    see(&d, 1.2, 1.2, "s", "\"z\":0,\"seq\":9");
    ck_assert_uint_eq(run_counts(d.run)->total.tally[TALLY_LOST], 1);
    drive_fini(&d);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("recovery");
    TCase *t = tcase_create("recovery");
    tcase_add_test(t, a_track_whose_all_is_refused_is_never_good);
    tcase_add_test(t, most_sensors_refused_is_the_tracks_fault);
    tcase_add_test(t, a_restart_keeps_as_many_unknowns_as_there_are_states);
    tcase_add_test(t, a_lone_first_is_left_out_whenever_it_comes);
    tcase_add_test(t, what_follows_a_long_gap_begins_anew_whenever_it_comes);
    tcase_add_test(t, tracks_retire_after_the_line_jumped);
    tcase_add_test(t, a_number_before_the_first_makes_up_for_none);
    suite_add_tcase(s, t);
    return s;
}
