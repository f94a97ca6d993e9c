/* verdict.h - may this estimate be trusted now, and if not, why.
 *
 *   starting  not every state is determined, or u was never within good.u
 *   good      every u within good.u and something is heard
 *   coasting  nothing was used for longer than every sensor's silent_after:
 *             predicted
 *   doubtful  u above good.u, or all that is heard is refused, or as many
 *             sensors are set aside as are believed
 *   lost      u above lost.u, or nothing was used for longer than lost.after
 *
 * A silent sensor and one that is set aside are named beside any verdict.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_VERDICT_H
#define CORE_ENGINE_VERDICT_H

#include "core/engine/track.h"

/* Refusals in a row that make a verdict doubtful. */
enum { VERDICT_REFUSED = 3 };

struct verdict_input {
    const struct kf *kf;   /* the estimate, perhaps predicted to now    */
    const int16_t *sensor; /* the track's sensors, n_sensors            */
    const bool *is_silent; /* by local number                           */
    const bool *is_aside;  /* by local number                           */
    int n_sensors;
    bool is_coasting;    /* nothing comes that can be used            */
    int64_t quiet_ns;    /* since a measurement was used              */
    uint16_t refused;    /* in a row                                  */
    int16_t last_sensor; /* whose measurement was the last, -1 none   */
};

/* Judges; *j keeps is_started from call to call and gets verdict and why. */
void verdict_judge(const struct rig_kind *kind, const struct verdict_input *in,
                   struct judged *j);

/* Same verdict and same reasons. */
bool verdict_equal(const struct judged *a, const struct judged *b);

#endif
