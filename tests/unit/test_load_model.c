/* State blocks of a rig file to the numbers that the filter uses. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/model/component.h"
#include "tests/suite.h"
#include "tests/unit/load_case.h"

static const double pi = 3.14159265358979323846;

/* A rig of one track with this state block; the reports, or "" and *s. */
static char *load(struct settings **s, const char *block)
{
    char text[2048];
    snprintf(text, sizeof text,
             "{\"tracks\": {\"c\": {\"state\": %s}},"
             " \"sensors\": {\"s\": {\"reads\": \"x\", \"u\": 1}}}",
             block);
    return load_text(s, text, NULL, 0);
}

static struct settings *good(const char *block)
{
    struct settings *s;
    char *said = load(&s, block);
    ck_assert_msg(said[0] == '\0', "%s", said);
    free(said);
    return s;
}

static void near(double got, double want)
{
    ck_assert_double_eq_tol(got, want, 1e-13 * (1 + fabs(want)));
}

/* u^2 = q / (4 zeta omega^3): the spread of a driven, damped oscillation. */
START_TEST(an_oscillator_has_its_spread)
{
    struct settings *s = good(
        "{\"model\": \"oscillator\", \"name\": \"x\", \"unit\": \"mm\","
        " \"frequency\": \"0.5 Hz\", \"damping\": \"5 %\", \"u\": \"2 cm\","
        " \"mean\": \"1 m\"}");
    const struct rig_kind *k = &s->rig.kind[0];
    double w = pi;
    near(k->block[0].omega_rad_s, w);
    near(k->block[0].q, 4 * 0.05 * w * w * w * 20 * 20);
    ck_assert_str_eq(k->state[1].name, "x.rate");
    ck_assert(k->state[0].has_prior && k->state[1].has_prior);
    near(k->state[0].prior_mean, 1000);
    near(k->state[0].prior_u, 20);
    near(k->state[1].prior_u, 20 * w);
    ck_assert_int_eq(k->n_components, 1);
    const double *A = component_A(k, 0), *W = component_W(k, 0);
    near(A[2], -w * w);
    near(A[3], -0.1 * w);
    near(W[3], k->block[0].q);
    near(component_c(k, 0)[1], w * w * 1000);
    settings_free(s);
}
END_TEST

START_TEST(words_of_an_oscillator_are_its_density)
{
    struct settings *s = good(
        "{\"model\": \"oscillator\", \"name\": \"x\", \"unit\": \"deg\","
        " \"frequency\": \"1 Hz\", \"damping\": 0,"
        " \"unmodelled\": {\"accel\": \"3 deg/s2\", \"lasts\": \"0.5 s\"}}");
    near(s->rig.kind[0].block[0].q, 4.5);
    ck_assert(!s->rig.kind[0].state[0].has_prior);
    settings_free(s);
}
END_TEST

START_TEST(a_fading_acceleration_has_its_spread)
{
    struct settings *s =
        good("{\"model\": \"singer\", \"name\": \"x\", \"unit\": \"m\","
             " \"tau\": \"4 s\", \"u\": \"3 m/s2\"}");
    const struct rig_kind *k = &s->rig.kind[0];
    near(k->block[0].q, 2 * 9.0 / 4);
    near(k->state[2].prior_u, 3);
    ck_assert(!k->state[0].has_prior && !k->state[1].has_prior);
    settings_free(s);
}
END_TEST

/* Two masses of heat: c = -A mean, W = G q G'. */
START_TEST(own_matrices_are_taken)
{
    struct settings *s =
        good("{\"model\": \"linear\", \"name\": [\"x\", \"rim\"],"
             " \"unit\": \"degC\", \"A\": [[-0.3, 0.2], [0.1, -0.4]],"
             " \"G\": [[1], [2]], \"q\": 0.5, \"mean\": [\"20 degC\", 30]}");
    const struct rig_kind *k = &s->rig.kind[0];
    ck_assert_int_eq(k->n, 2);
    ck_assert_str_eq(k->state[1].name, "rim");
    const double *W = component_W(k, 0), *c = component_c(k, 0);
    near(component_A(k, 0)[1], 0.2);
    near(W[0], 0.5);
    near(W[1], 1);
    near(W[3], 2);
    near(c[0], 0.3 * 20 - 0.2 * 30);
    near(c[1], -0.1 * 20 + 0.4 * 30);
    settings_free(s);
}
END_TEST

START_TEST(what_is_wrong_is_said)
{
    static const struct {
        const char *block, *said;
    } wrong[] = {
        {"{\"model\": \"oscillator\", \"name\": \"x\", \"unit\": \"m\","
         " \"frequency\": \"3 rad/s\", \"damping\": 0.1, \"u\": 1}",
         "of another kind than \"Hz\""},
        {"{\"model\": \"oscillator\", \"name\": \"x\", \"unit\": \"m\","
         " \"frequency\": \"3 Hz\", \"damping\": 0, \"u\": 1}",
         "an undamped oscillator has no spread of its own"},
        {"{\"model\": \"oscillator\", \"name\": \"x\", \"unit\": \"m\","
         " \"damping\": 0.1, \"u\": 1}",
         "needs \"frequency\", \"damping\" and one of"},
        {"{\"model\": \"singer\", \"name\": \"x\", \"unit\": \"m\","
         " \"tau\": 1}",
         "needs \"tau\" and either \"u\" of its acceleration or \"q\""},
        {"{\"model\": \"constant-velocity\", \"name\": [\"x\", \"y\"],"
         " \"unit\": \"m\", \"q\": 1}",
         "only a linear block lists names and units"},
        {"{\"model\": \"random-walk\", \"name\": \"x\", \"unit\": \"m\","
         " \"q\": [1, 2]}",
         "only a linear block lists \"q\" and \"mean\""},
        {"{\"model\": \"random-walk\", \"name\": \"x\", \"unit\": \"m\","
         " \"q\": 1, \"frequency\": \"1 Hz\"}",
         "\"frequency\" does not belong to the model random-walk"},
        {"{\"model\": \"linear\", \"name\": [\"x\", \"y\"], \"unit\": \"m\","
         " \"A\": [[0, 1]], \"q\": [1, 1]}",
         "must be 2 rows of numbers"},
        {"{\"model\": \"linear\", \"name\": [\"x\", \"y\"], \"unit\": \"m\","
         " \"A\": [[0, 1], [0, 0]], \"q\": [1]}",
         "lists 2 densities, one for each state"},
        {"{\"model\": \"linear\", \"name\": [\"x\", \"x\"], \"unit\": \"m\","
         " \"A\": [[0, 1], [0, 0]], \"q\": [1, 1]}",
         "stands twice"},
    };
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        struct settings *s;
        char *said = load(&s, wrong[i].block);
        ck_assert_msg(strstr(said, wrong[i].said) != NULL, "%s\n%s",
                      wrong[i].block, said);
        ck_assert_ptr_nonnull(strstr(said, "       = "));
        ck_assert_ptr_null(s);
        free(said);
    }
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load_model");
    TCase *t = tcase_create("load_model");
    tcase_add_test(t, an_oscillator_has_its_spread);
    tcase_add_test(t, words_of_an_oscillator_are_its_density);
    tcase_add_test(t, a_fading_acceleration_has_its_spread);
    tcase_add_test(t, own_matrices_are_taken);
    tcase_add_test(t, what_is_wrong_is_said);
    suite_add_tcase(s, t);
    return s;
}
