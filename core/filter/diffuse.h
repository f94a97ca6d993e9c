/* diffuse.h - states that nothing has determined yet, kept exactly.
 *
 * P stands for  P + kappa B B',  kappa -> infinity [DK12] ch. 5.  For
 * core/filter alone.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_FILTER_DIFFUSE_H
#define CORE_FILTER_DIFFUSE_H

#include "core/filter/kf.h"

/* The column of B that h sees best, -1 if h sees none; g = h B (n_free). */
int diffuse_pivot(const struct kf *f, const double *h, double *g);

/* The limit of an update with innovation y and variance r that meets column
 * p of B: one direction is determined, B loses that column. */
void diffuse_determine(struct kf_work *w, struct kf *f, const double *h,
                       double y, double r, int p, const double *g);

#endif
