/* kernels.h - an ideal filter step: size and model known to the compiler.
 *
 * The same form as the filter that ships (factors U D U', scalar updates,
 * noise factored in closed form from dt), without its freedom: AXES axes of
 * LEVELS derivatives each, of which every axis' first state is read.  A
 * template: define AXES, LEVELS and KERNEL (the prefix of all names) before
 * each #include.  Every loop has constant bounds and is unrolled.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#define KERNEL_PASTE_(a, b) a##_##b
#define KERNEL_PASTE(a, b)  KERNEL_PASTE_(a, b)
#define NAME(what)          KERNEL_PASTE(KERNEL, what)
#define N                   (AXES * LEVELS)
#define INLINE              static inline __attribute__((always_inline))
#ifdef __clang__ /* unrolls loops of constant bounds unasked */
#define UNROLL
#else
#define UNROLL _Pragma("GCC unroll 12")
#endif

struct NAME(state) {
    double x[N], D[N], U[N][N]; /* U above its diagonal                   */
};

/* Entries of a lone axis' Phi by how far above the diagonal, Qu, and Qd. */
struct NAME(axis) {
    double phi[3], Qu[3][3], Qd[3];
};

INLINE void NAME(fill)(double q, double T, struct NAME(axis) * a)
{
    double qT = q * T, T2 = T * T;
    a->phi[0] = 1;
    a->phi[1] = T;
    a->phi[2] = T2 / 2;
    for (int i = 0; i < 3; i++)
        for (int j = i; j < 3; j++)
            a->Qu[i][j] = i == j ? 1 : T / 2;
    if (LEVELS == 3)
        a->Qu[0][2] = T2 * (1.0 / 6);
    a->Qd[LEVELS - 1] = qT;
    a->Qd[LEVELS - 2] = qT * T2 * (1.0 / 12);
    if (LEVELS == 3)
        a->Qd[0] = qT * T2 * T2 * (1.0 / 720);
}

/* x = Phi x, W = Phi U, V = Qu. */
INLINE void NAME(spread)(struct NAME(state) * s, const struct NAME(axis) * a,
                         double W[N][N], double V[N][N])
{
    UNROLL
    for (int i = 0; i < N; i++) {
        const int level = i % LEVELS, end = i - level + LEVELS;
        double x = s->x[i];
        UNROLL
        for (int k = i + 1; k < end; k++)
            x += a->phi[k - i] * s->x[k];
        s->x[i] = x;
        UNROLL
        for (int j = i; j < N; j++) {
            double w = i == j ? 1 : s->U[i][j];
            UNROLL
            for (int k = i + 1; k < end && k <= j; k++)
                w += a->phi[k - i] * (k == j ? 1 : s->U[k][j]);
            W[i][j] = w;
            V[i][j] = j < end ? a->Qu[level][j % LEVELS] : 0;
        }
    }
}

INLINE void NAME(predict)(struct NAME(state) * s, double q, double T)
{
    double W[N][N], V[N][N], D[N];
    struct NAME(axis) a;
    NAME(fill)(q, T, &a);
    NAME(spread)(s, &a, W, V);
    UNROLL
    for (int j = N - 1; j >= 0; j--) {
        double c[N], e[N], d = 0;
        UNROLL
        for (int k = j; k < N; k++) {
            c[k] = s->D[k] * W[j][k];
            e[k] = a.Qd[k % LEVELS] * V[j][k];
            d += c[k] * W[j][k] + e[k] * V[j][k];
        }
        D[j] = d;
        double inverse = 1 / d;
        UNROLL
        for (int i = 0; i < j; i++) {
            double u = 0;
            UNROLL
            for (int k = j; k < N; k++)
                u += W[i][k] * c[k] + V[i][k] * e[k];
            u *= inverse;
            s->U[i][j] = u;
            UNROLL
            for (int k = j; k < N; k++) {
                W[i][k] -= u * W[j][k];
                V[i][k] -= u * V[j][k];
            }
        }
    }
    for (int j = 0; j < N; j++)
        s->D[j] = D[j];
}

/* State `at` alone is read: h is zero elsewhere, so f is zero before it. */
INLINE void NAME(update)(const int at, struct NAME(state) * s, double z,
                         double r)
{
    double b[N], y = z - s->x[at], S = r + s->D[at], over = 1 / S;
    UNROLL
    for (int i = 0; i < at; i++)
        b[i] = s->U[i][at] * s->D[at];
    b[at] = s->D[at];
    s->D[at] *= r * over; /* its column of U stays: b was zero before it */
    UNROLL
    for (int j = at + 1; j < N; j++) {
        double f = s->U[at][j], v = s->D[j] * f, was = S, was_over = over;
        S += f * v;
        over = 1 / S;
        s->D[j] *= was * over;
        b[j] = v;
        UNROLL
        for (int i = 0; i < j; i++) {
            double u = s->U[i][j];
            s->U[i][j] = u - b[i] * (f * was_over);
            b[i] += u * v;
        }
    }
    UNROLL
    for (int i = 0; i < N; i++)
        s->x[i] += b[i] * (y * over); /* x = x + K y       */
}

/* A call, as ours is one: nothing is carried over from step to step. */
static __attribute__((noipa)) void NAME(step)(struct NAME(state) * s,
                                              const double *z, double r,
                                              double q, double T)
{
    NAME(predict)(s, q, T);
    UNROLL
    for (int i = 0; i < AXES; i++)
        NAME(update)(i * LEVELS, s, z[i], r);
}

#undef KERNEL_PASTE_
#undef KERNEL_PASTE
#undef NAME
#undef N
#undef INLINE
#undef UNROLL
#undef AXES
#undef LEVELS
#undef KERNEL
