/* Digits that the factored form keeps where others lose all of them.
 *
 * Sources: near-dependent measurements after Dyer and McReynolds 1969 and
 * Verhaegen and Van Dooren 1986; large prior after Bierman 1977; answers in
 * exact rational arithmetic.  Longley, Wampler1, Wampler2: NIST Statistical
 * Reference Datasets, certified values. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/ud.h"
#include "tests/checks/bed.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

enum { N_MAX = 7, ROWS_MAX = 21 };

static cJSON *all;

static void load(void)
{
    all = values_load("02-update-forms-numerics");
}

static void unload(void)
{
    cJSON_Delete(all);
}

static void check_positive(int n, const double *ud)
{
    for (int i = 0; i < n; i++)
        ck_assert_double_ge(ud[UD_AT(i, i)], 0);
}

/* --- two measurements ------------------------------------------------------
 */

/* Lays the rows of H one by one from P0, x0; x and P are the result. */
static void lay(const cJSON *in, int n, double *x, double *P)
{
    double H[2 * N_MAX], R[4], z[2], ud[UD_SIZE(N_MAX)], b[N_MAX];
    ck_assert_int_eq(values_list(in, "P0", P, n * n), n * n);
    ck_assert_int_eq(values_list(in, "H", H, 2 * n), 2 * n);
    values_list(in, "x0", x, n);
    values_list(in, "R", R, 4);
    values_list(in, "z", z, 2);
    ck_assert_int_eq(ud_factor(n, P, ud), ST_OK);
    for (int i = 0; i < 2; i++) {
        double *h = H + i * n, y = z[i];
        for (int k = 0; k < n; k++)
            y -= h[k] * x[k];
        double S = ud_update(n, ud, h, R[3 * i], b);
        for (int k = 0; k < n; k++)
            x[k] += b[k] * (y / S);
        check_positive(n, ud);
    }
    ud_covariance(n, ud, P);
}

START_TEST(eight_digits_of_every_covariance_are_kept)
{
    const cJSON *c;
    int n_cases = 0;
    cJSON_ArrayForEach(c, values_at(all, "cases"))
    {
        const char *name = values_at(c, "name")->valuestring;
        bool is_near = strncmp(name, "near-dependent", 14) == 0;
        if (!is_near && strncmp(name, "large prior", 11) != 0)
            continue;
        int n = is_near ? 3 : 2;
        double x[N_MAX], P[N_MAX * N_MAX], want[N_MAX * N_MAX];
        lay(values_at(c, "inputs"), n, x, P);
        values_list(values_at(c, "expected"), "P", want, n * n);
        double off = values_covariance_off(n, P, want);
        ck_assert_msg(off <= 1e-8, "%s: off by %g", name, off);
        n_cases++;
    }
    ck_assert_int_eq(n_cases, 16);
}
END_TEST

START_TEST(a_prior_of_1e12_to_1e18_gives_fourteen_digits)
{
    static const char *const names[] = {"large prior (Bierman 1977) eps=2^-20",
                                        "large prior (Bierman 1977) eps=2^-26",
                                        "large prior (Bierman 1977) eps=2^-30"};
    const cJSON *c = values_case(all, names[_i]);
    double x[2], P[4], want_x[2], want[4];
    lay(values_at(c, "inputs"), 2, x, P);
    values_list(values_at(c, "expected"), "P", want, 4);
    values_list(values_at(c, "expected"), "x", want_x, 2);
    CHECK_COVARIANCE(2, P, want, 1e-14);
    CHECK_NEAR(2, x, want_x, 1e-14);
}
END_TEST

/* --- one step, factor by factor ---------------------------------------------
 */

static void check_factors(const cJSON *out, const char *U, const char *D,
                          const double *ud)
{
    double want_U[9], want_D[3];
    values_list(out, U, want_U, 9);
    values_list(out, D, want_D, 3);
    for (int j = 0; j < 3; j++) {
        double d = ud[UD_AT(j, j)];
        ck_assert_double_le(fabs(d - want_D[j]), 1e-14 * want_D[j]);
        for (int i = 0; i < j; i++)
            ck_assert_double_le(fabs(ud[UD_AT(i, j)] - want_U[i * 3 + j]),
                                1e-14);
    }
}

struct golden {
    double ud[UD_SIZE(3)], x[3], Phi[9], G[3], q;
    const cJSON *out;
};

/* Factor and measurement update; the time update is left to the tests. */
static void update_golden(struct golden *g)
{
    const cJSON *c = values_case(all, "UD golden");
    const cJSON *in = values_at(c, "inputs");
    double P[9], h[3], b[3];
    g->out = values_at(c, "expected");
    values_list(in, "P", P, 9);
    values_list(in, "h", h, 3);
    values_list(in, "x0", g->x, 3);
    values_list(in, "Phi", g->Phi, 9);
    values_list(in, "G", g->G, 3);
    g->q = values_number(in, "q");
    ck_assert_int_eq(ud_factor(3, P, g->ud), ST_OK);
    check_factors(g->out, "U0", "D0", g->ud);
    double S = ud_update(3, g->ud, h, values_number(in, "r"), b);
    for (int k = 0; k < 3; k++)
        g->x[k] = b[k] * (values_number(in, "z") / S);
}

START_TEST(the_measurement_update_has_the_exact_factors)
{
    struct golden g;
    double x[3], P[9], want[9];
    update_golden(&g);
    check_factors(g.out, "U1", "D1", g.ud);
    values_list(g.out, "x1", x, 3);
    CHECK_NEAR(3, g.x, x, 1e-14);
    ud_covariance(3, g.ud, P);
    values_list(g.out, "P1", want, 9);
    CHECK_COVARIANCE(3, P, want, 1e-14);
    ck_assert_double_le(fabs(ud_variance(3, g.ud, 1) - want[4]), 1e-14 * 5);
}
END_TEST

