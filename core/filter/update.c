/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/kf.h"

#include <string.h>

#include "core/filter/diffuse.h"
#include "core/math/real.h"
#include "core/math/ud_body.h"

enum { ITERATIONS_MAX = 5, HALVINGS_MAX = 6 };

struct sight {
    const struct reads *reads;
    const double *z, *r;
};

/* One pass over the components, linearised at w->x (which stays), from the
 * prior in *f.  y_i = z_i - h_i(x_lin) - H_i (x - x_lin). */
static void pass(struct kf_work *w, struct kf *f, const struct sight *s,
                 struct kf_seen *seen)
{
    int n = f->n;
    double g[UD_MAX], *x = kf_x(f), *h = w->H;
    seen->dof = seen->n_determined = 0;
    seen->nis = 0;
    for (int i = 0; i < s->reads->m; i++) {
        seen->y[i] = real_nan();
        if (s->z[i] != s->z[i])
            continue;
        double at = reads_row_at(s->reads, i, n, w->x, h);
        double y = reads_difference(s->reads, i, s->z[i], at);
        seen->y[i] = y;
        for (int k = 0; k < n; k++)
            y -= h[k] * (x[k] - w->x[k]);
        int p = f->n_free > 0 ? diffuse_pivot(f, h, g) : -1;
        if (p >= 0) {
            diffuse_determine(w, f, h, y, s->r[i], p, g);
            seen->n_determined++;
            continue;
        }
        double S = ud_update(n, kf_ud(f), h, s->r[i], w->b);
        if (!(S > 0))
            continue;
        double gain = y / S;
        for (int k = 0; k < n; k++)
            x[k] += w->b[k] * gain; /* x = x + K y       */
        seen->nis += y * gain;      /* y' S^-1 y         */
        seen->s[seen->dof++] = S;
    }
}

static void restore(struct kf_work *w, struct kf *f)
{
    size_t n = (size_t)f->n;
    memcpy(kf_x(f), w->start, n * sizeof(double));
    memcpy(kf_ud(f), w->ud, UD_SIZE(n) * sizeof(double));
}

/* 1/2 (x - x0)' P0^-1 (x - x0) + 1/2 sum (z - h(x))^2 / r, the cost whose
 * minimum is the most probable state. */
static double cost(struct kf_work *w, int n, const struct sight *s,
                   const double *x)
{
    double d[UD_MAX];
    for (int k = 0; k < n; k++)
        d[k] = x[k] - w->start[k];
    double sum = ud_distance(n, w->ud, d, w->b);
    for (int i = 0; i < s->reads->m; i++) {
        if (s->z[i] != s->z[i])
            continue;
        double h = reads_row_at(s->reads, i, n, x, w->H);
        double y = reads_difference(s->reads, i, s->z[i], h);
        sum += y * y / s->r[i];
    }
    return sum / 2;
}

/* Gauss-Newton from the prior kept in w->start and w->ud [BC93]: every step
 * is one pass linearised at the newest place, halved while the cost rises.
 * The last pass takes H at the result, so P belongs to where x is. */
static void iterate(struct kf_work *w, struct kf *f, const struct sight *s)
{
    int n = f->n;
    double *x = kf_x(f), step[UD_MAX];
    double was = cost(w, n, s, w->x);
    struct kf_seen seen;
    for (int i = 0; i < ITERATIONS_MAX; i++) {
        for (int k = 0; k < n; k++)
            step[k] = x[k] - w->x[k];
        double now = cost(w, n, s, x);
        for (int half = 0; half < HALVINGS_MAX && !(now <= was); half++) {
            for (int k = 0; k < n; k++) {
                step[k] /= 2;
                x[k] = w->x[k] + step[k];
            }
            now = cost(w, n, s, x);
        }
        if (!(now <= was))
            break;
        bool is_settled = was - now <= 1e-12 * (1 + now);
        was = now;
        memcpy(w->x, x, (size_t)n * sizeof *x);
        restore(w, f);
        pass(w, f, s, &seen);
        if (is_settled)
            break;
    }
    memcpy(x, w->x, (size_t)n * sizeof *x);
}

