/* Errors of sensors in a rig file: which states they make, and what the sensor
 * then reads. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/unit/load_case.h"

static char *load(struct settings **s, const char *sensor)
{
    char text[2048];
    snprintf(
        text, sizeof text,
        "{\"tracks\": {\"c\": {\"state\": [{\"model\":"
        " \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\", \"q\":"
        " 1}, {\"model\": \"random-walk\", \"name\": \"y\", \"unit\": \"m\","
        " \"q\": 1}, {\"model\": \"constant\", \"name\": \"k\", \"unit\":"
        " \"1\"}], \"good\": {\"u\": {\"x\": \"1 m\"}}}},"
        " \"sensors\": {\"s\": {%s}}}",
        sensor);
    return load_text(s, text, NULL, 0);
}

static struct settings *good(const char *sensor)
{
    struct settings *s;
    char *said = load(&s, sensor);
    ck_assert_msg(said[0] == '\0', "%s", said);
    free(said);
    return s;
}

static void near(double got, double want)
{
    ck_assert_double_eq_tol(got, want, 1e-12 * (1 + fabs(want)));
}

START_TEST(a_drifting_offset_is_a_state_that_is_added)
{
    struct settings *s = good(
        "\"reads\": \"x\", \"unit\": \"mm\", \"u\": 2, \"offset\": {\"mean\":"
        " \"1 mm\", \"u\": \"5 mm\", \"tau\": \"20 min\"}");
    const struct rig_kind *k = &s->rig.kind[0];
    const struct reads_row *row = &s->rig.sensor[0].reads.row[0];
    ck_assert_int_eq(k->n, 5);
    ck_assert_str_eq(k->state[4].name, "s.offset");
    near(k->state[4].prior_mean, 0.001);
    near(k->state[4].prior_u, 0.005);
    near(k->block[3].q, 2 * 0.005 * 0.005 / 1200);
    ck_assert_int_eq(row->n_terms, 2);
    ck_assert_int_eq(row->term[1].state, 4);
    ck_assert(reads_is_linear(&s->rig.sensor[0].reads));
    settings_free(s);
}
END_TEST

START_TEST(fixed_errors_change_the_conversion)
{
    struct settings *s =
        good("\"reads\": {\"x\": 1, \"y\": 2}, \"u\": 1, \"scale\": 1.5,"
             " \"offset\": \"30 cm\", \"plus\": \"y\"");
    const struct rig_sensor *sensor = &s->rig.sensor[0];
    near(sensor->reads.row[0].term[0].value, 1.5);
    near(sensor->reads.row[0].term[1].value, 3);
    near(sensor->reads.row[0].term[2].value, 1);
    near(sensor->shift[0], -0.3);
    ck_assert_int_eq(s->rig.kind[0].n, 4);
    settings_free(s);
}
END_TEST

START_TEST(an_estimated_scale_multiplies)
{
    struct settings *s = good("\"reads\": \"x.rate\", \"u\": 1, \"scale\":"
                              " {\"u\": \"0.3 %\"}");
    const struct reads *reads = &s->rig.sensor[0].reads;
    double x[] = {5, 2, 0, 0, 1.01}, H[5];
    near(reads_row_at(reads, 0, 5, x, H), 2.02);
    near(H[1], 1.01);
    near(H[4], 2);
    near(s->rig.kind[0].state[4].prior_u, 0.003);
    ck_assert(!reads_is_linear(reads) && !reads_iterates(reads));
    settings_free(s);
}
END_TEST

START_TEST(a_lag_is_coupled_to_what_it_follows)
{
    struct settings *s =
        good("\"reads\": {\"x\": 1, \"y\": 2}, \"u\": 1, \"lag\": \"500 ms\"");
    const struct rig_kind *k = &s->rig.kind[0];
    ck_assert_int_eq(k->n_couplings, 2);
    ck_assert_int_eq(k->coupling[1].on, 2);
    near(k->coupling[1].rate, 4);
    ck_assert_int_eq(k->n_components, 1); /* x, y and the lag */
    ck_assert_int_eq(k->component[0].n, 4);
    ck_assert_int_eq(s->rig.sensor[0].reads.row[0].term[0].state, 4);
    settings_free(s);
}
END_TEST

/* rho = e^(-every/tau); u is all of the noise. */
START_TEST(noise_that_follows_itself_is_a_state)
{
    struct settings *s = good("\"reads\": \"x\", \"u\": 2, \"noise\": {\"rho\":"
                              " 0.5, \"every\": \"20 ms\"}");
    const struct rig_kind *k = &s->rig.kind[0];
    near(k->block[3].tau_s, 0.02 / log(2));
    near(k->state[4].prior_u * k->state[4].prior_u + s->rig.sensor[0].r[0], 4);
    settings_free(s);
}
END_TEST

