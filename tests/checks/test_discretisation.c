/* Transition and noise of every block against exact closed forms.
 *
 * Sources: closed forms for white noise of constant density in Bar-Shalom, Li
 * and Kirubarajan 2001 ch. 6; Gauss-Markov in Uhlenbeck and Ornstein 1930.
 * Values: 80-digit arithmetic, equal to quadrature of the defining integral. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/block.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

enum { N_MAX = 3 };

static const struct family {
    const char *name; /* of the cases: "NAME dt=..."                       */
    enum block_model model;
} families[] = {
    {"random_walk", BLOCK_RANDOM_WALK},
    {"gauss_markov_1 (OU)", BLOCK_GAUSS_MARKOV},
    {"white_noise_acceleration (CV)", BLOCK_CONSTANT_VELOCITY},
    {"white_noise_jerk (CA)", BLOCK_CONSTANT_ACCELERATION},
};
enum { N_FAMILIES = sizeof families / sizeof families[0] };

/* Phi and Q = Qu diag(Qd) Qu' of a lone block. */
static void transit(const struct block *b, double dt_s, double *Phi, double *Q)
{
    double Qu[N_MAX * N_MAX], Qd[N_MAX];
    struct transition t = {b->n, Phi, Qu, Qd};
    int n = b->n;
    block_transition(b, dt_s, &t);
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            double sum = 0;
            for (int k = 0; k < n; k++)
                sum += Qu[i * n + k] * Qd[k] * Qu[j * n + k];
            Q[i * n + j] = sum;
        }
}

static struct block block_of(const struct family *f, double q, double tau_s)
{
    return (struct block){
        .model = f->model, .n = block_states(f->model), .q = q, .tau_s = tau_s};
}

static double largest(int n, const double *a)
{
    double most = 0;
    for (int i = 0; i < n; i++)
        most = fmax(most, fabs(a[i]));
    return most;
}

static void check(const struct block *b, double dt_s, const double *Phi,
                  const double *Q)
{
    double got_Phi[N_MAX * N_MAX], got_Q[N_MAX * N_MAX];
    int n = b->n;
    transit(b, dt_s, got_Phi, got_Q);
    for (int i = 0; i < n * n; i++)
        ck_assert_double_le(fabs(got_Phi[i] - Phi[i]),
                            1e-11 * largest(n * n, Phi));
    CHECK_COVARIANCE(n, got_Q, Q, 1e-12);
}

START_TEST(every_step_from_a_microsecond_to_a_minute_is_exact)
{
    const struct family *f = &families[_i];
    cJSON *all = values_load("01-discretisation");
    const cJSON *c;
    int n_cases = 0;
    cJSON_ArrayForEach(c, values_at(all, "cases"))
    {
        double Phi[N_MAX * N_MAX], Q[N_MAX * N_MAX];
        if (strncmp(values_at(c, "name")->valuestring, f->name,
                    strlen(f->name)) != 0)
            continue;
        const cJSON *in = values_at(c, "inputs"),
                    *out = values_at(c, "expected");
        const cJSON *p = values_at(in, "params");
        double tau_s =
            f->model == BLOCK_GAUSS_MARKOV ? 1 / values_number(p, "beta") : 0;
        struct block b = block_of(f, values_number(p, "q"), tau_s);
        values_list(out, "Phi", Phi, N_MAX * N_MAX);
        values_list(out, "Q", Q, N_MAX * N_MAX);
        check(&b, values_number(in, "dt"), Phi, Q);
        n_cases++;
    }
    ck_assert_int_eq(n_cases, 7);
    cJSON_Delete(all);
}
END_TEST

/* Phi = Phi_b Phi_a,  Q = Phi_b Q_a Phi_b' + Q_b. */
static void compose(const struct block *b, double dt_s, double *Phi, double *Q)
{
    double P[N_MAX * N_MAX], q[N_MAX * N_MAX], W[N_MAX * N_MAX],
        was[N_MAX * N_MAX];
    int n = b->n;
    transit(b, dt_s, P, q);
    memcpy(was, Phi, sizeof was);
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            double phi = 0, w = 0;
            for (int k = 0; k < n; k++) {
                phi += P[i * n + k] * was[k * n + j];
                w += P[i * n + k] * Q[k * n + j];
            }
            Phi[i * n + j] = phi;
            W[i * n + j] = w;
        }
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            double sum = q[i * n + j];
            for (int k = 0; k < n; k++)
                sum += W[i * n + k] * P[j * n + k];
            Q[i * n + j] = sum;
        }
}

static void compose_all(const struct block *b, int n_steps, const double *steps,
                        double *Phi, double *Q)
{
    for (int i = 0; i < b->n * b->n; i++) {
        Phi[i] = i % (b->n + 1) == 0;
        Q[i] = 0;
    }
    for (int i = 0; i < n_steps; i++)
        compose(b, steps[i], Phi, Q);
}

