/* The chi-square distribution against printed and computed tables. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include "core/math/chi2.h"
#include "tests/suite.h"

static const double no_number = (double)NAN;
static const double endless = (double)INFINITY;

struct row {
    char kind[16];
    double dof, p, x;
};

/* Calls check for every row of tests/data/chi2_values.csv of this kind; the
 * sources stand in the file's first lines. */
static void each_row(const char *kind, int n,
                     void (*check)(const struct row *row))
{
    FILE *file = fopen("tests/data/chi2_values.csv", "r");
    ck_assert_ptr_nonnull(file);
    char line[200];
    struct row row;
    int seen = 0;
    while (fgets(line, sizeof line, file) != NULL) {
        if (sscanf(line, "%15[^,],%lf,%lf,%lf", row.kind, &row.dof, &row.p,
                   &row.x) != 4 ||
            strcmp(row.kind, kind) != 0)
            continue;
        seen++;
        check(&row);
    }
    fclose(file);
    ck_assert_int_eq(seen, n);
}

static void assert_near(double y, double expected, double relative,
                        const struct row *row)
{
    ck_assert_msg(fabs(y - expected) <= relative * fabs(expected),
                  "%s, dof %g, p %g, x %g: %.17g", row->kind, row->dof, row->p,
                  row->x, y);
}

/* Printed with three decimals: half of the last one. */
static void printed_row(const struct row *row)
{
    double x = chi2_quantile(1 - row->p, row->dof);
    ck_assert_msg(fabs(x - row->x) <= 0.0005, "dof %g, upper tail %g: %g",
                  row->dof, row->p, x);
}

START_TEST(quantiles_are_those_printed_by_NIST)
{
    each_row("printed", 50, printed_row);
}
END_TEST

static void quantile_row(const struct row *row)
{
    assert_near(chi2_quantile(row->p, row->dof), row->x, 1e-10, row);
    assert_near(chi2_cdf(row->x, row->dof), row->p, 1e-11, row);
}

START_TEST(quantiles_agree_with_other_programs)
{
    each_row("quantile", 166, quantile_row);
}
END_TEST

START_TEST(bounds_of_a_window_of_measurements_agree)
{
    each_row("bound", 100, quantile_row);
}
END_TEST

static void probability_row(const struct row *row)
{
    assert_near(chi2_cdf(row->x, row->dof), row->p, 1e-11, row);
    assert_near(chi2_quantile(row->p, row->dof), row->x, 1e-8, row);
}

START_TEST(a_gate_of_so_many_sigma_has_its_probability)
{
    each_row("probability", 30, probability_row);
}
END_TEST

static void tail_row(const struct row *row)
{
    assert_near(chi2_cdf(row->x, row->dof), row->p, 1e-12, row);
    if (row->p < 0.999)
        assert_near(chi2_quantile(row->p, row->dof), row->x, 1e-11, row);
}

START_TEST(far_tails_and_extreme_degrees_of_freedom_keep_their_digits)
{
    each_row("tail", 296, tail_row);
}
END_TEST

START_TEST(two_degrees_of_freedom_are_an_exponential)
{
    for (double x = 1e-8; x < 70; x *= 1.3)
        ck_assert_double_eq_tol(chi2_cdf(x, 2) / -expm1(-x / 2), 1, 1e-13);
    for (int k = 1; k <= 50; k++) /* 1 - 2^-k is exact */
        ck_assert_double_eq_tol(
            chi2_quantile(1 - ldexp(1, -k), 2) / (2 * k * log(2)), 1, 1e-13);
}
END_TEST

START_TEST(the_quantile_undoes_the_distribution)
{
    static const double dofs[] = {1e-3, 0.5, 1, 2, 7.5, 60, 1e4, 1e8, 1e10};
    for (int i = 0; i < 9; i++) {
        double was = 0;
        for (int k = 1; k < 200; k++) {
            double p = k / 200.0, x = chi2_quantile(p, dofs[i]);
            ck_assert(x >= was && isfinite(x));
            double tol = 1e-12 + 2e-15 * sqrt(dofs[i]); /* x to 4e-15 */
            if (x > 1e-300)
                ck_assert_double_eq_tol(chi2_cdf(x, dofs[i]), p, tol);
            was = x;
        }
    }
}
END_TEST

