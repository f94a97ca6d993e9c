/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/kf.h"

#include <math.h>
#include <string.h>

#include "core/math/real.h"
#include "core/math/ud_body.h"

/* A product whose terms cancel to below this share of their size is rounding,
 * not information. */
static const double cancelled = 1e-10;
enum { ITERATIONS_MAX = 5, HALVINGS_MAX = 6 };

size_t kf_bytes(const struct rig_kind *kind)
{
    size_t n = (size_t)kind->n;
    return sizeof(struct kf) + (n + UD_SIZE(n) + n * n) * sizeof(double);
}

static void copy(const struct kf *from, struct kf *to)
{
    size_t n = (size_t)from->n, n_free = (size_t)from->n_free;
    memcpy(to, from,
           sizeof *from + (n + UD_SIZE(n) + n * n_free) * sizeof(double));
}

void kf_birth(const struct rig_kind *kind, int64_t t_ns, struct kf *f)
{
    int n = kind->n;
    f->t_ns = t_ns;
    f->n = n;
    f->n_free = 0;
    memset(f->v, 0, kf_bytes(kind) - sizeof *f);
    for (int i = 0; i < n; i++) {
        const struct rig_state *s = &kind->state[i];
        if (s->has_prior) {
            kf_x(f)[i] = s->prior_mean;
            kf_ud(f)[UD_AT(i, i)] = s->prior_u * s->prior_u;
        } else {
            kf_B(f)[n * f->n_free++ + i] = 1;
        }
    }
}

/* --- predict ------------------------------------------------------------- */

/* Kinds that consist of axes of one kinematic model only are the everyday case:
 * with n and the states per axis known, everything below unrolls.
 *
 * The same transition as block.c's, laid out for constants: Phi's and Qu's
 * entries depend on how far right of the diagonal they stand. */
UNROLLED void predict_axes(const int n, const int levels,
                           const struct rig_kind *kind, double *W, double *V,
                           const struct kf *from, double T, struct kf *to)
{
    const double *ud = from->v + n;
    double D[UD_MAX], Qd[UD_MAX];
    const double phi[3] = {1, T, T * T / 2};         /* Phi               */
    const double qu[3] = {1, T / 2, T * T / 6};      /* Qu                */
    const double T2 = T * T;
    for (int i = 0; i < n; i++) {
        int level = i % levels, end = i - level + levels;
        double qT = kind->block[i / levels].q * T, x = 0;
        D[i] = ud[UD_AT(i, i)];
        Qd[i] = level == levels - 1   ? qT
                : level == levels - 2 ? qT * T2 / 12
                                      : qT * T2 * T2 / 720;
        for (int c = i; c < end; c++)
            x += phi[c - i] * from->v[c];            /* x = Phi x         */
        to->v[i] = x;
        for (int j = i; j < n; j++) {
            double sum = j < end ? phi[j - i] : 0;
            for (int c = i; c < end && c < j; c++)
                sum += phi[c - i] * ud[UD_AT(c, j)];
            W[i * n + j] = sum;                      /* W = Phi U         */
            V[i * n + j] = j < end ? qu[j - i] : 0;
        }
    }
    ud_gather(n, true, W, V, D, Qd, to->v + n);
}

/* One instance each; arrays of their own size stay in registers. */
#define INSTANCE(n, levels)                                                    \
    static void predict_##n##_##levels(const struct rig_kind *kind,            \
                                       const struct kf *from, double dt_s,     \
                                       struct kf *to)                          \
    {                                                                          \
        double W[(n) * (n)], V[(n) * (n)];                                     \
        predict_axes(n, levels, kind, W, V, from, dt_s, to);                   \
    }

INSTANCE(2, 2)
INSTANCE(4, 2)
INSTANCE(6, 2)
INSTANCE(3, 3)
INSTANCE(6, 3)
INSTANCE(9, 3)

