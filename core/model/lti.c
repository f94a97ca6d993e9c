/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/lti.h"

#include <string.h>

#include "core/math/real.h"

enum { TERMS = 24, DOUBLINGS_MAX = 120 };

/* Parts of the scratch. */
struct work {
    double *X, *M, *product, *term;
};

/* out = a b; out is neither. */
static void multiply(int n, const double *a, const double *b, double *out)
{
    memset(out, 0, (size_t)(n * n) * sizeof *out);
    for (int i = 0; i < n; i++)
        for (int k = 0; k < n; k++) {
            double left = a[i * n + k];
            for (int j = 0; j < n && left != 0; j++)
                out[i * n + j] += left * b[k * n + j];
        }
}

/* Q = Phi Q Phi' + Q, and Phi Q in `half`. */
static void spread(int n, const double *Phi, double *Q, double *half)
{
    multiply(n, Phi, Q, half);
    for (int i = 0; i < n; i++)
        for (int j = i; j < n; j++) {
            double sum = Q[i * n + j];
            for (int k = 0; k < n; k++)
                sum += half[i * n + k] * Phi[j * n + k];
            Q[i * n + j] = Q[j * n + i] = sum; /* Q = Phi Q Phi' + Q    */
        }
}

static int doublings(int n, const double *A, double T)
{
    double norm = 0;
    int s = 0;
    for (int i = 0; i < n; i++) {
        double row = 0;
        for (int j = 0; j < n; j++)
            row += real_abs(A[i * n + j]);
        norm = row > norm ? row : norm;
    }
    for (norm *= T; norm > 0.5 && s < DOUBLINGS_MAX; norm /= 2)
        s++;
    return s;
}

/* One term of each series: X = A X + (A X)', M = A M h/k, term = A term h/k. */
static void next_term(int n, const double *A, double h, int k,
                      const struct work *w)
{
    multiply(n, A, w->X, w->product);
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++)
            w->X[i * n + j] = w->product[i * n + j] + w->product[j * n + i];
    multiply(n, A, w->M, w->product);
    for (int i = 0; i < n * n; i++)
        w->M[i] = w->product[i] * (h / k);
    for (int i = 0; i < n; i++) {
        double sum = 0;
        for (int j = 0; j < n; j++)
            sum += A[i * n + j] * w->term[j];
        w->product[i] = sum * (h / (k + 1));
    }
    memcpy(w->term, w->product, (size_t)n * sizeof *w->term);
}

static void series(int n, const double *A, const double *W, const double *c,
                   double h, const struct work *w, double *Phi, double *Q,
                   double *shift)
{
    double factor = h;
    memcpy(w->X, W, (size_t)(n * n) * sizeof *W);
    memset(Q, 0, (size_t)(n * n) * sizeof *Q);
    memset(w->M, 0, (size_t)(n * n) * sizeof *Q);
    for (int i = 0; i < n; i++) {
        w->M[i * n + i] = 1;
        w->term[i] = shift[i] = c[i] * h;
    }
    memcpy(Phi, w->M, (size_t)(n * n) * sizeof *Phi);
    for (int k = 1; k <= TERMS; k++) {
        for (int i = 0; i < n * n; i++)
            Q[i] += w->X[i] * factor;
        factor *= h / (k + 1);
        next_term(n, A, h, k, w);
        for (int i = 0; i < n * n; i++)
            Phi[i] += w->M[i];
        for (int i = 0; i < n; i++)
            shift[i] += w->term[i];
    }
}

void lti_transition(int n, const double *A, const double *W, const double *c,
                    double T, double *scratch, double *Phi, double *Q,
                    double *shift)
{
    double *product = scratch + 2 * n * n;
    struct work w = {scratch, scratch + n * n, product, product + n * n};
    int s = doublings(n, A, T);
    double h = T;
    for (int i = 0; i < s; i++)
        h /= 2;
    series(n, A, W, c, h, &w, Phi, Q, shift);
    for (int k = 0; k < s; k++) {
        spread(n, Phi, Q, w.product);
        for (int i = 0; i < n; i++) {
            double sum = shift[i];
            for (int j = 0; j < n; j++)
                sum += Phi[i * n + j] * shift[j];
            w.term[i] = sum; /* shift = Phi shift + shift */
        }
        memcpy(shift, w.term, (size_t)n * sizeof *shift);
        multiply(n, Phi, Phi, w.product);
        memcpy(Phi, w.product, (size_t)(n * n) * sizeof *Phi);
    }
}
