/* The truth of a rehearsal, and what its sensors say of it. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdlib.h>

#include "tests/suite.h"
#include "tests/unit/play_case.h"

enum { X, RATE, ACCEL, BIAS, GUST };

static const int64_t second = 1000000000;

/* --- the script ----------------------------------------------------------- */

static const double *truth_at(struct play_case *c, int64_t t_ns)
{
    static double x[RIG_STATES_MAX];
    scene_truth(c->scene, 0, t_ns, x);
    return x;
}

static void check_motion(struct play_case *c, double t_s, double x, double rate,
                         double accel)
{
    const double *at = truth_at(c, (int64_t)(t_s * 1e9));
    ck_assert_double_eq_tol(at[X], x, 1e-12);
    ck_assert_double_eq_tol(at[RATE], rate, 1e-12);
    ck_assert_double_eq_tol(at[ACCEL], accel, 1e-12);
}

START_TEST(a_ramp_follows_its_closed_form)
{
    struct play_case c;
    case_init(&c, "{\"truth\": {\"cart\": [{\"of\": \"x\", \"at\": \"5 s\", "
                  "\"accel\": \"1 m/s2\", \"for\": \"3 s\"}]}}");
    check_motion(&c, 4, 0, 0, 0);
    check_motion(&c, 6.5, 1.125, 1.5, 1); /* t^2/2                     */
    check_motion(&c, 8, 4.5, 3, 0);
    check_motion(&c, 20, 4.5 + 36, 3, 0);
    case_fini(&c);
}
END_TEST

START_TEST(a_jerk_leaves_its_accel_until_another_takes_it_back)
{
    struct play_case c;
    case_init(&c, "{\"truth\": {\"cart\": {\"start\": {\"x\": \"300 cm\"}, "
                  "\"moves\": [{\"of\": \"x\", \"at\": 5, \"jerk\": \"2 m/s3\","
                  " \"for\": \"500 ms\"}, {\"of\": \"x\", \"at\": \"7 s\", "
                  "\"jerk\": -2, \"for\": 0.5}]}}}");
    check_motion(&c, 5.5, 3 + 2 * 0.125 / 6, 0.25, 1); /* j t^3/6     */
    check_motion(&c, 7, 3 + 2 * 0.125 / 6 + 0.25 * 1.5 + 1.125, 1.75, 1);
    check_motion(&c, 7.5, 3 + 2.5, 2, 0); /* mean of a symmetric ramp */
    check_motion(&c, 17.5, 3 + 2.5 + 20, 2, 0);
    case_fini(&c);
}
END_TEST

START_TEST(a_speed_and_a_value_are_reached_in_their_time_and_kept)
{
    struct play_case c;
    case_init(&c,
              "{\"truth\": {\"cart\": ["
              "{\"of\": \"x\", \"at\": 1, \"speed\": \"2 m/s\", \"for\": 4},"
              "{\"of\": \"x\", \"at\": 6, \"to\": \"1 m\", \"for\": 5},"
              "{\"of\": \"bias\", \"at\": 3, \"to\": \"1 cm\"}]}}");
    check_motion(&c, 3, 1, 1, 0.5);
    check_motion(&c, 5, 4, 2, 0);
    check_motion(&c, 8.5, 3.5, -1, 0); /* from 6 m towards 1 m     */
    check_motion(&c, 12, 1, 0, 0);
    ck_assert_double_eq(truth_at(&c, 3 * second - 1)[BIAS], 0);
    ck_assert_double_eq(truth_at(&c, 3 * second)[BIAS], 10);
    ck_assert_double_eq(truth_at(&c, 0)[GUST], 5);
    case_fini(&c);
}
END_TEST

/* --- what wanders --------------------------------------------------------- */

enum { SEEDS = 400 };

/* A variance from so many independent values has a relative standard deviation
 * of sqrt(2 / n) = 0.071; the bound is 4.5 of them, the seeds are fixed. */
static const double bound = 0.32;

