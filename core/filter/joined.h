/* joined.h - the time update of kinds whose blocks are coupled.
 *
 * Transitions of a general system cost far more than the step that uses them,
 * and a rig's time steps repeat: the newest few are kept by kind and dt.  What
 * is kept is what would be computed, so results do not depend on it.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_FILTER_JOINED_H
#define CORE_FILTER_JOINED_H

#include "core/filter/kf.h"

struct joined;

/* Bytes for kinds of at most n states; joined_init makes it of a block of
 * memory of that size, aligned for double. */
size_t joined_bytes(int n);
struct joined *joined_init(void *memory, int n);

/* As kf_predict for dt_ns > 0 and a kind with components. */
void joined_predict(const struct rig_kind *kind, struct kf_work *w,
                    const struct kf *from, int64_t dt_ns, struct kf *to);

#endif
