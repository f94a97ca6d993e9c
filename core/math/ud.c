/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/ud.h"

#include <math.h>
#include <string.h>

#include "core/math/real.h"
#include "core/math/ud_body.h"

status ud_factor(int n, const double *P, double *ud)
{
    for (int j = 0; j < n; j++)
        for (int i = 0; i <= j; i++)
            ud[UD_AT(i, j)] = P[i * n + j];
    for (int j = n - 1; j >= 0; j--) {
        double *col = ud + UD_AT(0, j), d = col[j];
        if (!(d >= -1e-12 * real_abs(P[j * n + j])))
            return ST_NOTPD;
        if (d < UD_PIVOT_MIN) {
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
            P[j * n + i] = sum; /* P = U D U'            */
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

double ud_update(int n, double *ud, const double *h, double r, double *b)
{
    double f[UD_MAX], v[UD_MAX];
    double S = ud_look(n, ud, h, r, f, v);
    if (S > 0)
        ud_correct(n, ud, f, v, r, 1 / S, b);
    return S;
}

double ud_innovation_variance(int n, const double *ud, const double *h,
                              double r)
{
    double f[UD_MAX], v[UD_MAX];
    return ud_look(n, ud, h, r, f, v);
}

void ud_gram_schmidt(int n, int k, double *W, const double *w, double *ud)
{
    for (int j = n - 1; j >= 0; j--) {
        double *Wj = W + j * k, *col = ud + UD_AT(0, j), d = 0;
        for (int l = 0; l < k; l++)
            d += Wj[l] * (w[l] * Wj[l]); /* D_j = W_j w W_j'      */
        col[j] = d;
        double inverse = d > UD_PIVOT_MIN ? 1 / d : 0;
        for (int i = 0; i < j; i++) {
            double *Wi = W + i * k, u = 0;
            for (int l = 0; l < k; l++)
                u += Wi[l] * (w[l] * Wj[l]);
            u *= inverse; /* U_ij = W_i w W_j' / D_j */
            col[i] = u;
            for (int l = 0; l < k; l++)
                Wi[l] -= u * Wj[l];
        }
    }
}

void ud_predict(int n, bool is_upper, double *W, double *V, const double *D,
                const double *Qd, double *ud)
{
    if (is_upper)
        ud_gather(n, true, W, V, D, Qd, ud);
    else
        ud_gather(n, false, W, V, D, Qd, ud);
}

double ud_distance(int n, const double *ud, const double *d, double *work)
{
    double sum = 0;
    for (int j = n - 1; j >= 0; j--) {
        double y = d[j];
        for (int k = j + 1; k < n; k++)
            y -= ud[UD_AT(j, k)] * work[k]; /* U y = d               */
        work[j] = y;
        double D = ud[UD_AT(j, j)];
        if (D > UD_PIVOT_MIN)
            sum += y * y / D; /* y' D^-1 y             */
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