START_TEST(what_wanders_has_the_variance_of_its_density)
{
    struct play_case c;
    double sum[5] = {0};
    case_init(&c, "{\"truth\": {\"cart\": {\"wander\": {\"x\": \"0.2 m2/s5\", "
                  "\"bias\": \"1 mm2/s\", \"gust\": \"9 N2/s\"}}}}");
    for (uint64_t seed = 1; seed <= SEEDS; seed++) {
        ck_assert_int_eq(scene_reseed(c.scene, seed), ST_OK);
        const double *x = truth_at(&c, second / 2);
        for (int i = 0; i < 4; i++)
            sum[i] += x[i] * x[i];
        sum[GUST] += (x[GUST] - 5) * (x[GUST] - 5);
    }
    double T = 0.5, q = 0.2;
    const double expected[] = {q * T * T * T * T * T / 20, q * T * T * T / 3,
                               q * T, 1 * T, 9}; /* u^2 = q tau / 2         */
    for (int i = 0; i < 5; i++)
        ck_assert_double_eq_tol(sum[i] / SEEDS / expected[i], 1, bound);
    case_fini(&c);
}
END_TEST

START_TEST(a_force_that_returns_forgets_with_its_time)
{
    struct play_case c;
    double product = 0;
    case_init(&c, "{\"truth\": {\"cart\": {\"wander\": {\"gust\": 9}}}}");
    for (uint64_t seed = 1; seed <= SEEDS; seed++) {
        ck_assert_int_eq(scene_reseed(c.scene, seed), ST_OK);
        double first = truth_at(&c, 0)[GUST] - 5;
        product += first * (truth_at(&c, second)[GUST] - 5);
    }
    ck_assert_double_eq_tol(product / SEEDS / 9, exp(-0.5), 0.25);
    case_fini(&c);
}
END_TEST

START_TEST(truth_does_not_depend_on_when_it_was_asked)
{
    struct play_case c;
    case_init(&c, "{\"truth\": {\"cart\": {\"wander\": {\"x\": 0.2, "
                  "\"gust\": 9}}}}");
    double late[5], early[5];
    memcpy(late, truth_at(&c, second + 12345), sizeof late);
    memcpy(early, truth_at(&c, second / 3), sizeof early);
    for (int64_t t_ns = 0; t_ns < second; t_ns += 777777)
        truth_at(&c, t_ns);
    ck_assert_mem_eq(truth_at(&c, second + 12345), late, sizeof late);
    ck_assert_mem_eq(truth_at(&c, second / 3), early, sizeof early);
    ck_assert_int_eq(scene_reseed(c.scene, c.scene->seed), ST_OK);
    ck_assert_mem_eq(truth_at(&c, second / 3), early, sizeof early);
    case_fini(&c);
}
END_TEST

START_TEST(a_drawn_start_has_its_spread_and_its_mean)
{
    struct play_case c;
    double sum = 0, square = 0;
    case_init(&c, "{\"truth\": {\"raft-7\": {\"start\": {\"x\": {\"mean\": "
                  "\"12 m\", \"u\": \"40 cm\"}}}}}");
    for (uint64_t seed = 1; seed <= SEEDS; seed++) {
        ck_assert_int_eq(scene_reseed(c.scene, seed), ST_OK);
        double x = truth_at(&c, 0)[0] - 12;
        sum += x;
        square += x * x;
    }
    ck_assert_double_eq(truth_at(&c, 0)[2], 6); /* the rig's prior          */
    ck_assert_double_eq_tol(sum / SEEDS, 0, 4 * 0.4 / sqrt(SEEDS));
    ck_assert_double_eq_tol(square / SEEDS / 0.16, 1, bound);
    case_fini(&c);
}
END_TEST

/* --- what a sensor reads -------------------------------------------------- */

/* The triangle 3, 4, 5, whose angle at the tower is atan(4/3) = 53.13 deg. */
static const double angle_deg = 53.130102354155978;

static double degrees(double rad)
{
    return rad * 57.295779513082321;
}

