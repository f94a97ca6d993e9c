/* bed.h - a filter alone, for tests that lay measurements by hand. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_CHECKS_BED_H
#define TESTS_CHECKS_BED_H

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "core/filter/joined.h"

struct bed {
    struct rig_kind kind;
    struct kf_work work;
    struct kf *f;
    void *joined;
    struct kf_seen seen; /* by the last bed_see                           */
    double loglik, nis;  /* sums over everything seen                     */
    int n_judged;        /* components that took part in them             */
};

static inline struct bed *bed_new(void)
{
    struct bed *b = calloc(1, sizeof *b);
    ck_assert_ptr_nonnull(b);
    return b;
}

static inline void bed_free(struct bed *b)
{
    free(b->f);
    free(b->joined);
    free(b);
}

/* Appends a block; its states have no prior until bed_prior gives one. */
static inline struct block *bed_block(struct bed *b, enum block_model model,
                                      double q)
{
    struct block *k = &b->kind.block[b->kind.n_blocks++];
    k->model = model;
    k->at = b->kind.n;
    k->n = block_states(model);
    k->q = q;
    for (int i = 0; i < k->n; i++)
        b->kind.state[k->at + i].is_constant = model == BLOCK_CONSTANT;
    b->kind.n += k->n;
    return k;
}

static inline void bed_prior(struct bed *b, int state, double mean, double var)
{
    b->kind.state[state].has_prior = true;
    b->kind.state[state].prior_mean = mean;
    b->kind.state[state].prior_u = sqrt(var);
}

static inline void bed_start(struct bed *b, int64_t t_ns)
{
    b->f = calloc(1, kf_bytes(&b->kind));
    ck_assert_ptr_nonnull(b->f);
    rig_prepare_kind(&b->kind);
    if (b->kind.n_components > 0) {
        b->joined = calloc(1, joined_bytes(b->kind.n));
        b->work.joined = joined_init(b->joined, b->kind.n);
    }
    kf_birth(&b->kind, t_ns, b->f);
}

/* Puts the state at x with covariance P, n x n. */
static inline void bed_set(struct bed *b, const double *x, const double *P)
{
    int n = b->kind.n;
    memcpy(kf_x(b->f), x, (size_t)n * sizeof *x);
    ck_assert_int_eq(ud_factor(n, P, kf_ud(b->f)), ST_OK);
    b->f->n_free = 0;
}

static inline void bed_move(struct bed *b, int64_t t_ns)
{
    kf_predict(&b->kind, &b->work, b->f, t_ns, b->f);
}

/* Moves to t and lays z = H x + v, H m x n by rows, v of variances r. */
static inline void bed_see(struct bed *b, int64_t t_ns, int m, const double *H,
                           const double *z, const double *r)
{
    struct reads reads = {.m = m};
    for (int i = 0; i < m; i++) {
        struct reads_row *row = &reads.row[i];
        row->kind = READS_LINEAR;
        for (int k = 0; k < b->kind.n; k++)
            if (H[i * b->kind.n + k] != 0)
                row->term[row->n_terms++] =
                    (struct reads_term){k, H[i * b->kind.n + k]};
    }
    bed_move(b, t_ns);
    ck_assert(
        kf_update(&b->kind, &b->work, b->f, &reads, z, r, NULL, &b->seen));
    b->loglik += kf_loglik(&b->seen);
    b->nis += b->seen.nis;
    b->n_judged += b->seen.dof;
}

/* P of the whole state; returns x. */
static inline const double *bed_state(const struct bed *b, double *P)
{
    ud_covariance(b->kind.n, b->f->v + b->kind.n, P);
    return b->f->v;
}

#endif
