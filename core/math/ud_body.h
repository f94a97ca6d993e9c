/* ud_body.h - the inner loops of ud.h, to be inlined with a known n.
 *
 * A body that is inlined with a constant n is unrolled by the compiler: the
 * same operations in the same order, hence the same bits, without the loops.
 * For ud.c and core/filter; everybody else calls ud.h.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_UD_BODY_H
#define CORE_MATH_UD_BODY_H

#include "core/math/ud.h"

#define UNROLLED static inline __attribute__((always_inline))
#ifdef __clang__ /* unrolls loops of known bounds unasked */
#define UD_UNROLL
#else
#define UD_UNROLL _Pragma("GCC unroll 6")
#endif

/* Calls `call(n)` with n as a constant where it is a usual size. */
#define UD_FOR_N(n, call)                                                      \
    switch (n) {                                                               \
    case 1:                                                                    \
        call(1);                                                               \
        break;                                                                 \
    case 2:                                                                    \
        call(2);                                                               \
        break;                                                                 \
    case 3:                                                                    \
        call(3);                                                               \
        break;                                                                 \
    case 4:                                                                    \
        call(4);                                                               \
        break;                                                                 \
    case 6:                                                                    \
        call(6);                                                               \
        break;                                                                 \
    default:                                                                   \
        call(n);                                                               \
    }

/* Below this a pivot carries no information and its reciprocal would not be
 * finite. */
#define UD_PIVOT_MIN 1e-290

/* f = U' h and v = D f; returns S = h P h' + r. */
UNROLLED double ud_look(const int n, const double *ud, const double *h,
                        double r, double *f, double *v)
{
    double S = r;
    const double *col = ud;
    UD_UNROLL
    for (int j = 0; j < n; j++) {
        double sum = h[j];
        UD_UNROLL
        for (int i = 0; i < j; i++)
            sum += col[i] * h[i]; /* f = U' h              */
        f[j] = sum;
        v[j] = col[j] * sum; /* v = D f               */
        S += sum * v[j];     /* S = r + f' D f        */
        col += j + 1;
    }
    return S;
}

/* The same for h that is `value` at `state` and zero elsewhere: a row of U. */
UNROLLED double ud_look_one(const int n, const double *ud, int state,
                            double value, double r, double *f, double *v)
{
    double S = r;
    const double *col = ud;
    UD_UNROLL
    for (int j = 0; j < n; j++) {
        double u = 0;
        if (j > state)
            u = col[state] * value;
        else if (j == state)
            u = value;
        f[j] = u;
        v[j] = col[j] * u;
        S += u * v[j];
        col += j + 1;
    }
    return S;
}

/* The update itself from what ud_look found, S > 0 and over = 1 / S; b is
 * the gain times S.  A column that h does not see stays exactly as it is. */
UNROLLED void ud_correct(const int n, double *ud, const double *f,
                         const double *v, double r, double over, double *b)
{
    double alpha = r, inverse = r > 0 ? 1 / r : 0;
    double *col = ud;
    UD_UNROLL
    for (int j = 0; j < n; j++) {
        double was = alpha, lambda = -f[j] * inverse;
        alpha = was + f[j] * v[j];
        b[j] = v[j];
        if (alpha > was) {
            inverse = j == n - 1 ? over : 1 / alpha;
            col[j] *= was * inverse; /* D_j = D_j was / alpha */
        }
        UD_UNROLL
        for (int i = 0; i < j; i++) {
            double u = col[i];
            col[i] = u + b[i] * lambda;
            b[i] += u * v[j];
        }
        col += j + 1;
    }
}

/* ud = factors of W diag(D) W' + V diag(Qd) V', see ud_predict. */
UNROLLED void ud_gather(const int n, const bool is_upper, double *W, double *V,
                        const double *D, const double *Qd, double *ud)
{
    double c[UD_MAX], e[UD_MAX];
    UD_UNROLL
    for (int j = n - 1; j >= 0; j--) {
        double *Wj = W + j * n, *Vj = V + j * n, *col = ud + UD_AT(0, j);
        double d = 0;
        for (int l = 0; l < j && !is_upper; l++) {
            c[l] = D[l] * Wj[l];
            d += c[l] * Wj[l];
        }
        UD_UNROLL
        for (int l = j; l < n; l++) {
            c[l] = D[l] * Wj[l];
            e[l] = Qd[l] * Vj[l];
            d += c[l] * Wj[l] + e[l] * Vj[l]; /* D_j                   */
        }
        col[j] = d;
        double inverse = d > UD_PIVOT_MIN ? 1 / d : 0;
        UD_UNROLL
        for (int i = 0; i < j; i++) {
            double *Wi = W + i * n, *Vi = V + i * n, u = 0;
            for (int l = 0; l < j && !is_upper; l++)
                u += Wi[l] * c[l];
            UD_UNROLL
            for (int l = j; l < n; l++)
                u += Wi[l] * c[l] + Vi[l] * e[l];
            u *= inverse; /* U_ij                  */
            col[i] = u;
            for (int l = 0; l < j && !is_upper; l++)
                Wi[l] -= u * Wj[l];
            UD_UNROLL
            for (int l = j; l < n; l++) {
                Wi[l] -= u * Wj[l];
                Vi[l] -= u * Vj[l];
            }
        }
    }
}

#endif