START_TEST(ranges_and_bearings_follow_from_the_triangle)
{
    struct play_case c;
    const double x[] = {4, 0, 6, 0}; /* 3 m and 4 m from (1, 2)             */
    case_rig_init(&c);
    const struct rig_sensor *a =
        &c.settings->rig.sensor[case_sensor(&c, "tower-a")];
    const struct rig_sensor *b =
        &c.settings->rig.sensor[case_sensor(&c, "tower-b")];
    ck_assert_double_eq_tol(scene_sensor_truth(a, 0, x), 5, 1e-15);
    ck_assert_double_eq_tol(scene_sensor_truth(b, 0, x), 5, 1e-15);
    /* from -150 deg to the left: 203.13, told as -156.87 */
    ck_assert_double_eq_tol(degrees(scene_sensor_truth(a, 1, x)),
                            angle_deg + 150 - 360, 1e-12);
    /* from -90 deg to the right: -143.13 */
    ck_assert_double_eq_tol(degrees(scene_sensor_truth(b, 1, x)),
                            -(angle_deg + 90), 1e-12);
    case_fini(&c);
}
END_TEST

START_TEST(a_bearing_crosses_half_a_turn_without_a_gap)
{
    struct play_case c;
    case_rig_init(&c);
    const struct rig_sensor *a =
        &c.settings->rig.sensor[case_sensor(&c, "tower-a")];
    /* half a turn from -150 deg is 30 deg: a rise of 1/sqrt(3) */
    double rise = sqrt(1. / 3);
    const double below[] = {11, 0, 2 + 10 * rise - 1e-6, 0};
    const double above[] = {11, 0, 2 + 10 * rise + 1e-6, 0};
    ck_assert_double_eq_tol(degrees(scene_sensor_truth(a, 1, below)), 180,
                            1e-5);
    ck_assert_double_eq_tol(degrees(scene_sensor_truth(a, 1, above)), -180,
                            1e-5);
    case_fini(&c);
}
END_TEST

/* Mean and standard deviation of a sensor's z, component i. */
static void moments(struct play_case *c, const char *name, int i, int n,
                    double *mean, double *deviation)
{
    struct scene_sensor p;
    struct scene_reading reading;
    double sum = 0, square = 0;
    scene_sensor_init(&p, c->scene, case_sensor(c, name), 0);
    for (int k = 0; k < n; k++) {
        ck_assert(scene_sensor_sample(&p, c->scene, &reading));
        sum += reading.z[i];
        square += reading.z[i] * reading.z[i];
    }
    *mean = sum / n;
    *deviation = sqrt(square / n - *mean * *mean);
}

enum { DRAWS = 20000 };

/* Of the mean: u / sqrt(n), of the deviation: u / sqrt(2 n); 4.5 of them. */
static void check_moments(struct play_case *c, const char *name, int i,
                          double z, double u)
{
    double mean, deviation;
    moments(c, name, i, DRAWS, &mean, &deviation);
    ck_assert_double_eq_tol(mean, z, 4.5 * u / sqrt(DRAWS));
    ck_assert_double_eq_tol(deviation, u, 4.5 * u / sqrt(2. * DRAWS));
}

START_TEST(a_sensor_tells_the_truth_in_its_unit_with_noise_of_its_u)
{
    struct play_case c;
    case_init(&c, "{\"truth\": {\"cart\": {\"start\": {\"x\": \"1.5 m\", "
                  "\"x.accel\": \"0 m/s2\", \"bias\": \"30 mm\"}}}}");
    check_moments(&c, "laser", 0, 1500, 2);
    check_moments(&c, "frame", 0, 0, 0.03 / 9.80665);
    check_moments(&c, "sum", 0, 2 * 1.5 + 0.03, 0.001);
    case_fini(&c);
}
END_TEST

START_TEST(towers_tell_range_and_bearing_in_their_units)
{
    struct play_case c;
    case_init(&c, "{\"truth\": {\"raft-1\": {\"start\": {\"x\": \"4 m\", "
                  "\"y\": \"6 m\"}}}}");
    check_moments(&c, "tower-a", 0, 5000, 20);
    check_moments(&c, "tower-a", 1, angle_deg - 210, 0.2);
    check_moments(&c, "tower-b", 0, 5, 0.02);
    check_moments(&c, "tower-b", 1, -angle_deg - 90, 0.2);
    case_fini(&c);
}
END_TEST

