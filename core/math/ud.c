/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/ud.h"

#include <math.h>
#include <string.h>

#include "core/math/real.h"

/* A body that is inlined with a constant n is unrolled by the compiler; one
 * that is called with a variable n is not.  Same operations, same order, same
 * bits: only the loop overhead goes. */
#define UNROLLED static inline __attribute__((always_inline))

/* Below this a pivot carries no information and its reciprocal would not be
 * finite. */
static const double pivot_min = 1e-290;

status ud_factor(int n, const double *P, double *ud)
{
    for (int j = 0; j < n; j++)
        for (int i = 0; i <= j; i++)
            ud[UD_AT(i, j)] = P[i * n + j];
    for (int j = n - 1; j >= 0; j--) {
        double *col = ud + UD_AT(0, j), d = col[j];
        if (!(d >= -1e-12 * real_abs(P[j * n + j])))
            return ST_NOTPD;
        if (d < pivot_min) {
            memset(col, 0, (size_t)(j + 1) * sizeof *col);
            continue;
        }
        for (int i = 0; i < j; i++) {
            double u = col[i] / d;
            for (int k = 0; k <= i; k++)
                ud[UD_AT(k, i)] -= u * col[k];
        }
        for (int i = 0; i < j; i++)
            col[i] /= d;
    }
    return ST_OK;
}

void ud_covariance(int n, const double *ud, double *P)
{
    for (int i = 0; i < n; i++) {
        for (int j = i; j < n; j++) {
            double sum = ud[UD_AT(j, j)];
            if (i != j)
                sum *= ud[UD_AT(i, j)];
            for (int k = j + 1; k < n; k++)
                sum += ud[UD_AT(i, k)] * ud[UD_AT(k, k)] * ud[UD_AT(j, k)];
            P[i * n + j] = sum;
            P[j * n + i] = sum;                  /* P = U D U'            */
        }
    }
}

double ud_variance(int n, const double *ud, int i)
{
    double sum = ud[UD_AT(i, i)];
    for (int k = i + 1; k < n; k++)
        sum += ud[UD_AT(i, k)] * ud[UD_AT(k, k)] * ud[UD_AT(i, k)];
    return sum;
}

UNROLLED double update_body(const int n, double *ud, const double *h, double r,
                            double *b)
{
    double alpha = r;
    double *col = ud;
    for (int j = 0; j < n; j++) {
        double f = h[j];
        for (int i = 0; i < j; i++)
            f += col[i] * h[i];                  /* f = U' h              */
        double v = col[j] * f;                   /* v = D f               */
        double was = alpha;
        alpha = was + f * v;
        if (alpha > 0)
            col[j] *= was / alpha;               /* D_j = D_j was / alpha */
        double lambda = was > 0 ? -f / was : 0;
        for (int i = 0; i < j; i++) {
            double u = col[i];
            col[i] = u + b[i] * lambda;
            b[i] += u * v;
        }
        b[j] = v;
        col += j + 1;
    }
    return alpha;                                /* S = h P h' + r        */
}

double ud_update(int n, double *ud, const double *h, double r, double *b)
{
    switch (n) {
    case 1:
        return update_body(1, ud, h, r, b);
    case 2:
        return update_body(2, ud, h, r, b);
    case 3:
        return update_body(3, ud, h, r, b);
    case 4:
        return update_body(4, ud, h, r, b);
    case 6:
        return update_body(6, ud, h, r, b);
    default:
        return update_body(n, ud, h, r, b);
    }
}

UNROLLED double variance_body(const int n, const double *ud, const double *h,
                              double r)
{
    double alpha = r;
    const double *col = ud;
    for (int j = 0; j < n; j++) {
        double f = h[j];
        for (int i = 0; i < j; i++)
            f += col[i] * h[i];
        alpha += f * (col[j] * f);               /* S = r + f' D f        */
        col += j + 1;
    }
    return alpha;
}

