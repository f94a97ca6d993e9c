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
 *
 * Source of the closed forms: [BSLK01] ch. 6, checked by quadrature.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_BLOCK_H
#define CORE_MODEL_BLOCK_H

enum block_model {
    BLOCK_CONSTANT,
    BLOCK_RANDOM_WALK,
    BLOCK_GAUSS_MARKOV,
    BLOCK_CONSTANT_VELOCITY,
    BLOCK_CONSTANT_ACCELERATION
};

struct block {
    enum block_model model;
    int at;       /* first state of the block within its layout           */
    int n;        /* number of its states                                 */
    double q;     /* spectral density, unit as above                      */
    double tau_s; /* gauss-markov only: correlation time                  */
    double mean;  /* gauss-markov only: what it returns to, state unit    */
};

/* Transition over dt of a whole layout.  Matrices are n x n row-major with
 * row stride n; only entries inside a block are written or may be read. */
struct transition {
    int n;
    double *Phi; /* n x n                                                 */
    double *Qu;  /* n x n, unit upper triangular inside each block        */
    double *Qd;  /* n                                                     */
};

int block_states(enum block_model model);

/* Fills the block's part of *t for dt_s >= 0.  dt_s = 0 gives identity and
 * zero noise. */
void block_transition(const struct block *b, double dt_s, struct transition *t);

/* x of this block moved over dt; x points at the whole layout's states. */
void block_move(const struct block *b, const struct transition *t, double *x);

#endif
