/* block.h - state blocks: continuous-time models, exact in dt.
 *
 * A block is a linear time-invariant system  dx/dt = A (x - m) + G w,  w white
 * with spectral density q.  Over dt:
 *     x = m + Phi(dt) (x - m) + e,   e ~ N(0, Q(dt)),   Q = Qu diag(Qd) Qu'.
 * Q is additive over split steps, which a noise "per step" is not.
 *
 *   model                  states                    unit of q (state unit L)
 *   constant               name                      none, q = 0
 *   random-walk            name                      L^2/s
 *   gauss-markov           name  (tau, mean)         L^2/s; u^2 = q tau / 2
 *   constant-velocity      name, .rate               L^2/s^3
 *   constant-acceleration  name, .rate, .accel       L^2/s^5
 *   oscillator             name, .rate  (omega, zeta; mean)  L^2/s^3;
 *                          u^2 = q / (4 zeta omega^3)
 *   singer                 name, .rate, .accel  (tau) L^2/s^5;
 *                          u^2 of .accel = q tau / 2
 *   linear                 own names, A and noise, see rig.h
 *   lag                    follows what it is coupled to with time constant tau
 *
 * The first five have closed forms here.  The others, and whatever is coupled
 * to them, are discretised together (lti.h) from what block_system says.
 * Source of the closed forms: [BSLK01] ch. 6, checked by quadrature.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_BLOCK_H
#define CORE_MODEL_BLOCK_H

#include <stdbool.h>

enum block_model {
    BLOCK_CONSTANT,
    BLOCK_RANDOM_WALK,
    BLOCK_GAUSS_MARKOV,
    BLOCK_CONSTANT_VELOCITY,
    BLOCK_CONSTANT_ACCELERATION,
    BLOCK_OSCILLATOR,
    BLOCK_SINGER,
    BLOCK_LINEAR,
    BLOCK_LAG
};

struct block {
    enum block_model model;
    int at;       /* first state of the block within its layout           */
    int n;        /* number of its states                                 */
    double q;     /* spectral density, unit as above                      */
    double tau_s; /* gauss-markov, singer, lag: time constant             */
    double mean;  /* gauss-markov, oscillator: what it returns to         */
    double omega_rad_s,
        zeta;       /* oscillator: undamped frequency, damping ratio */
    int own;        /* linear: where its matrices begin in rig_kind.own     */
    bool is_joined; /* part of a component that lti.h discretises          */
};

/* Transition over dt of a whole layout.  Matrices are n x n row-major with
 * row stride n; only entries inside a block are written or may be read. */
struct transition {
    int n;
    double *Phi; /* n x n                                                 */
    double *Qu;  /* n x n, unit upper triangular inside each block        */
    double *Qd;  /* n                                                     */
};

/* States of a block of this model; 0 for linear, which says itself. */
int block_states(enum block_model model);

/* True for models that have no closed form here. */
bool block_is_general(enum block_model model);

/* True if state i of the block keeps a spread of its own in the long run:
 * then its mean and standard deviation. */
bool block_is_stationary(const struct block *b, int i, double *mean, double *u);

/* A, W = G q G' (both n x n row-major with row stride `stride`) and c of a lone
 * block, for all models but linear: dx/dt = A x + c + w. */
void block_system(const struct block *b, int stride, double *A, double *W,
                  double *c);

/* Fills the block's part of *t for dt_s >= 0.  dt_s = 0 gives identity and
 * zero noise. */
void block_transition(const struct block *b, double dt_s, struct transition *t);

/* x of this block moved over dt; x points at the whole layout's states. */
void block_move(const struct block *b, const struct transition *t, double *x);

#endif