double ud_innovation_variance(int n, const double *ud, const double *h,
                              double r)
{
    switch (n) {
    case 1:
        return variance_body(1, ud, h, r);
    case 2:
        return variance_body(2, ud, h, r);
    case 3:
        return variance_body(3, ud, h, r);
    case 4:
        return variance_body(4, ud, h, r);
    case 6:
        return variance_body(6, ud, h, r);
    default:
        return variance_body(n, ud, h, r);
    }
}

void ud_gram_schmidt(int n, int k, double *W, const double *w, double *ud)
{
    for (int j = n - 1; j >= 0; j--) {
        double *Wj = W + j * k, *col = ud + UD_AT(0, j), d = 0;
        for (int l = 0; l < k; l++)
            d += Wj[l] * (w[l] * Wj[l]);         /* D_j = W_j w W_j'      */
        col[j] = d;
        double inverse = d > pivot_min ? 1 / d : 0;
        for (int i = 0; i < j; i++) {
            double *Wi = W + i * k, u = 0;
            for (int l = 0; l < k; l++)
                u += Wi[l] * (w[l] * Wj[l]);
            u *= inverse;                        /* U_ij = W_i w W_j' / D_j */
            col[i] = u;
            for (int l = 0; l < k; l++)
                Wi[l] -= u * Wj[l];
        }
    }
}

UNROLLED void predict_body(const int n, const bool is_upper, double *W,
                           double *V, const double *D, const double *Qd,
                           double *ud)
{
    double c[UD_MAX], e[UD_MAX];
    for (int j = n - 1; j >= 0; j--) {
        double *Wj = W + j * n, *Vj = V + j * n, *col = ud + UD_AT(0, j);
        double d = 0;
        for (int l = is_upper ? j : 0; l < n; l++) {
            c[l] = D[l] * Wj[l];
            e[l] = Qd[l] * Vj[l];
            d += c[l] * Wj[l];
            d += e[l] * Vj[l];
        }
        col[j] = d;
        double inverse = d > pivot_min ? 1 / d : 0;
        for (int i = 0; i < j; i++) {
            double *Wi = W + i * n, *Vi = V + i * n, u = 0;
            for (int l = is_upper ? j : 0; l < n; l++) {
                u += Wi[l] * c[l];
                u += Vi[l] * e[l];
            }
            u *= inverse;
            col[i] = u;
            for (int l = is_upper ? j : 0; l < n; l++) {
                Wi[l] -= u * Wj[l];
                Vi[l] -= u * Vj[l];
            }
        }
    }
}

void ud_predict(int n, bool is_upper, double *W, double *V, const double *D,
                const double *Qd, double *ud)
{
    if (!is_upper) {
        predict_body(n, false, W, V, D, Qd, ud);
        return;
    }
    switch (n) {
    case 1:
        predict_body(1, true, W, V, D, Qd, ud);
        break;
    case 2:
        predict_body(2, true, W, V, D, Qd, ud);
        break;
    case 3:
        predict_body(3, true, W, V, D, Qd, ud);
        break;
    case 4:
        predict_body(4, true, W, V, D, Qd, ud);
        break;
    case 6:
        predict_body(6, true, W, V, D, Qd, ud);
        break;
    default:
        predict_body(n, true, W, V, D, Qd, ud);
    }
}

double ud_distance(int n, const double *ud, const double *d, double *work)
{
    double sum = 0;
    for (int j = n - 1; j >= 0; j--) {
        double y = d[j];
        for (int k = j + 1; k < n; k++)
            y -= ud[UD_AT(j, k)] * work[k];      /* U y = d               */
        work[j] = y;
        double D = ud[UD_AT(j, j)];
        if (D > pivot_min)
            sum += y * y / D;                    /* y' D^-1 y             */
        else if (real_abs(y) > 1e-12 * real_abs(d[j]))
            return 1e300;
    }
    return sum;
}

void ud_scale(int n, double *ud, const double *s)
{
    for (int j = 0; j < n; j++) {
        double *col = ud + UD_AT(0, j);
        for (int i = 0; i < j; i++)
            col[i] *= s[i] / s[j];
        col[j] *= s[j] * s[j];
    }
}