/* False when there is no such instance. */
static inline bool predict_kinematic(const struct rig_kind *kind,
                              const struct kf *from, double dt_s,
                              struct kf *to)
{
    switch (kind->n * 10 + kind->levels) {
    case 22:
        predict_2_2(kind, from, dt_s, to);
        return true;
    case 42:
        predict_4_2(kind, from, dt_s, to);
        return true;
    case 62:
        predict_6_2(kind, from, dt_s, to);
        return true;
    case 33:
        predict_3_3(kind, from, dt_s, to);
        return true;
    case 63:
        predict_6_3(kind, from, dt_s, to);
        return true;
    case 93:
        predict_9_3(kind, from, dt_s, to);
        return true;
    default:
        return false;
    }
}

/* W = Phi U and V = Qu, both upper triangular; below the diagonal nothing is
 * written or read. */
UNROLLED void spread(const int n, const struct rig_kind *kind,
                     const double *ud, const struct transition *t, double *W,
                     double *V)
{
    for (int k = 0; k < kind->n_blocks; k++) {
        int at = kind->block[k].at, end = at + kind->block[k].n;
        for (int i = at; i < end; i++) {
            const double *Phi = t->Phi + i * n;
            for (int j = i; j < n; j++) {
                double sum = j < end ? Phi[j] : 0;
                for (int c = i; c < end && c < j; c++)
                    sum += Phi[c] * ud[UD_AT(c, j)];
                W[i * n + j] = sum;                  /* W = Phi U         */
                V[i * n + j] = j < end ? t->Qu[i * n + j] : 0;
            }
        }
    }
}

static void move_free(const struct rig_kind *kind, struct kf_work *w,
                      struct kf *f)
{
    int n = kind->n;
    for (int k = 0; k < f->n_free; k++) {
        double *B = kf_B(f) + n * k;
        for (int b = 0; b < kind->n_blocks; b++) {
            int at = kind->block[b].at, end = at + kind->block[b].n;
            for (int i = at; i < end; i++) {
                double sum = 0;
                for (int c = i; c < end; c++)
                    sum += w->Phi[i * n + c] * B[c];
                B[i] = sum;                          /* B = Phi B         */
            }
        }
    }
}

UNROLLED void predict(const int n, const struct rig_kind *kind,
                      struct kf_work *w, const struct kf *from,
                      const struct transition *t, struct kf *to)
{
    const double *ud = from->v + n;
    double D[UD_MAX];
    for (int i = 0; i < n; i++)
        D[i] = ud[UD_AT(i, i)];
    spread(n, kind, ud, t, w->W, w->W + n * n);
    for (int i = 0; i < n; i++)
        to->v[i] = from->v[i];
    for (int k = 0; k < kind->n_blocks; k++)
        block_move(&kind->block[k], t, to->v);
    ud_gather(n, true, w->W, w->W + n * n, D, t->Qd, to->v + n);
}

void kf_predict(const struct rig_kind *kind, struct kf_work *w,
                const struct kf *from, int64_t t_ns, struct kf *to)
{
    int n = kind->n;
    if (t_ns == from->t_ns) {
        if (to != from)
            copy(from, to);
        return;
    }
    struct transition t = {n, w->Phi, w->Qu, w->Qd};
    double dt_s = (double)(t_ns - from->t_ns) * 1e-9;
    if (from->n_free == 0 && predict_kinematic(kind, from, dt_s, to)) {
        to->n = n;
        to->n_free = 0;
        to->t_ns = t_ns;
        return;
    }
    for (int k = 0; k < kind->n_blocks; k++)
        block_transition(&kind->block[k], dt_s, &t);
    to->n = n;
    to->n_free = from->n_free;
    to->t_ns = t_ns;
    if (to != from && from->n_free > 0)
        memcpy(to->v + n + UD_SIZE(n), from->v + n + UD_SIZE(n),
               (size_t)(n * from->n_free) * sizeof(double));
#define CALL(n) predict(n, kind, w, from, &t, to)
    UD_FOR_N(n, CALL)
#undef CALL
    if (to->n_free > 0)
        move_free(kind, w, to);
}

/* --- what nothing has determined yet ------------------------------------- */