START_TEST(noise_carries_a_bearing_over_half_a_turn_and_it_stays_in_range)
{
    struct play_case c;
    struct scene_sensor p;
    struct scene_reading reading;
    int n_above = 0, n = 1000;
    /* on the line from (1, 2) at 30 deg, where tower-a turns over */
    case_init(&c, "{\"truth\": {\"raft-1\": {\"start\": {\"x\": \"11 m\", "
                  "\"y\": \"7.7735026918962573 m\"}}}}");
    scene_sensor_init(&p, c.scene, case_sensor(&c, "tower-a"), 0);
    for (int k = 0; k < n; k++) {
        ck_assert(scene_sensor_sample(&p, c.scene, &reading));
        ck_assert_double_gt(fabs(reading.z[1]), 180 - 5 * 0.2);
        ck_assert_double_le(fabs(reading.z[1]), 180);
        n_above += reading.z[1] > 0;
    }
    ck_assert_int_le(abs(n_above - n / 2), 71); /* 500 +- 16 */
    case_fini(&c);
}
END_TEST

START_TEST(every_purpose_has_numbers_of_its_own)
{
    static const char *const names[][2] = {
        {"noise", "laser"}, {"first", "laser"}, {"noise", "frame"}};
    struct play_case c;
    struct random random;
    uint64_t bits[3];
    case_init(&c, "{\"truth\": {\"cart\": []}}");
    for (int i = 0; i < 3; i++) {
        scene_random(c.scene, names[i][0], names[i][1], &random);
        bits[i] = random_bits(&random);
    }
    ck_assert(bits[0] != bits[1] && bits[0] != bits[2] && bits[1] != bits[2]);
    case_fini(&c);
}
END_TEST

START_TEST(samples_come_at_the_rate_from_a_moment_in_the_first_period)
{
    struct play_case c;
    struct scene_sensor p;
    struct scene_reading reading;
    case_init(&c, "{\"truth\": {\"cart\": []}}");
    scene_sensor_init(&p, c.scene, case_sensor(&c, "laser"), 0);
    int64_t first_ns = scene_sensor_due(&p, c.scene);
    ck_assert_int_gt(first_ns, 0);
    ck_assert_int_lt(first_ns, 20000000);
    for (int k = 0; k < 1000; k++) {
        scene_sensor_sample(&p, c.scene, &reading);
        ck_assert_int_eq(reading.t_ns, first_ns + k * 20000000LL);
    }
    case_fini(&c);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("scene");
    TCase *t = tcase_create("truth");
    tcase_add_test(t, a_ramp_follows_its_closed_form);
    tcase_add_test(t, a_jerk_leaves_its_accel_until_another_takes_it_back);
    tcase_add_test(t, a_speed_and_a_value_are_reached_in_their_time_and_kept);
    tcase_add_test(t, what_wanders_has_the_variance_of_its_density);
    tcase_add_test(t, a_force_that_returns_forgets_with_its_time);
    tcase_add_test(t, truth_does_not_depend_on_when_it_was_asked);
    tcase_add_test(t, a_drawn_start_has_its_spread_and_its_mean);
    suite_add_tcase(s, t);
    t = tcase_create("sensor");
    tcase_add_test(t, ranges_and_bearings_follow_from_the_triangle);
    tcase_add_test(t, a_bearing_crosses_half_a_turn_without_a_gap);
    tcase_add_test(t, a_sensor_tells_the_truth_in_its_unit_with_noise_of_its_u);
    tcase_add_test(t, towers_tell_range_and_bearing_in_their_units);
    tcase_add_test(
        t, noise_carries_a_bearing_over_half_a_turn_and_it_stays_in_range);
    tcase_add_test(t, every_purpose_has_numbers_of_its_own);
    tcase_add_test(t,
                   samples_come_at_the_rate_from_a_moment_in_the_first_period);
    suite_add_tcase(s, t);
    return s;
}
