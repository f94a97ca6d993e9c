/* kf.h - the filter: predict over dt, update from one measurement.
 *
 *     x(t + dt) = m + Phi (x - m) + e,  e ~ N(0, Q)     Phi, Q: n x n
 *     z         = h(x) + v,             v ~ N(0, R)     H = dh/dx: m x n
 *
 * P is kept as UD factors.  States that nothing has determined yet are kept
 * exactly, not as a large variance: P stands for  P + kappa B B',  kappa ->
 * infinity, where the columns of B span what is still unknown [DK12] ch. 5.
 * A measurement component that meets B determines one direction and takes no
 * part in the likelihood, the NIS or the gate.
 *
 * No heap, no clock, no globals.  Distinct objects are independent.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_FILTER_KF_H
#define CORE_FILTER_KF_H

#include <stdint.h>

#include "core/model/reads.h"
#include "core/model/rig.h"

/* One filter state: this head, then x (n), ud (UD_SIZE(n)), B (n x n_free
 * columns, column-major; room for n_free_max columns). */
struct kf {
    int64_t t_ns;
    int32_t n, n_free; /* states; columns of B                            */
    double v[];
};

static inline double *kf_x(struct kf *f)
{
    return f->v;
}
static inline double *kf_ud(struct kf *f)
{
    return f->v + f->n;
}
static inline double *kf_B(struct kf *f)
{
    return f->v + f->n + UD_SIZE(f->n);
}

/* Bytes of a filter state of this kind. */
size_t kf_bytes(const struct rig_kind *kind);

/* Scratch that predict and update share; one per thread of work. */
struct kf_work {
    double Phi[UD_MAX * UD_MAX], Qu[UD_MAX * UD_MAX], Qd[UD_MAX];
    double W[2 * UD_MAX * UD_MAX], w[2 * UD_MAX];
    double H[READS_MAX * UD_MAX], b[UD_MAX], x[UD_MAX], start[UD_MAX];
    double ud[UD_SIZE(UD_MAX)];
    double B[UD_MAX * UD_MAX];
    struct joined *joined; /* joined.h; NULL if no kind has components     */
};

/* The state before any measurement: priors where the rig gives them, nothing
 * (B) elsewhere. */
void kf_birth(const struct rig_kind *kind, int64_t t_ns, struct kf *f);

/* Moves *from to t_ns >= from->t_ns, into *to (may be the same object). */
void kf_predict(const struct rig_kind *kind, struct kf_work *w,
                const struct kf *from, int64_t t_ns, struct kf *to);

/* What one update saw. */
struct kf_seen {
    int dof;             /* components that were judged: read, not diffuse  */
    int n_determined;    /* components used up by a start from data         */
    double nis;          /* y' S^-1 y at the prediction                     */
    double s[READS_MAX]; /* conditional innovation variances: |S| = product */
    double y[READS_MAX]; /* innovation of each component, given those before it
                            in the list; NaN if not read                   */
};

/* Corrects *f by z (m components in the unit of what they read, NaN = not
 * read) with variances r.  gate is the NIS limit for each number of degrees
 * of freedom (READS_MAX + 1 values), NULL = no gate.  Returns true when the
 * measurement was used; false when the gate refused it: *f is then
 * unchanged.  Range and bearing iterate: Gauss-Newton, at most 5 steps, a
 * step that raises the cost is halved. */
bool kf_update(const struct rig_kind *kind, struct kf_work *w, struct kf *f,
               const struct reads *reads, const double *z, const double *r,
               const double *gate, struct kf_seen *seen);

/* log N(y; 0, S) of the judged components. */
double kf_loglik(const struct kf_seen *seen);

/* Many of them summed: |S| is multiplied up and its logarithm taken once. */
struct kf_total {
    double nis, product; /* sum of NIS; |S| without its doublings          */
    int64_t doublings, dof;
};

void kf_total_begin(struct kf_total *t);
void kf_total_add(struct kf_total *t, int dof, double nis, const double *s);
double kf_total_loglik(const struct kf_total *t);

/* P x 100: rows and columns of states that are not constant, x 10. */
void kf_widen(const struct rig_kind *kind, struct kf_work *w, struct kf *f);

/* Nothing is known any more but the spread of stationary states; t stays. */
void kf_forget(const struct rig_kind *kind, struct kf *f);

/* Forgets all but the constant states; what has no prior starts from data. */
void kf_restart(const struct rig_kind *kind, struct kf_work *w, struct kf *f);

/* Bit i set: state i is still undetermined. */
uint64_t kf_undetermined(const struct kf *f);

#endif