/* Phi U, n x n. */
static void spread(const struct golden *g, double *W, int stride)
{
    for (int i = 0; i < 3; i++)
        for (int j = 0; j < 3; j++) {
            double sum = g->Phi[i * 3 + j];
            for (int k = 0; k < j; k++)
                sum += g->Phi[i * 3 + k] * g->ud[UD_AT(k, j)];
            W[i * stride + j] = sum;
        }
}

START_TEST(the_time_update_has_the_exact_factors)
{
    struct golden g;
    double W[12], w[4], P[9], want[9], ud[UD_SIZE(3)];
    update_golden(&g);
    spread(&g, W, 4);
    for (int i = 0; i < 3; i++) {
        W[i * 4 + 3] = g.G[i];
        w[i] = g.ud[UD_AT(i, i)];
    }
    w[3] = g.q;
    ud_gram_schmidt(3, 4, W, w, ud);
    check_factors(g.out, "U2", "D2", ud);
    ud_covariance(3, ud, P);
    values_list(g.out, "P2", want, 9);
    CHECK_COVARIANCE(3, P, want, 1e-14);
}
END_TEST

START_TEST(the_time_update_by_two_factors_is_the_same)
{
    struct golden g;
    double W[9], V[9] = {0}, D[3], Qd[3] = {0}, ud[UD_SIZE(3)];
    update_golden(&g);
    spread(&g, W, 3);
    for (int i = 0; i < 3; i++) {
        V[i * 3 + 2] = g.G[i];
        D[i] = g.ud[UD_AT(i, i)];
    }
    Qd[2] = g.q;
    ud_predict(3, _i == 1, W, V, D, Qd, ud);
    check_factors(g.out, "U2", "D2", ud);
}
END_TEST

/* --- certified regressions as filters ----------------------------------------
 */

/* A constant state per column, nothing known before the first row. */
static struct bed *regress(const cJSON *in, int n, int n_rows,
                           bool is_backwards)
{
    static double H[ROWS_MAX * N_MAX], z[ROWS_MAX];
    const double r = 1;
    struct bed *b = bed_new();
    ck_assert_int_eq(values_list(in, "H_rows", H, n * n_rows), n * n_rows);
    ck_assert_int_eq(values_list(in, "z", z, n_rows), n_rows);
    for (int i = 0; i < n; i++)
        bed_block(b, BLOCK_CONSTANT, 0);
    bed_start(b, 0);
    for (int i = 0; i < n_rows; i++) {
        int row = is_backwards ? n_rows - 1 - i : i;
        bed_see(b, i, 1, H + row * n, z + row, &r);
        check_positive(n, kf_ud(b->f));
    }
    ck_assert_int_eq(b->f->n_free, 0);
    return b;
}

START_TEST(longley_as_a_filter_has_nine_certified_digits)
{
    const cJSON *c = values_case(all, "NIST StRD Longley");
    const cJSON *out = values_at(c, "expected");
    struct bed *b = regress(values_at(c, "inputs"), 7, 16, _i == 1);
    double P[49], want[7], u[7], got_u[7];
    const double *x = bed_state(b, P);
    double s = sqrt(b->nis / 9); /* residual standard deviation, 16 - 7 */
    values_list(out, "x", want, 7);
    values_list(out, "standard_errors", u, 7);
    for (int i = 0; i < 7; i++)
        got_u[i] = s * sqrt(P[i * 7 + i]);
    ck_assert_int_eq(b->n_judged, 9);
    printf("longley: %.1f certified digits\n", values_digits(7, x, want));
    ck_assert_double_ge(values_digits(7, x, want), 9);
    ck_assert_double_ge(values_digits(7, got_u, u), 9);
    double sd = values_number(out, "residual_sd");
    ck_assert_double_ge(values_digits(1, &s, &sd), 9);
    bed_free(b);
}
END_TEST

/* What a square-root information filter keeps (9.5 and 12.8), in whole digits:
 * the last ones depend on the order of operations. */
static const struct {
    const char *name;
    double digits;
} wampler[] = {{"NIST StRD Wampler1", 9}, {"NIST StRD Wampler2", 12}};

START_TEST(wampler_polynomials_as_a_filter_have_their_certified_digits)
{
    const cJSON *c = values_case(all, wampler[_i].name);
    struct bed *b = regress(values_at(c, "inputs"), 6, 21, false);
    double want[6];
    values_list(values_at(c, "expected"), "x", want, 6);
    ck_assert_double_ge(values_digits(6, kf_x(b->f), want), wampler[_i].digits);
    ck_assert_int_eq(b->n_judged, 15);
    bed_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("digits");
    TCase *t = tcase_create("digits");
    tcase_add_checked_fixture(t, load, unload);
    tcase_add_test(t, eight_digits_of_every_covariance_are_kept);
    tcase_add_loop_test(t, a_prior_of_1e12_to_1e18_gives_fourteen_digits, 0, 3);
    tcase_add_test(t, the_measurement_update_has_the_exact_factors);
    tcase_add_test(t, the_time_update_has_the_exact_factors);
    tcase_add_loop_test(t, the_time_update_by_two_factors_is_the_same, 0, 2);
    tcase_add_loop_test(t, longley_as_a_filter_has_nine_certified_digits, 0, 2);
    tcase_add_loop_test(
        t, wampler_polynomials_as_a_filter_have_their_certified_digits, 0, 2);
    suite_add_tcase(s, t);
    return s;
}
