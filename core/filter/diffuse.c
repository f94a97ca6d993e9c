/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/diffuse.h"

#include <string.h>

#include "core/math/real.h"

/* A product whose terms cancel to below this share of their size is rounding,
 * not information. */
static const double cancelled = 1e-10;

int diffuse_pivot(const struct kf *f, const double *h, double *g)
{
    const double *B = f->v + f->n + UD_SIZE(f->n);
    int best = -1;
    double best_share = cancelled;
    for (int k = 0; k < f->n_free; k++) {
        double sum = 0, size = 0;
        for (int i = 0; i < f->n; i++) {
            double term = h[i] * B[f->n * k + i];
            sum += term;
            size += real_abs(term);
        }
        g[k] = sum;
        double share = size > 0 ? real_abs(sum) / size : 0;
        if (share > (best < 0 ? best_share : 2 * best_share)) {
            best = k;
            best_share = share;
        }
    }
    return best;
}

/* Takes column p out of B: the others lose their part in g. */
static void eliminate(struct kf *f, const double *g, int p)
{
    int n = f->n;
    double *B = kf_B(f), *last = B + n * (f->n_free - 1);
    for (int k = 0; k < f->n_free; k++) {
        double share = g[k] / g[p];
        for (int i = 0; i < n && k != p; i++) {
            double was = B[n * k + i], part = B[n * p + i] * share;
            double left = was - part;
            bool is_rounding =
                real_abs(left) <= 1e-13 * (real_abs(was) + real_abs(part));
            B[n * k + i] = is_rounding ? 0 : left;
        }
    }
    memmove(B + n * p, B + n * (p + 1),
            (size_t)(n * (f->n_free - 1 - p)) * sizeof *B);
    memset(last, 0, (size_t)n * sizeof *last);
    f->n_free--;
}

/* The limit kappa -> infinity of an update that meets B [DK12] ch. 5:
 *     K = b_p / (h b_p),  x = x + K y,
 *     P = (I - K h) P (I - K h)' + K r K'. */
void diffuse_determine(struct kf_work *w, struct kf *f, const double *h,
                       double y, double r, int p, const double *g)
{
    int n = f->n, width = n + 1;
    double *x = kf_x(f), *ud = kf_ud(f), *K = w->b;
    for (int i = 0; i < n; i++)
        K[i] = kf_B(f)[n * p + i] / g[p]; /* K = b / (h b)     */
    for (int j = 0; j < n; j++) {
        double hU = h[j];
        for (int i = 0; i < j; i++)
            hU += h[i] * ud[UD_AT(i, j)];
        for (int i = 0; i < n; i++) {
            double U = i < j ? ud[UD_AT(i, j)] : i == j ? 1 : 0;
            w->W[i * width + j] = U - K[i] * hU; /* (I - K h) U       */
        }
        w->w[j] = ud[UD_AT(j, j)];
    }
    for (int i = 0; i < n; i++) {
        w->W[i * width + n] = K[i];
        x[i] += K[i] * y; /* x = x + K y       */
    }
    w->w[n] = r;
    ud_gram_schmidt(n, width, w->W, w->w, ud);
    eliminate(f, g, p);
}

uint64_t kf_undetermined(const struct kf *f)
{
    const double *B = f->v + f->n + UD_SIZE(f->n);
    uint64_t bits = 0;
    for (int k = 0; k < f->n_free; k++)
        for (int i = 0; i < f->n; i++)
            if (B[f->n * k + i] != 0)
                bits |= (uint64_t)1 << i;
    return bits;
}