START_TEST(four_uneven_steps_are_one_step_as_published)
{
    cJSON *all = values_load("01-discretisation");
    const cJSON *c = values_case(all, "semigroup/composition white_noise_jerk");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    struct block b = block_of(&families[3], 0.5, 0);
    double steps[4], Phi[9], Q[9], got_Phi[9], got_Q[9];
    ck_assert_int_eq(values_list(in, "steps", steps, 4), 4);
    values_list(out, "Phi_total", Phi, 9);
    values_list(out, "Q_total", Q, 9);
    check(&b, values_number(in, "total"), Phi, Q);
    compose_all(&b, 4, steps, got_Phi, got_Q);
    CHECK_NEAR(9, got_Phi, Phi, 1e-14);
    CHECK_COVARIANCE(3, got_Q, Q, 1e-13);
    cJSON_Delete(all);
}
END_TEST

static const double splits[][5] = {
    {1e-6, 0.3, 0.007, 1.9, 12},
    {1e-3, 1e-3, 1e-3, 1e-3, 59.996},
    {3.7, 900, 1e-4, 17000, 81},
    {1, 99990, 0.5, 1e-9, 8.5},
};
enum { N_SPLITS = sizeof splits / sizeof splits[0] };

START_TEST(any_split_of_a_gap_gives_the_same_transition_and_noise)
{
    struct block b = block_of(&families[_i % N_FAMILIES], 0.7, 5);
    const double *steps = splits[_i / N_FAMILIES];
    double total = 0, Phi[9], Q[9], got_Phi[9], got_Q[9];
    for (int i = 0; i < 5; i++)
        total += steps[i];
    transit(&b, total, Phi, Q);
    compose_all(&b, 5, steps, got_Phi, got_Q);
    for (int i = 0; i < b.n * b.n; i++)
        ck_assert_double_le(fabs(got_Phi[i] - Phi[i]),
                            1e-13 * largest(b.n * b.n, Phi));
    CHECK_COVARIANCE(b.n, got_Q, Q, 1e-12);
}
END_TEST

/* Closed forms in extended precision: [BSLK01] ch. 6. */
static void extended(const struct block *b, long double T, double *Phi,
                     double *Q)
{
    long double q = (long double)b->q, tau = (long double)b->tau_s, e;
    switch (b->model) {
    case BLOCK_CONSTANT:
    case BLOCK_RANDOM_WALK:
        Phi[0] = 1;
        Q[0] = (double)(q * T);
        return;
    case BLOCK_GAUSS_MARKOV:
        e = expl(-T / tau);
        Phi[0] = (double)e;
        Q[0] = (double)(-q * tau / 2 * expm1l(-2 * T / tau));
        return;
    case BLOCK_OSCILLATOR:
    case BLOCK_SINGER:
    case BLOCK_LINEAR:
    case BLOCK_LAG: /* test_joined */
        return;
    case BLOCK_CONSTANT_VELOCITY: {
        const long double phi[] = {1, T, 0, 1};
        const long double cov[] = {T * T * T / 3, T * T / 2, T * T / 2, T};
        for (int i = 0; i < 4; i++) {
            Phi[i] = (double)phi[i];
            Q[i] = (double)(q * cov[i]);
        }
        return;
    }
    case BLOCK_CONSTANT_ACCELERATION: {
        long double T2 = T * T, T3 = T2 * T, T4 = T2 * T2, T5 = T4 * T;
        const long double phi[] = {1, T, T2 / 2, 0, 1, T, 0, 0, 1};
        const long double cov[] = {T5 / 20, T4 / 8, T3 / 6, T4 / 8, T3 / 3,
                                   T2 / 2,  T3 / 6, T2 / 2, T};
        for (int i = 0; i < 9; i++) {
            Phi[i] = (double)phi[i];
            Q[i] = (double)(q * cov[i]);
        }
        return;
    }
    }
}

START_TEST(long_gaps_up_to_a_day_stay_exact)
{
    static const double gaps_s[] = {600, 7200.5, 33333.333, 1e5};
    struct block b = block_of(&families[_i], 0.4, 5);
    for (int i = 0; i < 4; i++) {
        double Phi[9], Q[9];
        extended(&b, (long double)gaps_s[i], Phi, Q);
        check(&b, gaps_s[i], Phi, Q);
    }
}
END_TEST

START_TEST(no_time_is_no_change)
{
    struct block b = block_of(&families[_i], 0.4, 5);
    double Phi[9], Q[9];
    transit(&b, 0, Phi, Q);
    for (int i = 0; i < b.n * b.n; i++) {
        ck_assert(Phi[i] == (i % (b.n + 1) == 0));
        ck_assert(Q[i] == 0);
    }
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("discretisation");
    TCase *t = tcase_create("discretisation");
    tcase_add_loop_test(t, every_step_from_a_microsecond_to_a_minute_is_exact,
                        0, N_FAMILIES);
    tcase_add_test(t, four_uneven_steps_are_one_step_as_published);
    tcase_add_loop_test(t,
                        any_split_of_a_gap_gives_the_same_transition_and_noise,
                        0, N_FAMILIES * N_SPLITS);
    tcase_add_loop_test(t, long_gaps_up_to_a_day_stay_exact, 0, N_FAMILIES);
    tcase_add_loop_test(t, no_time_is_no_change, 0, N_FAMILIES);
    suite_add_tcase(s, t);
    return s;
}
