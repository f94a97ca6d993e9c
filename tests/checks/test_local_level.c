/* The local level on the annual flow of the Nile at Aswan, 1871-1970.
 *
 * Source: Durbin and Koopman, Time Series Analysis by State Space Methods,
 * 2nd ed. 2012, ch. 2 (variances 15099 and 1469.1, start 0 with variance
 * 1e7); 50-digit arithmetic, equal to R 4.2.2 stats::KalmanRun. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/checks/bed.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

enum { YEARS = 100 };
#define YEAR_NS 1000000000 /* one second stands for a year */

static const double one = 1, r = 15099;
static cJSON *all;
static double flow[YEARS];

static void load(void)
{
    all = values_load("04-local-level");
    const cJSON *c = values_case(all, "Nile local level");
    ck_assert_int_eq(values_list(values_at(c, "inputs"), "y", flow, YEARS),
                     YEARS);
}

static void unload(void)
{
    cJSON_Delete(all);
}

static struct bed *level(bool has_prior)
{
    struct bed *b = bed_new();
    bed_block(b, BLOCK_RANDOM_WALK, 1469.1);
    if (has_prior)
        bed_prior(b, 0, 0, 1e7);
    bed_start(b, 0);
    return b;
}

static void see_year(struct bed *b, int i)
{
    bed_see(b, (int64_t)i * YEAR_NS, 1, &one, &flow[i], &r);
}

static double variance(const struct bed *b)
{
    return b->f->v[1];
}

static const cJSON *expected(const char *name, const char *key, double *list)
{
    const cJSON *out = values_at(values_case(all, name), "expected");
    ck_assert_int_eq(values_list(out, key, list, YEARS), YEARS);
    return out;
}

static void check_close(double got, double want)
{
    ck_assert_double_le(fabs(got - want), 1e-12 * fabs(want));
}

START_TEST(states_variances_and_innovations_of_every_year_are_as_published)
{
    double a[YEARS], P[YEARS], y[YEARS], S[YEARS];
    const char *name = "Nile local level";
    const cJSON *out = expected(name, "a_filt", a);
    expected(name, "P_filt", P);
    expected(name, "innovation", y);
    expected(name, "S", S);
    struct bed *b = level(true);
    for (int i = 0; i < YEARS; i++) {
        see_year(b, i);
        check_close(kf_x(b->f)[0], a[i]);
        check_close(variance(b), P[i]);
        ck_assert_double_le(fabs(b->seen.y[0] - y[i]), 1e-11 * 1e3);
        check_close(b->seen.s[0], S[i]);
    }
    ck_assert_int_eq(b->n_judged, YEARS);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-10);
    ck_assert_double_le(fabs(b->loglik - -641.5855784584), 5e-9);
    bed_free(b);
}
END_TEST

/* Durbin and Koopman ch. 5.2: the first year only determines the level. */
START_TEST(a_start_from_data_is_the_exact_diffuse_one)
{
    double a[YEARS], P[YEARS];
    const char *name = "Nile local level, exact diffuse";
    const cJSON *out = expected(name, "a_filt", a);
    expected(name, "P_filt", P);
    struct bed *b = level(false);
    ck_assert_uint_eq(kf_undetermined(b->f), 1);
    for (int i = 0; i < YEARS; i++) {
        see_year(b, i);
        ck_assert_int_eq(b->seen.n_determined, i == 0);
        ck_assert_uint_eq(kf_undetermined(b->f), 0);
        check_close(kf_x(b->f)[0], a[i]);
        check_close(variance(b), P[i]);
    }
    ck_assert_int_eq(b->n_judged, YEARS - 1);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik_t2_to_n")),
                        1e-10);
    bed_free(b);
}
END_TEST

static bool is_missing(int i)
{
    return (i >= 20 && i < 40) || (i >= 60 && i < 80);
}

