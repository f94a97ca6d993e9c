/* kernels.h - ideal filter steps: size and model known to the compiler.
 *
 * The same form as the filter that ships (factors U D U', scalar updates,
 * noise factored in closed form from dt), without its freedom: `axes` axes of
 * `levels` derivatives, every axis' first state read.  Both are constants
 * where a kernel is called, so the compiler unrolls everything.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_BENCH_KERNELS_H
#define TESTS_BENCH_KERNELS_H

enum { KERNEL_STATES_MAX = 12 };

struct kernel_state {
    double x[KERNEL_STATES_MAX], D[KERNEL_STATES_MAX];
    double U[KERNEL_STATES_MAX * KERNEL_STATES_MAX]; /* above the diagonal */
};

#define KERNEL_INLINE static inline __attribute__((always_inline))

/* Entries of a lone axis' Phi and Qu by how far above the diagonal, and Qd. */
struct kernel_axis {
    double phi[3], Qu[3][3], Qd[3];
};

KERNEL_INLINE void kernel_axis_fill(const int levels, double q, double T,
                                    struct kernel_axis *a)
{
    double qT = q * T, T2 = T * T;
    a->phi[0] = 1;
    a->phi[1] = T;
    a->phi[2] = T2 / 2;
    for (int i = 0; i < 3; i++)
        for (int j = i; j < 3; j++)
            a->Qu[i][j] = i == j ? 1 : T / 2;
    if (levels == 3)
        a->Qu[0][2] = T2 / 6;
    a->Qd[levels - 1] = qT;
    a->Qd[levels - 2] = qT * T2 / 12;
    if (levels == 3)
        a->Qd[0] = qT * T2 * T2 / 720;
}

KERNEL_INLINE void kernel_predict(const int axes, const int levels,
                                  struct kernel_state *s, double q, double T)
{
    const int n = axes * levels;
    double W[KERNEL_STATES_MAX][KERNEL_STATES_MAX];
    double V[KERNEL_STATES_MAX][KERNEL_STATES_MAX];
    double new_D[KERNEL_STATES_MAX];
    struct kernel_axis a;
    kernel_axis_fill(levels, q, T, &a);
    for (int i = 0; i < n; i++) {
        const int level = i % levels, end = i - level + levels;
        double x = s->x[i];
        for (int k = i + 1; k < end; k++)
            x += a.phi[k - i] * s->x[k];
        s->x[i] = x;                                 /* x = Phi x         */
        for (int j = i; j < n; j++) {
            double w = i == j ? 1 : s->U[i * n + j];
            for (int k = i + 1; k < end && k <= j; k++)
                w += a.phi[k - i] * (k == j ? 1 : s->U[k * n + j]);
            W[i][j] = w;                             /* W = Phi U         */
            V[i][j] = j < end ? a.Qu[level][j % levels] : 0;
        }
    }
    for (int j = n - 1; j >= 0; j--) {
        double c[KERNEL_STATES_MAX], e[KERNEL_STATES_MAX], d = 0;
        for (int k = j; k < n; k++) {
            c[k] = s->D[k] * W[j][k];
            e[k] = a.Qd[k % levels] * V[j][k];
            d += c[k] * W[j][k] + e[k] * V[j][k];
        }
        new_D[j] = d;
        double inverse = 1 / d;
        for (int i = 0; i < j; i++) {
            double u = 0;
            for (int k = j; k < n; k++)
                u += W[i][k] * c[k] + V[i][k] * e[k];
            u *= inverse;
            s->U[i * n + j] = u;
            for (int k = j; k < n; k++) {
                W[i][k] -= u * W[j][k];
                V[i][k] -= u * V[j][k];
            }
        }
    }
    for (int j = 0; j < n; j++)
        s->D[j] = new_D[j];
}

/* State `at` alone is read: h is zero elsewhere, so f is zero before it. */
KERNEL_INLINE void kernel_update(const int n, const int at,
                                 struct kernel_state *s, double z, double r)
{
    double b[KERNEL_STATES_MAX], y = z - s->x[at];
    double S = r + s->D[at], over = 1 / S;
    for (int i = 0; i < at; i++)
        b[i] = s->U[i * n + at] * s->D[at];
    b[at] = s->D[at];
    s->D[at] *= r * over; /* its column of U stays: b was zero before it */
    double was_over = over;
    for (int j = at + 1; j < n; j++) {
        double f = s->U[at * n + j], v = s->D[j] * f, was = S;
        S += f * v;
        over = 1 / S;
        s->D[j] *= was * over;
        b[j] = v;
        for (int i = 0; i < j; i++) {
            double u = s->U[i * n + j];
            s->U[i * n + j] = u - b[i] * (f * was_over);
            b[i] += u * v;
        }
        was_over = over;
    }
    for (int i = 0; i < n; i++)
        s->x[i] += b[i] * (y * over);                /* x = x + K y       */
}

KERNEL_INLINE void kernel_step(const int axes, const int levels,
                               struct kernel_state *s, const double *z,
                               double r, double q, double T)
{
    kernel_predict(axes, levels, s, q, T);
    for (int i = 0; i < axes; i++)
        kernel_update(axes * levels, i * levels, s, z[i], r);
}

#endif
