/* Starts from data, wide priors, several measurements at one instant.
 *
 * Sources: Bar-Shalom, Li and Kirubarajan 2001, 3.5 (straight line) and 5.5
 * (two-point start); Durbin and Koopman 2012 ch. 5 (diffuse start).  Values:
 * batch conditioning in 120 digits, closed forms in rational arithmetic. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/checks/bed.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

static const double place[] = {1, 0};
static cJSON *all;

static void load(void)
{
    all = values_load("10-initialisation");
}

static void unload(void)
{
    cJSON_Delete(all);
}

static struct bed *axis(double q)
{
    struct bed *b = bed_new();
    bed_block(b, BLOCK_CONSTANT_VELOCITY, q);
    return b;
}

static void check_state(const struct bed *b, const cJSON *want, double tol)
{
    double x[2], P[4], got[4];
    values_list(want, "x", x, 2);
    values_list(want, "P", P, 4);
    CHECK_NEAR(2, bed_state(b, got), x, tol);
    CHECK_COVARIANCE(2, got, P, tol);
}

/* --- starts ------------------------------------------------------------------
 */

START_TEST(two_measurements_start_place_and_rate)
{
    const cJSON *c = values_case(all, "two-point differencing");
    const cJSON *row =
        cJSON_GetArrayItem(values_at(values_at(c, "expected"), "rows"), _i);
    double z1 = values_number(row, "z1"), z2 = values_number(row, "z2");
    double r = values_number(row, "R");
    struct bed *b = axis(values_number(row, "q"));
    bed_start(b, 0);
    ck_assert_uint_eq(kf_undetermined(b->f), 3);
    bed_see(b, 0, 1, place, &z1, &r);
    ck_assert_uint_eq(kf_undetermined(b->f), 2);
    bed_see(b, values_ns(values_number(row, "T")), 1, place, &z2, &r);
    ck_assert_uint_eq(kf_undetermined(b->f), 0);
    ck_assert_int_eq(b->n_judged, 0);
    check_state(b, row, 1e-12);
    bed_free(b);
}
END_TEST

START_TEST(without_noise_the_filter_is_the_straight_line_fit)
{
    const cJSON *c = values_case(all, "q=0: filter from a diffuse start");
    const cJSON *in = values_at(c, "inputs"), *row;
    double T = values_number(in, "T"), r = values_number(in, "R");
    cJSON_ArrayForEach(row, values_at(values_at(c, "expected"), "rows"))
    {
        int n = (int)values_number(row, "N");
        double want[4], P[4], line[2] = {3 + 0.25 * T * (n - 1), 0.25};
        struct bed *b = axis(0);
        bed_start(b, 0);
        for (int i = 0; i < n; i++) {
            double z = 3 + 0.25 * T * i;
            bed_see(b, values_ns(T * i), 1, place, &z, &r);
        }
        values_list(row, "P", want, 4);
        CHECK_NEAR(2, bed_state(b, P), line, 1e-12);
        CHECK_COVARIANCE(2, P, want, 1e-12);
        bed_free(b);
    }
}
END_TEST

START_TEST(a_wide_prior_loses_no_digits)
{
    const cJSON *c = values_case(all, "large-P0 start");
    const cJSON *in = values_at(c, "inputs");
    const cJSON *row = cJSON_GetArrayItem(values_at(c, "expected"), _i);
    double z[3], r = values_number(in, "R"), T = values_number(in, "T");
    struct bed *b = axis(values_number(in, "q"));
    values_list(in, "z", z, 3);
    for (int i = 0; i < 2; i++)
        bed_prior(b, i, 0, values_number(row, "P0"));
    bed_start(b, 0);
    for (int i = 0; i < 3; i++)
        bed_see(b, values_ns(T * i), 1, place, &z[i], &r);
    check_state(b, row, 1e-12);
    bed_free(b);
}
END_TEST

/* The row of the widest prior is the limit of no prior at all to 1e-12. */
START_TEST(no_prior_is_the_limit_of_wide_ones)
{
    const cJSON *c = values_case(all, "large-P0 start");
    const cJSON *in = values_at(c, "inputs");
    double z[3], r = values_number(in, "R"), T = values_number(in, "T");
    struct bed *b = axis(values_number(in, "q"));
    values_list(in, "z", z, 3);
    bed_start(b, 0);
    for (int i = 0; i < 3; i++)
        bed_see(b, values_ns(T * i), 1, place, &z[i], &r);
    check_state(b, cJSON_GetArrayItem(values_at(c, "expected"), 4), 1e-12);
    bed_free(b);
}
END_TEST

/* --- one instant
 * -------------------------------------------------------------- */

static struct bed *prior(const cJSON *in)
{
    struct bed *b = axis(values_number(in, "q"));
    double x[2], P[4];
    values_list(in, "x0", x, 2);
    values_list(in, "P0", P, 4);
    bed_start(b, 0);
    bed_set(b, x, P);
    return b;
}

static const int orders[][3] = {{0, 1, 2}, {0, 2, 1}, {1, 0, 2},
                                {1, 2, 0}, {2, 0, 1}, {2, 1, 0}};

/* The first six one by one, the last stacked. */
START_TEST(any_order_at_one_instant_gives_the_same_answer)
{
    const cJSON *c = values_case(all, "three measurements");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    struct bed *b = prior(in);
    double H[6], r[3], z[3];
    int64_t t_ns = values_ns(values_number(in, "t"));
    for (int i = 0; i < 3; i++) {
        const cJSON *m =
            cJSON_GetArrayItem(values_at(in, "meas"), orders[_i % 6][i]);
        values_list(m, "H", H + 2 * i, 2);
        r[i] = values_number(m, "R");
        z[i] = values_number(m, "z");
    }
    for (int i = 0; i < 3 && _i < 6; i++)
        bed_see(b, t_ns, 1, H + 2 * i, z + i, r + i);
    if (_i == 6)
        bed_see(b, t_ns, 3, H, z, r);
    check_state(b, out, 1e-12);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik_total")),
                        1e-12);
    bed_free(b);
}
END_TEST

/* R = L diag(d) L' with L unit lower: L^-1 z has variances d and the same
 * likelihood, since |L| = 1. */
START_TEST(correlated_channels_are_exact_once_decorrelated)
{
    const cJSON *c = values_case(all, "correlated two-channel");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    struct bed *b = prior(in);
    double H[4], R[4], z[2];
    values_list(in, "H", H, 4);
    values_list(in, "R", R, 4);
    values_list(in, "z", z, 2);
    double share = R[2] / R[0], r[2] = {R[0], R[3] - share * R[1]};
    z[1] -= share * z[0];
    H[2] -= share * H[0];
    H[3] -= share * H[1];
    bed_see(b, values_ns(values_number(in, "t")), 2, H, z, r);
    check_state(b, out, 1e-12);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-12);
    bed_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("start");
    TCase *t = tcase_create("start");
    tcase_add_checked_fixture(t, load, unload);
    tcase_add_loop_test(t, two_measurements_start_place_and_rate, 0, 3);
    tcase_add_test(t, without_noise_the_filter_is_the_straight_line_fit);
    tcase_add_loop_test(t, a_wide_prior_loses_no_digits, 0, 5);
    tcase_add_test(t, no_prior_is_the_limit_of_wide_ones);
    tcase_add_loop_test(t, any_order_at_one_instant_gives_the_same_answer, 0,
                        7);
    tcase_add_test(t, correlated_channels_are_exact_once_decorrelated);
    suite_add_tcase(s, t);
    return s;
}