/* h x of a sum of states; fills h. */
UNROLLED double combine(const int n, const struct reads_row *row,
                        const double *x, double *h)
{
    double sum = 0;
    for (int k = 0; k < n; k++)
        h[k] = 0;
    for (int k = 0; k < row->n_terms; k++) {
        h[row->term[k].state] += row->term[k].value;
        sum += row->term[k].value * x[row->term[k].state];
    }
    return sum;
}

/* The everyday case: linear reads, nothing undetermined.  Components go in one
 * after the other; their joint NIS decides, then all or nothing stays. */
UNROLLED bool linear(const int n, struct kf *f, const struct sight *s,
                     const double *gate, double *was, struct kf_seen *seen)
{
    double h[UD_MAX], F[UD_MAX], V[UD_MAX], b[UD_MAX];
    double *x = f->v, *ud = f->v + n;
    int m = s->reads->m;
    bool may_undo = gate && m > 1;
    if (may_undo)
        memcpy(was, x, (size_t)(n + UD_SIZE(n)) * sizeof *x);
    double nis = 0;
    int dof = 0;
    for (int i = 0; i < m; i++) {
        const struct reads_row *row = &s->reads->row[i];
        double y = s->z[i], S;
        if (y != y) {
            seen->y[i] = y;
            continue;
        }
        if (row->n_terms == 1) {
            int at = row->term[0].state;
            double value = row->term[0].value;
            y -= value * x[at];
            S = ud_look_one(n, ud, at, value, s->r[i], F, V);
        } else {
            y -= combine(n, row, x, h);
            S = ud_look(n, ud, h, s->r[i], F, V);
        }
        seen->y[i] = y; /* y = z - H x       */
        if (!(S > 0))
            continue;
        double over = 1 / S, gain = y * over;
        nis += y * gain; /* y' S^-1 y         */
        seen->s[dof++] = S;
        if (gate && m == 1 && !(nis <= gate[1]))
            break;
        ud_correct(n, ud, F, V, s->r[i], over, b);
        for (int k = 0; k < n; k++)
            x[k] += b[k] * gain; /* x = x + K y       */
    }
    seen->n_determined = 0;
    seen->dof = dof;
    seen->nis = nis;
    if (!gate || dof == 0 || nis <= gate[dof])
        return true;
    if (may_undo)
        memcpy(x, was, (size_t)(n + UD_SIZE(n)) * sizeof *x);
    return false;
}

bool kf_update(const struct rig_kind *kind, struct kf_work *w, struct kf *f,
               const struct reads *reads, const double *z, const double *r,
               const double *gate, struct kf_seen *seen)
{
    size_t n = (size_t)kind->n;
    int n_free = f->n_free;
    bool is_linear = reads_is_linear(reads);
    struct sight sight = {reads, z, r};
    bool is_used = false;
    if (is_linear && n_free == 0) {
#define CALL(n) is_used = linear(n, f, &sight, gate, w->W, seen)
        UD_FOR_N(kind->n, CALL)
#undef CALL
        return is_used;
    }

    memcpy(w->start, kf_x(f), n * sizeof(double));
    memcpy(w->x, kf_x(f), n * sizeof(double));
    memcpy(w->ud, kf_ud(f), UD_SIZE(n) * sizeof(double));
    if (n_free > 0)
        memcpy(w->B, kf_B(f), n * (size_t)n_free * sizeof(double));

    pass(w, f, &sight, seen);
    if (gate && seen->dof > 0 && !(seen->nis <= gate[seen->dof])) {
        restore(w, f);
        f->n_free = n_free;
        if (n_free > 0)
            memcpy(kf_B(f), w->B, n * (size_t)n_free * sizeof(double));
        return false;
    }
    if (reads_iterates(reads) && n_free == 0)
        iterate(w, f, &sight);
    return true;
}
