/* Irregular tracks that other methods answered.
 *
 * Sources: beaver1, R datasets (Reynolds 1994), Gauss-Markov level in noise,
 * against dense Gaussian-process regression; three sensors of which one has a
 * drifting offset, against batch conditioning in 40 digits. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/checks/bed.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

enum { BEAVER_N = 114 };
#define HOUR_S 3600.0

static cJSON *all;

static void load(void)
{
    all = values_load("12-golden-tracks");
}

static void unload(void)
{
    cJSON_Delete(all);
}

START_TEST(beaver_temperature_has_the_likelihood_of_the_regression)
{
    static double t_h[BEAVER_N], z[BEAVER_N], x[BEAVER_N], var[BEAVER_N];
    const cJSON *c = values_case(all, "beaver1");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    ck_assert_int_eq(values_list(in, "t_hours", t_h, BEAVER_N), BEAVER_N);
    values_list(in, "z", z, BEAVER_N);
    values_list(out, "filtered", x, BEAVER_N);
    values_list(out, "filtered_var", var, BEAVER_N);
    double beta = values_number(in, "beta"), q = values_number(in, "q");
    double r = values_number(in, "R"), mean = values_number(in, "mean");
    const double one = 1;
    struct bed *b = bed_new();
    struct block *k = bed_block(b, BLOCK_GAUSS_MARKOV, q / HOUR_S);
    k->tau_s = HOUR_S / beta;
    k->mean = mean;
    bed_prior(b, 0, mean, q / (2 * beta));
    bed_start(b, 0);
    for (int i = 0; i < BEAVER_N; i++) {
        bed_see(b, values_ns(t_h[i] * HOUR_S), 1, &one, &z[i], &r);
        ck_assert_double_le(fabs(kf_x(b->f)[0] - x[i]), 1e-11);
        ck_assert_double_le(fabs(kf_ud(b->f)[0] - var[i]), 1e-12 * var[i]);
    }
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-9);
    ck_assert_double_le(fabs(b->loglik - 71.69561236712002), 1e-9);
    ck_assert_double_le(
        fabs(b->nis / b->n_judged - values_number(out, "mean_nis")), 1e-11);
    bed_free(b);
}
END_TEST

/* State: place, rate, offset of the first sensor. */
static struct bed *carriage(void)
{
    struct bed *b = bed_new();
    bed_block(b, BLOCK_CONSTANT_VELOCITY, 0.2);
    bed_block(b, BLOCK_GAUSS_MARKOV, 0.0008)->tau_s = 1 / 0.02;
    for (int i = 0; i < 3; i++)
        bed_prior(b, i, 0, 1);
    bed_start(b, 0);
    return b;
}

START_TEST(three_sensors_with_a_drifting_offset_are_exact_at_every_event)
{
    static const char *const names[] = {"enc", "cam", "tacho"};
    const cJSON *c = values_case(all, "three sensors");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    const cJSON *event, *want = values_at(out, "filtered")->child;
    struct bed *b = carriage();
    double nis[3] = {0};
    int n[3] = {0};
    cJSON_ArrayForEach(event, values_at(in, "events"))
    {
        const char *name = values_at(event, "sensor")->valuestring;
        const cJSON *sensor = values_at(values_at(in, "sensors"), name);
        double H[3], r = values_number(sensor, "R"), x[3], P[9], got[9];
        double z = values_number(event, "z");
        int s = 0;
        while (strcmp(name, names[s]) != 0)
            s++;
        values_list(sensor, "H", H, 3);
        bed_see(b, values_ns(values_number(event, "t")), 1, H, &z, &r);
        nis[s] += b->seen.nis;
        n[s]++;
        values_list(want, "x", x, 3);
        values_list(want, "P", P, 9);
        CHECK_NEAR(3, bed_state(b, got), x, 1e-12);
        CHECK_COVARIANCE(3, got, P, 1e-12);
        want = want->next;
    }
    ck_assert_ptr_null(want);
    ck_assert_double_le(fabs(b->loglik - values_number(out, "loglik")), 1e-10);
    ck_assert_double_le(fabs(b->loglik - 37.51948824490191), 1e-10);
    for (int s = 0; s < 3; s++)
        ck_assert_double_le(
            fabs(nis[s] / n[s] -
                 values_number(values_at(out, "nis_mean_by_sensor"), names[s])),
            1e-11);
    bed_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("golden tracks");
    TCase *t = tcase_create("golden tracks");
    tcase_add_checked_fixture(t, load, unload);
    tcase_add_test(t, beaver_temperature_has_the_likelihood_of_the_regression);
    tcase_add_test(
        t, three_sensors_with_a_drifting_offset_are_exact_at_every_event);
    suite_add_tcase(s, t);
    return s;
}
