/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/kf.h"

#include <string.h>

#include "core/filter/joined.h"
#include "core/math/ud_body.h"

/* A dt of zero moves nothing: only the place changes. */
static void copy(const struct kf *from, struct kf *to)
{
    size_t n = (size_t)from->n, n_free = (size_t)from->n_free;
    memcpy(to, from,
           sizeof *from + (n + UD_SIZE(n) + n * n_free) * sizeof(double));
}

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
    double D[UD_MAX], Qd[UD_MAX], x_new[UD_MAX];
    const double phi[3] = {1, T, T * T / 2};            /* Phi               */
    const double qu[3] = {1, T / 2, T * T * (1.0 / 6)}; /* Qu                */
    const double T2 = T * T;
    UD_UNROLL
    for (int i = 0; i < n; i++) {
        int level = i % levels, end = i - level + levels;
        double qT = kind->block[i / levels].q * T, x = 0;
        D[i] = ud[UD_AT(i, i)];
        Qd[i] = level == levels - 1   ? qT
                : level == levels - 2 ? qT * T2 * (1.0 / 12)
                                      : qT * T2 * T2 * (1.0 / 720);
        UD_UNROLL
        for (int c = i; c < end; c++)
            x += phi[c - i] * from->v[c]; /* x = Phi x         */
        x_new[i] = x;
        UD_UNROLL
        for (int j = i; j < n; j++) {
            double sum = j < end ? phi[j - i] : 0;
            UD_UNROLL
            for (int c = i; c < end && c < j; c++)
                sum += phi[c - i] * ud[UD_AT(c, j)];
            W[i * n + j] = sum; /* W = Phi U         */
            V[i * n + j] = j < end ? qu[j - i] : 0;
        }
    }
    UD_UNROLL
    for (int i = 0; i < n; i++) /* only now: *to may be *from */
        to->v[i] = x_new[i];
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
UNROLLED void spread(const int n, const struct rig_kind *kind, const double *ud,
                     const struct transition *t, double *W, double *V)
{
    for (int k = 0; k < kind->n_blocks; k++) {
        int at = kind->block[k].at, end = at + kind->block[k].n;
        for (int i = at; i < end; i++) {
            const double *Phi = t->Phi + i * n;
            for (int j = i; j < n; j++) {
                double sum = j < end ? Phi[j] : 0;
                for (int c = i; c < end && c < j; c++)
                    sum += Phi[c] * ud[UD_AT(c, j)];
                W[i * n + j] = sum; /* W = Phi U         */
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
                B[i] = sum; /* B = Phi B         */
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
    if (kind->n_components > 0) {
        joined_predict(kind, w, from, t_ns - from->t_ns, to);
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
