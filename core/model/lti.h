/* lti.h - the exact transition of any linear time-invariant system.
 *
 *     dx/dt = A x + c + w,   E w w' = W delta(t - t')
 *     x(t + T) = Phi x(t) + shift + e,   e ~ N(0, Q)
 *
 * Taylor series over a step so short that ||A|| h <= 1/2, then doubling:
 * Q(2h) = Phi Q Phi' + Q.  Nothing in it grows that the system does not, which
 * the one-shot exponential of the doubled matrix [VL78] does, and nothing
 * cancels over short T, which the printed closed forms do.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_LTI_H
#define CORE_MODEL_LTI_H

#include <stddef.h>

/* Values of scratch that a transition of n states needs. */
#define LTI_SCRATCH(n) ((size_t)(3 * (n) * (n) + (n)))

/* Fills Phi (n x n), Q (n x n, symmetric) and shift (n) for T >= 0 from A and
 * the symmetric W, both n x n row-major, and c (n values).  T = 0 gives
 * identity and zeros.  A system that grows may overflow over a long T: entries
 * are then not finite. */
void lti_transition(int n, const double *A, const double *W, const double *c,
                    double T, double *scratch, double *Phi, double *Q,
                    double *shift);

#endif
