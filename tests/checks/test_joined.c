/* Systems without a closed form: their transition against exact values, and
 * their step against itself in pieces and in other units.
 *
 * Sources: Singer 1970 (noise of a fading acceleration); damped oscillator and
 * Matern-3/2 process as textbook linear systems.  Values: 80-digit arithmetic,
 * equal to quadrature of the defining integral; Van Loan 1978 for the general
 * system.  The trap case is where the printed form of Singer's Q loses all
 * digits. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/random.h"
#include "core/model/component.h"
#include "core/model/lti.h"
#include "tests/checks/bed.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

enum { N_MAX = 4, SECOND = 1000000000 };

static double worst(int n, const double *Q, const double *want)
{
    double most = 0;
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            double size = sqrt(want[i * n + i] * want[j * n + j]);
            double off = fabs(Q[i * n + j] - want[i * n + j]);
            most = fmax(most, size > 0 ? off / size : off);
        }
    return most;
}

/* Returns the worst error of Phi and Q.  A Phi that has decayed to nothing is
 * judged as a part of 1: it came by squaring. */
static double compare(const cJSON *in, double T, const double *Phi,
                      const double *Q)
{
    double A[N_MAX * N_MAX], W[N_MAX * N_MAX], c[N_MAX] = {0};
    double got_Phi[N_MAX * N_MAX], got_Q[N_MAX * N_MAX], shift[N_MAX];
    double scratch[LTI_SCRATCH(N_MAX)], largest = 1, most = 0;
    int n = (int)sqrt(values_list(in, "A", A, N_MAX * N_MAX));
    values_list(in, "GQcGt", W, N_MAX * N_MAX);
    lti_transition(n, A, W, c, T, scratch, got_Phi, got_Q, shift);
    for (int i = 0; i < n * n; i++)
        largest = fmax(largest, fabs(Phi[i]));
    for (int i = 0; i < n * n; i++)
        most = fmax(most, fabs(got_Phi[i] - Phi[i]) / largest);
    return fmax(most, worst(n, got_Q, Q));
}

START_TEST(every_published_case_is_exact)
{
    cJSON *all = values_load("01-discretisation");
    const cJSON *c;
    int n_cases = 0;
    cJSON_ArrayForEach(c, values_at(all, "cases"))
    {
        const cJSON *in = values_at(c, "inputs"),
                    *out = values_at(c, "expected");
        double Phi[N_MAX * N_MAX], Q[N_MAX * N_MAX];
        bool is_total = cJSON_GetObjectItem(in, "total") != NULL;
        if (cJSON_GetObjectItem(in, "A") == NULL)
            continue;
        values_list(out, is_total ? "Phi_total" : "Phi", Phi, N_MAX * N_MAX);
        values_list(out, is_total ? "Q_total" : "Q", Q, N_MAX * N_MAX);
        double off =
            compare(in, values_number(in, is_total ? "total" : "dt"), Phi, Q);
        ck_assert_msg(off <= 5e-14, "%s: %g", values_at(c, "name")->valuestring,
                      off);
        n_cases++;
    }
    ck_assert_int_ge(n_cases, 41);
    cJSON_Delete(all);
}
END_TEST

START_TEST(a_fading_acceleration_keeps_its_digits_over_microseconds)
{
    cJSON *all = values_load("01-discretisation");
    const cJSON *c = values_case(all, "singer small alpha*dt"), *each;
    cJSON_ArrayForEach(each, values_at(c, "expected"))
    {
        struct bed *b = bed_new();
        double want[9], P[9], dt_s = values_number(each, "dt");
        struct block *k = bed_block(b, BLOCK_SINGER, 2 * 0.05);
        k->tau_s = 1 / 0.05;
        for (int i = 0; i < 3; i++)
            bed_prior(b, i, 0, 0);
        bed_start(b, 0);
        bed_move(b, (int64_t)(dt_s * 1e9 + 0.5));
        bed_state(b, P);
        values_list(each, "Q", want, 9);
        ck_assert_double_le(worst(3, P, want), 1e-13);
        bed_free(b);
    }
    cJSON_Delete(all);
}
END_TEST

/* --- random coupled kinds ----------------------------------------------------
 */

/* Three to six blocks; some lag behind a state of another, some not. */
static void random_kind(struct random *r, struct bed *b, double metre)
{
    static const enum block_model models[] = {
        BLOCK_OSCILLATOR, BLOCK_SINGER, BLOCK_CONSTANT_VELOCITY,
        BLOCK_GAUSS_MARKOV, BLOCK_RANDOM_WALK};
    int n = 3 + (int)random_below(r, 4);
    for (int i = 0; i < n; i++) {
        double q = exp(3 * random_normal(r));
        struct block *k =
            bed_block(b, models[random_below(r, 5)], q * metre * metre);
        k->tau_s = exp(2 * random_normal(r));
        k->omega_rad_s = exp(random_normal(r));
        k->zeta = random_uniform(r);
        k->mean = metre * random_normal(r);
        if (k->model != BLOCK_GAUSS_MARKOV && k->model != BLOCK_OSCILLATOR)
            k->mean = 0;
    }
    int on = (int)random_below(r, (uint64_t)b->kind.n);
    struct block *lag = bed_block(b, BLOCK_LAG, 0);
    lag->tau_s = 0.1 + random_uniform(r);
    b->kind.coupling[b->kind.n_couplings++] =
        (struct rig_coupling){lag->at, on, 1 / lag->tau_s};
    for (int i = 0; i < b->kind.n; i++)
        bed_prior(b, i, metre * random_normal(r),
                  metre * metre * exp(random_normal(r)));
    bed_start(b, 0);
}

