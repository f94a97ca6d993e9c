/* ud.h - a covariance kept as factors, P = U diag(D) U'.
 *
 * U is unit upper triangular, D >= 0.  P cannot become asymmetric or
 * indefinite, and digits survive where P itself would lose all of them
 * (measured: wide priors, near-dependent measurements).
 *
 * Storage: one array of UD_SIZE(n) doubles, the upper triangle by columns;
 * element (i, j), i <= j, stands at j (j + 1) / 2 + i.  The diagonal holds D
 * (U's own diagonal is 1 and not stored).
 *
 * Sources: scalar update [BIE77] ch. V; time update by modified weighted
 * Gram-Schmidt [THO76].  Units: D_j carries the square of state j's unit,
 * U_ij the ratio of units i and j.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_UD_H
#define CORE_MATH_UD_H

#include <stdbool.h>

#include "core/math/status.h"

enum { UD_MAX = 48 };

#define UD_SIZE(n)  ((n) * ((n) + 1) / 2)
#define UD_AT(i, j) ((j) * ((j) + 1) / 2 + (i)) /* needs i <= j */

/* ud = factors of P, n x n row-major symmetric; only the upper triangle is
 * read.  A semidefinite P is fine (D_j = 0, column j of U = 0).  ST_NOTPD
 * when a pivot is below -1e-12 of its diagonal or not finite. */
status ud_factor(int n, const double *P, double *ud) MUST_USE;

/* P = U D U', n x n row-major, both triangles filled. */
void ud_covariance(int n, const double *ud, double *P);

/* P_ii alone: n - i products. */
double ud_variance(int n, const double *ud, int i);

/* One scalar measurement z = h x + v, v ~ N(0, r), r >= 0, h of n values.
 *
 * Given ud, fills b (n values) and returns S = h P h' + r; the gain is
 * K = b / S, so the caller adds b (y / S) to x.  ud becomes that of
 * (I - K h) P.  r = 0 with h P h' = 0 leaves ud as it is and returns 0: the
 * caller takes no step.  [BIE77] */
double ud_update(int n, double *ud, const double *h, double r, double *b);

/* S = h P h' + r alone, ud untouched. */
double ud_innovation_variance(int n, const double *ud, const double *h,
                              double r);

/* ud = factors of W diag(w) W' for the n x k row-major W, k <= 2 UD_MAX;
 * W is destroyed.  Rows that depend on later ones give D = 0. [THO76] */
void ud_gram_schmidt(int n, int k, double *W, const double *w, double *ud);

/* ud = factors of W diag(D) W' + V diag(Qd) V': the time update, with W = Phi U
 * and V diag(Qd) V' = Q, both n x n row-major and destroyed.  V is upper
 * triangular: nothing below its diagonal is read.  is_upper: W too, which
 * halves the work. [THO76] */
void ud_predict(int n, bool is_upper, double *W, double *V, const double *D,
                const double *Qd, double *ud);

/* d' P^-1 d; a direction that P says is certain (D = 0) counts as infinite
 * unless d has no part in it.  work: n values. */
double ud_distance(int n, const double *ud, const double *d, double *work);

/* P = S P S for S = diag(s), s_i > 0: U_ij = U_ij s_i / s_j, D_j = D_j s_j^2.
 * Exact but for rounding; used to widen a track. */
void ud_scale(int n, double *ud, const double *s);

#endif
