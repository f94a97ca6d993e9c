/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/kf.h"

#include <string.h>

#include "core/math/real.h"

size_t kf_bytes(const struct rig_kind *kind)
{
    size_t n = (size_t)kind->n;
    return sizeof(struct kf) + (n + UD_SIZE(n) + n * n) * sizeof(double);
}

static void empty(const struct rig_kind *kind, struct kf *f)
{
    f->n = kind->n;
    f->n_free = 0;
    memset(f->v, 0, kf_bytes(kind) - sizeof *f);
}

/* State i at mean and u, or not known at all. */
static void start(struct kf *f, int i, bool is_known, double mean, double u)
{
    if (is_known) {
        kf_x(f)[i] = mean;
        kf_ud(f)[UD_AT(i, i)] = u * u;
    } else {
        kf_B(f)[f->n * f->n_free++ + i] = 1;
    }
}

void kf_birth(const struct rig_kind *kind, int64_t t_ns, struct kf *f)
{
    empty(kind, f);
    f->t_ns = t_ns;
    for (int i = 0; i < kind->n; i++) {
        const struct rig_state *s = &kind->state[i];
        start(f, i, s->has_prior, s->prior_mean, s->prior_u);
    }
}

void kf_forget(const struct rig_kind *kind, struct kf *f)
{
    empty(kind, f);
    for (int i = 0; i < kind->n; i++) {
        const struct rig_state *s = &kind->state[i];
        start(f, i, s->is_stationary, s->stationary_mean, s->stationary_u);
    }
}

/* --- likelihood -------------------------------------------------------------
 */

double kf_loglik(const struct kf_seen *seen)
{
    double sum = seen->nis + seen->dof * REAL_LN_2PI;
    for (int i = 0; i < seen->dof; i++)
        sum += real_log(seen->s[i]);
    return -sum / 2; /* log N(y; 0, S)    */
}

void kf_total_begin(struct kf_total *t)
{
    *t = (struct kf_total){.product = 1};
}

/* Takes the power of two out of the product: exact. */
static void normalise(struct kf_total *t)
{
    uint64_t bits;
    memcpy(&bits, &t->product, sizeof bits);
    t->doublings += (int64_t)(bits >> 52) - 1023;
    bits = (bits & 0xfffffffffffff) | (uint64_t)1023 << 52;
    memcpy(&t->product, &bits, sizeof bits);
}

void kf_total_add(struct kf_total *t, int dof, double nis, const double *s)
{
    for (int i = 0; i < dof; i++) {
        t->product *= s[i];
        if (!(t->product > 1e-150 && t->product < 1e150))
            normalise(t);
    }
    t->nis += nis;
    t->dof += dof;
}

double kf_total_loglik(const struct kf_total *t)
{
    double log_det = real_log(t->product) + (double)t->doublings * REAL_LN_2;
    return -(t->nis + (double)t->dof * REAL_LN_2PI + log_det) / 2;
}

/* --- recovery --------------------------------------------------------------
 */

void kf_widen(const struct rig_kind *kind, struct kf_work *w, struct kf *f)
{
    for (int i = 0; i < kind->n; i++)
        w->b[i] = kind->state[i].is_constant ? 1 : 10;
    ud_scale(kind->n, kf_ud(f), w->b); /* P x 100           */
}

/* Columns that span the same; returns how many are left. */
static int independent(int n, double *B, int n_columns)
{
    int n_kept = 0;
    for (int c = 0; c < n_columns; c++) {
        double *b = B + n * n_kept, largest = 0;
        int row = 0;
        memmove(b, B + n * c, (size_t)n * sizeof *b);
        for (int i = 0; i < n; i++)
            if (real_abs(b[i]) > largest)
                largest = real_abs(b[row = i]);
        if (largest == 0)
            continue;
        n_kept++;
        for (int k = c + 1; k < n_columns; k++) {
            double share = B[n * k + row] / b[row];
            for (int i = 0; i < n; i++) {
                double was = B[n * k + i], part = b[i] * share;
                double left = was - part;
                bool is_rounding =
                    real_abs(left) <= 1e-12 * (real_abs(was) + real_abs(part));
                B[n * k + i] = is_rounding || i == row ? 0 : left;
            }
        }
    }
    return n_kept;
}

void kf_restart(const struct rig_kind *kind, struct kf_work *w, struct kf *f)
{
    int n = kind->n, n_kept = 0;
    double *P = w->W, *x = kf_x(f), *B = kf_B(f);
    ud_covariance(n, kf_ud(f), P);
    for (int k = 0; k < f->n_free; k++) { /* constants not known */
        bool is_kept = false;
        for (int i = 0; i < n; i++) {
            w->B[n * n_kept + i] =
                kind->state[i].is_constant ? B[n * k + i] : 0;
            is_kept = is_kept || w->B[n * n_kept + i] != 0;
        }
        n_kept += is_kept;
    }
    n_kept = independent(n, w->B, n_kept);
    for (int i = 0; i < n; i++) {
        const struct rig_state *s = &kind->state[i];
        if (kind->state[i].is_constant)
            continue;
        for (int j = 0; j < n; j++)
            P[i * n + j] = P[j * n + i] = 0;
        x[i] = s->is_stationary ? s->stationary_mean : 0;
        if (s->is_stationary) {
            P[i * n + i] = s->stationary_u * s->stationary_u;
        } else {
            memset(w->B + n * n_kept, 0, (size_t)n * sizeof(double));
            w->B[n * n_kept++ + i] = 1;
        }
    }
    f->n_free = n_kept;
    memcpy(B, w->B, (size_t)(n * n_kept) * sizeof(double));
    /* A principal part of a covariance is one: this cannot fail. */
    status st = ud_factor(n, P, kf_ud(f));
    (void)st;
}