/* Durbin and Koopman 2.7: years 21-40 and 61-80 left out. */
START_TEST(missing_years_are_bridged_as_published)
{
    double a[YEARS], P[YEARS];
    const char *name = "Nile with years 1891-1910";
    const cJSON *out = expected(name, "a_filt", a);
    expected(name, "P_filt", P);
    struct bed *b = level(true);
    for (int i = 0; i < YEARS; i++) {
        if (is_missing(i))
            bed_move(b, (int64_t)i * YEAR_NS);
        else
            see_year(b, i);
        check_close(kf_x(b->f)[0], a[i]);
        check_close(variance(b), P[i]);
    }
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-10);
    ck_assert_double_le(fabs(b->loglik - -389.6269775255986), 1e-10);
    bed_free(b);
}
END_TEST

/* The same, gaps crossed at once, or no reading (NaN) in every missing year. */
START_TEST(a_gap_in_one_stride_or_of_no_readings_changes_nothing)
{
    double a[YEARS], P[YEARS], none = (double)NAN;
    const cJSON *out = expected("Nile with years 1891-1910", "a_filt", a);
    expected("Nile with years 1891-1910", "P_filt", P);
    struct bed *b = level(true);
    for (int i = 0; i < YEARS; i++) {
        if (!is_missing(i))
            see_year(b, i);
        else if (_i == 1)
            bed_see(b, (int64_t)i * YEAR_NS, 1, &one, &none, &r);
    }
    check_close(kf_x(b->f)[0], a[YEARS - 1]);
    check_close(variance(b), P[YEARS - 1]);
    ck_assert_int_eq(b->n_judged, 60);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-10);
    bed_free(b);
}
END_TEST

/* Durbin and Koopman 2.8: the mean stays, the variance grows by 1469.1 a
 * year from 5501.2579, that of an observation is larger by 15099. */
START_TEST(forecasts_at_asked_times_are_predictions)
{
    static const double asked[] = {1, 2, 5.5, 30};
    const cJSON *out =
        values_at(values_case(all, "Nile local level"), "expected");
    double mean = values_number(out, "forecast_mean");
    double first = values_number(out, "forecast_var_1step_state");
    struct bed *b = level(true);
    for (int i = 0; i < YEARS; i++)
        see_year(b, i);
    ck_assert_double_le(fabs(first - 5501.25794181), 5e-9);
    for (int i = 0; i < 4; i++) {
        struct kf *f = calloc(1, kf_bytes(&b->kind));
        kf_predict(&b->kind, &b->work, b->f, (int64_t)(99e9 + asked[i] * 1e9),
                   f);
        check_close(kf_x(f)[0], mean);
        check_close(kf_ud(f)[0], first + 1469.1 * (asked[i] - 1));
        double S = ud_innovation_variance(1, kf_ud(f), &one, r);
        check_close(S, first + 15099 + 1469.1 * (asked[i] - 1));
        free(f);
    }
    bed_free(b);
}
END_TEST

/* Steady state of the local level: p = (q + sqrt(q^2 + 4 q)) / 2 in units of
 * r, gain p / (p + 1). */
START_TEST(the_gain_settles_to_the_closed_form)
{
    struct bed *b = level(true);
    double q = 1469.1 / r, p = (q + sqrt(q * q + 4 * q)) / 2;
    for (int i = 0; i < YEARS; i++)
        see_year(b, i);
    check_close(variance(b) / r, p / (p + 1));
    ck_assert_double_le(fabs(variance(b) / r - 0.2670480126), 5e-11);
    bed_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("local level");
    TCase *t = tcase_create("local level");
    tcase_add_checked_fixture(t, load, unload);
    tcase_add_test(
        t, states_variances_and_innovations_of_every_year_are_as_published);
    tcase_add_test(t, a_start_from_data_is_the_exact_diffuse_one);
    tcase_add_test(t, missing_years_are_bridged_as_published);
    tcase_add_loop_test(
        t, a_gap_in_one_stride_or_of_no_readings_changes_nothing, 0, 2);
    tcase_add_test(t, forecasts_at_asked_times_are_predictions);
    tcase_add_test(t, the_gain_settles_to_the_closed_form);
    suite_add_tcase(s, t);
    return s;
}