START_TEST(u_may_grow_with_the_reading)
{
    struct settings *s = good("\"reads\": \"x\", \"unit\": \"mm\", \"u\":"
                              " {\"fixed\": \"2 mm\", \"relative\": \"1 %\"}");
    near(s->rig.sensor[0].r[0], 4e-6);
    near(s->rig.sensor[0].relative[0], 0.01);
    settings_free(s);
}
END_TEST

/* Values and derivatives against differences. */
START_TEST(products_polynomials_and_range_rates_are_read)
{
    static const char *const sensors[] = {
        "\"reads\": {\"product\": [\"k\", \"x.rate\", 2]}, \"u\": 1",
        "\"reads\": {\"polynomial\": \"x\", \"coefficients\": [1, \"k\", 0.5]},"
        " \"unit\": \"V\", \"u\": 1",
    };
    static const double want[] = {3 * 4 * 2, 1 + 3 * 2 + 0.5 * 4};
    for (int i = 0; i < 2; i++) {
        struct settings *s = good(sensors[i]);
        const struct reads *reads = &s->rig.sensor[0].reads;
        double x[] = {2, 4, 0, 3}, H[4], unused[4];
        near(reads_row_at(reads, 0, 4, x, H), want[i]);
        for (int k = 0; k < 4; k++) {
            double was = x[k], d = 1e-6;
            x[k] = was + d;
            double up = reads_row_at(reads, 0, 4, x, unused);
            x[k] = was - d;
            double down = reads_row_at(reads, 0, 4, x, unused);
            x[k] = was;
            ck_assert_double_eq_tol(H[k], (up - down) / (2 * d), 1e-8);
        }
        settings_free(s);
    }
}
END_TEST

START_TEST(what_is_wrong_is_said)
{
    static const struct {
        const char *sensor, *said;
    } wrong[] = {
        {"\"reads\": \"x\", \"u\": 1, \"offset\": {\"tau\": 1}",
         "an error that is estimated needs \"u\""},
        {"\"reads\": \"x\", \"u\": 1, \"offset\": {\"u\": 1, \"tu\": 2}",
         "unknown setting \"tu\""},
        {"\"reads\": \"x\", \"u\": 1, \"offset\": \"3 s\"",
         "of another kind than \"m\""},
        {"\"reads\": \"x\", \"u\": 1, \"scale\": 0",
         "a scale of 0 reads nothing"},
        {"\"reads\": \"x\", \"u\": 1, \"plus\": \"k\"", "of another kind"},
        {"\"reads\": \"x\", \"u\": 1, \"plus\": \"z\"", "unknown state \"z\""},
        {"\"reads\": \"x\", \"u\": 1, \"noise\": {\"rho\": 0.5}",
         "\"noise\" needs \"tau\", or \"rho\" and \"every\""},
        {"\"reads\": \"x\", \"u\": 1, \"noise\": {\"rho\": 2, \"every\": 1}",
         "\"rho\" must lie between 0 and 1"},
        {"\"reads\": \"x\", \"u\": 1, \"lag\": {\"mean\": 1}",
         "a lag that is estimated is not built yet"},
        {"\"reads\": {\"product\": [\"k\", \"x\"]}, \"u\": 1, \"lag\": 1",
         "a lag of anything but a sum of states"},
        {"\"reads\": \"x\", \"u\": {\"fixed\": 1}",
         "\"u\" as an object needs \"fixed\" and \"relative\""},
        {"\"reads\": {\"product\": 3}, \"u\": 1", "must be a list of states"},
        {"\"reads\": {\"polynomial\": \"x\"}, \"u\": 1",
         "\"coefficients\" must list"},
    };
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        struct settings *s;
        char *said = load(&s, wrong[i].sensor);
        ck_assert_msg(strstr(said, wrong[i].said) != NULL, "%s\n%s",
                      wrong[i].sensor, said);
        ck_assert_ptr_nonnull(strstr(said, "       = "));
        free(said);
    }
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load_error");
    TCase *t = tcase_create("load_error");
    tcase_add_test(t, a_drifting_offset_is_a_state_that_is_added);
    tcase_add_test(t, fixed_errors_change_the_conversion);
    tcase_add_test(t, an_estimated_scale_multiplies);
    tcase_add_test(t, a_lag_is_coupled_to_what_it_follows);
    tcase_add_test(t, noise_that_follows_itself_is_a_state);
    tcase_add_test(t, u_may_grow_with_the_reading);
    tcase_add_test(t, products_polynomials_and_range_rates_are_read);
    tcase_add_test(t, what_is_wrong_is_said);
    suite_add_tcase(s, t);
    return s;
}