static void near_beds(const struct bed *a, const struct bed *b, double metre,
                      double bound)
{
    double P[UD_MAX * UD_MAX], p[UD_MAX * UD_MAX];
    int n = a->kind.n;
    bed_state(a, P);
    bed_state(b, p);
    for (int i = 0; i < n; i++) {
        double u = sqrt(P[i * n + i]), size = u + fabs(a->f->v[i]);
        ck_assert_double_le(fabs(b->f->v[i] / metre - a->f->v[i]),
                            bound * size);
        for (int j = 0; j < n; j++)
            ck_assert_double_le(
                fabs(p[i * n + j] / (metre * metre) - P[i * n + j]),
                bound * u * sqrt(P[j * n + j]));
    }
}

START_TEST(a_gap_in_pieces_is_the_gap)
{
    struct random r;
    random_init(&r, 311, 0);
    for (int i = 0; i < 300; i++) {
        struct bed *a = bed_new(), *b = bed_new();
        struct random same = r;
        int64_t end_ns = (int64_t)(exp(3 * random_normal(&r)) * SECOND);
        same = r;
        random_kind(&r, a, 1);
        random_kind(&same, b, 1);
        bed_move(a, end_ns);
        for (int64_t k = 1; k < 4; k++)
            bed_move(b, end_ns / 5 * k);
        bed_move(b, end_ns);
        near_beds(a, b, 1, 1e-10);
        bed_free(a);
        bed_free(b);
    }
}
END_TEST

START_TEST(millimetres_give_what_metres_give)
{
    struct random r;
    random_init(&r, 312, 0);
    for (int i = 0; i < 300; i++) {
        struct bed *a = bed_new(), *b = bed_new();
        struct random same = r;
        random_kind(&r, a, 1);
        random_kind(&same, b, 1000);
        for (int k = 1; k <= 5; k++) {
            double H[UD_MAX] = {1, 0, 0.5}, z = random_normal(&r);
            double mm = 1000 * z, r_m = 0.01, r_mm = 1e4;
            bed_see(a, k * 70000000, 1, H, &z, &r_m);
            bed_see(b, k * 70000000, 1, H, &mm, &r_mm);
        }
        near_beds(a, b, 1000, 1e-10);
        ck_assert_double_eq_tol(a->nis, b->nis, 1e-9 * (1 + a->nis));
        bed_free(a);
        bed_free(b);
    }
}
END_TEST

/* What is kept by dt is what would be computed: more steps than are kept, in
 * turn, against one of each. */
START_TEST(kept_transitions_change_nothing)
{
    struct random r, same;
    random_init(&r, 313, 0);
    same = r;
    struct bed *a = bed_new(), *b = bed_new();
    random_kind(&r, a, 1);
    random_kind(&same, b, 1);
    int64_t t_ns = 0;
    for (int i = 0; i < 200; i++) {
        t_ns += 1000000 * (1 + i * i % 13);
        bed_move(a, t_ns);
        joined_init(b->joined, b->kind.n); /* forgets all */
        bed_move(b, t_ns);
        ck_assert_mem_eq(a->f->v, b->f->v,
                         (size_t)(b->kind.n + UD_SIZE(b->kind.n)) *
                             sizeof(double));
    }
    bed_free(a);
    bed_free(b);
}
END_TEST

/* A system that grows without bound over a gap of hours: nothing is known
 * afterwards, and nothing is NaN. */
START_TEST(what_grows_beyond_all_bounds_starts_anew)
{
    struct bed *b = bed_new();
    double A_W_c[] = {5, 1, 0};
    struct block *k = bed_block(b, BLOCK_LINEAR, 0);
    k->n = 1;
    b->kind.n = 1;
    memcpy(b->kind.own, A_W_c, sizeof A_W_c);
    bed_prior(b, 0, 1, 1);
    bed_start(b, 0);
    bed_move(b, (int64_t)7200 * SECOND);
    ck_assert_int_eq(b->f->n_free, 1);
    double H = 1, z = 3, r = 0.25, P;
    bed_see(b, (int64_t)7200 * SECOND, 1, &H, &z, &r);
    ck_assert_double_eq(bed_state(b, &P)[0], 3);
    ck_assert_double_eq(P, 0.25);
    bed_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("joined");
    TCase *t = tcase_create("joined");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, every_published_case_is_exact);
    tcase_add_test(t, a_fading_acceleration_keeps_its_digits_over_microseconds);
    tcase_add_test(t, a_gap_in_pieces_is_the_gap);
    tcase_add_test(t, millimetres_give_what_metres_give);
    tcase_add_test(t, kept_transitions_change_nothing);
    tcase_add_test(t, what_grows_beyond_all_bounds_starts_anew);
    suite_add_tcase(s, t);
    return s;
}