/* The column of B that h sees best, -1 if h sees none; g = h B. */
static int pivot(const struct kf *f, const double *B, const double *h,
                 double *g)
{
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
            bool is_rounding = real_abs(left) <=
                               1e-13 * (real_abs(was) + real_abs(part));
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
static void determine(struct kf_work *w, struct kf *f, const double *h,
                      double y, double r, int p, const double *g)
{
    int n = f->n, width = n + 1;
    double *x = kf_x(f), *ud = kf_ud(f), *K = w->b;
    for (int i = 0; i < n; i++)
        K[i] = kf_B(f)[n * p + i] / g[p];            /* K = b / (h b)     */
    for (int j = 0; j < n; j++) {
        double hU = h[j];
        for (int i = 0; i < j; i++)
            hU += h[i] * ud[UD_AT(i, j)];
        for (int i = 0; i < n; i++) {
            double U = i < j ? ud[UD_AT(i, j)] : i == j ? 1 : 0;
            w->W[i * width + j] = U - K[i] * hU;     /* (I - K h) U       */
        }
        w->w[j] = ud[UD_AT(j, j)];
    }
    for (int i = 0; i < n; i++) {
        w->W[i * width + n] = K[i];
        x[i] += K[i] * y;                            /* x = x + K y       */
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

/* --- update --------------------------------------------------------------- */

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
        int p = f->n_free > 0 ? pivot(f, kf_B(f), h, g) : -1;
        if (p >= 0) {
            determine(w, f, h, y, s->r[i], p, g);
            seen->n_determined++;
            continue;
        }
        double S = ud_update(n, kf_ud(f), h, s->r[i], w->b);
        if (!(S > 0))
            continue;
        double gain = y / S;
        for (int k = 0; k < n; k++)
            x[k] += w->b[k] * gain;                  /* x = x + K y       */
        seen->nis += y * gain;                       /* y' S^-1 y         */
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

double kf_loglik(const struct kf_seen *seen)
{
    double sum = seen->nis + seen->dof * REAL_LN_2PI;
    for (int i = 0; i < seen->dof; i++)
        sum += real_log(seen->s[i]);
    return -sum / 2;                                 /* log N(y; 0, S)    */
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
        seen->y[i] = y;                              /* y = z - H x       */
        if (!(S > 0))
            continue;
        double over = 1 / S, gain = y * over;
        nis += y * gain;                             /* y' S^-1 y         */
        seen->s[dof++] = S;
        if (gate && m == 1 && !(nis <= gate[1]))
            break;
        ud_correct(n, ud, F, V, s->r[i], over, b);
        for (int k = 0; k < n; k++)
            x[k] += b[k] * gain;                     /* x = x + K y       */
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
    double log_det =
        real_log(t->product) + (double)t->doublings * REAL_LN_2;
    return -(t->nis + (double)t->dof * REAL_LN_2PI + log_det) / 2;
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
    if (!is_linear && n_free == 0)
        iterate(w, f, &sight);
    return true;
}

/* --- recovery -------------------------------------------------------------- */

void kf_widen(const struct rig_kind *kind, struct kf_work *w, struct kf *f)
{
    for (int i = 0; i < kind->n; i++)
        w->b[i] = kind->state[i].is_constant ? 1 : 10;
    ud_scale(kind->n, kf_ud(f), w->b);               /* P x 100           */
}

static const struct block *block_of(const struct rig_kind *kind, int state)
{
    int k = 0;
    while (state >= kind->block[k].at + kind->block[k].n)
        k++;
    return &kind->block[k];
}

void kf_restart(const struct rig_kind *kind, struct kf_work *w, struct kf *f)
{
    int n = kind->n, n_kept = 0;
    double *P = w->W, *x = kf_x(f), *B = kf_B(f);
    ud_covariance(n, kf_ud(f), P);
    for (int k = 0; k < f->n_free; k++) {            /* constants not known */
        bool is_kept = false;
        for (int i = 0; i < n; i++) {
            w->B[n * n_kept + i] = kind->state[i].is_constant ? B[n * k + i] : 0;
            is_kept = is_kept || w->B[n * n_kept + i] != 0;
        }
        n_kept += is_kept;
    }
    for (int i = 0; i < n; i++) {
        const struct block *b = block_of(kind, i);
        if (kind->state[i].is_constant)
            continue;
        for (int j = 0; j < n; j++)
            P[i * n + j] = P[j * n + i] = 0;
        x[i] = 0;
        if (b->model == BLOCK_GAUSS_MARKOV) {
            x[i] = b->mean;
            P[i * n + i] = b->q * b->tau_s / 2;
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