START_TEST(gates_have_the_bits_of_every_other_build)
{
    uint64_t hash = 0xcbf29ce484222325; /* FNV-1a */
    for (int dof = 1; dof <= 100; dof++) {
        for (int k = 1; k < 100; k++) {
            double x = chi2_quantile(k / 100.0, dof), y[2] = {x};
            y[1] = chi2_cdf(x + 1, dof);
            unsigned char bytes[sizeof y];
            memcpy(bytes, y, sizeof y);
            for (size_t i = 0; i < sizeof y; i++)
                hash = (hash ^ bytes[i]) * 0x100000001b3;
        }
    }
    ck_assert_msg(hash == 0x560b3d34968cb8a7, "gates give 0x%016llx",
                  (unsigned long long)hash);
}
END_TEST

START_TEST(arguments_outside_give_their_limits_or_no_number)
{
    ck_assert_double_eq(chi2_cdf(0, 3), 0);
    ck_assert_double_eq(chi2_cdf(-1, 3), 0);
    ck_assert_double_eq(chi2_cdf(endless, 3), 1);
    ck_assert_double_eq(chi2_cdf(1e300, 1e-3), 1);
    ck_assert_double_nan(chi2_cdf(1, 0));
    ck_assert_double_nan(chi2_cdf(1, 1.1e10));
    ck_assert_double_nan(chi2_cdf(no_number, 1));
    ck_assert_double_nan(chi2_cdf(1, no_number));
    ck_assert_double_nan(chi2_quantile(0, 1));
    ck_assert_double_nan(chi2_quantile(1, 1));
    ck_assert_double_nan(chi2_quantile(0.5, -1));
    ck_assert_double_nan(chi2_quantile(no_number, 1));
    ck_assert_double_nan(chi2_quantile(0.5, endless));
    ck_assert_double_eq(chi2_quantile(0.5, 1e-4), 0); /* below 1e-3000 */
    ck_assert(chi2_quantile(5e-324, 1) >= 0);
    ck_assert(chi2_quantile(1 - 0x1p-53, 1) > 60);
}
END_TEST

START_TEST(ln_gamma_has_its_known_values)
{
    double ln_factorial = 0; /* ln Gamma(n + 1) = ln n! */
    for (int n = 1; n < 170; n++) {
        ln_factorial += log(n);
        ck_assert_double_eq_tol(chi2_ln_gamma(n + 1), ln_factorial,
                                1e-13 * fmax(1, ln_factorial));
    }
    ck_assert_double_eq_tol(chi2_ln_gamma(0.5), 0.5 * log(acos(-1)), 1e-14);
    ck_assert_double_eq_tol(chi2_ln_gamma(1), 0, 1e-14);
    for (double x = 1e-5; x < 1e8; x *= 1.07) { /* glibc 2.36: 4 places */
        double y = lgamma(x);
        ck_assert_double_eq_tol(chi2_ln_gamma(x), y,
                                1e-13 * fmax(0.5, fabs(y)));
    }
    ck_assert_double_nan(chi2_ln_gamma(0));
    ck_assert_double_nan(chi2_ln_gamma(-2.5));
    ck_assert_double_nan(chi2_ln_gamma(no_number));
    ck_assert_double_infinite(chi2_ln_gamma(endless));
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("chi2");
    TCase *t = tcase_create("chi2");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, quantiles_are_those_printed_by_NIST);
    tcase_add_test(t, quantiles_agree_with_other_programs);
    tcase_add_test(t, bounds_of_a_window_of_measurements_agree);
    tcase_add_test(t, a_gate_of_so_many_sigma_has_its_probability);
    tcase_add_test(t,
                   far_tails_and_extreme_degrees_of_freedom_keep_their_digits);
    tcase_add_test(t, two_degrees_of_freedom_are_an_exponential);
    tcase_add_test(t, the_quantile_undoes_the_distribution);
    tcase_add_test(t, gates_have_the_bits_of_every_other_build);
    tcase_add_test(t, arguments_outside_give_their_limits_or_no_number);
    tcase_add_test(t, ln_gamma_has_its_known_values);
    suite_add_tcase(s, t);
    return s;
}
