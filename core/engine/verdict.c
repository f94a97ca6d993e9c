/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/verdict.h"

static void because(struct judged *j, enum reason_code code, int subject)
{
    if (j->n_why < MESSAGE_REASONS_MAX)
        j->why[j->n_why++] = (struct reason){(uint8_t)code, (int16_t)subject};
}

/* States whose u is above the limit; the limits are good's or lost's. */
static int above(const struct rig_kind *kind, const struct kf *kf,
                 bool is_lost_limit, struct judged *j)
{
    int n = 0;
    const double *ud = kf->v + kf->n;
    for (int i = 0; kind->has_limits && i < kind->n; i++) {
        double limit =
            is_lost_limit ? kind->state[i].lost_u : kind->state[i].good_u;
        if (limit > 0 && ud_variance(kf->n, ud, i) > limit * limit) {
            because(j, REASON_U, i);
            n++;
        }
    }
    return n;
}

static enum verdict judge(const struct rig_kind *kind,
                          const struct verdict_input *in, struct judged *j)
{
    uint64_t undetermined = in->kf->n_free > 0 ? kf_undetermined(in->kf) : 0;
    for (int i = 0; undetermined && i < kind->n; i++)
        if (undetermined >> i & 1)
            because(j, REASON_UNDETERMINED, i);
    if (undetermined)
        return VERDICT_STARTING;

    int n_aside = 0, n_believed = 0;
    for (int i = 0; i < in->n_sensors; i++) {
        n_aside += in->is_aside[i];
        n_believed += !in->is_aside[i] && !in->is_silent[i];
    }
    if (above(kind, in->kf, true, j) > 0)
        return j->is_started ? VERDICT_LOST : VERDICT_STARTING;
    if (in->quiet_ns > kind->lost_after_ns)
        return VERDICT_LOST;
    int n_above = above(kind, in->kf, false, j);
    if (!j->is_started && n_above > 0)
        return VERDICT_STARTING;
    j->is_started = true;
    if (in->is_coasting)
        return VERDICT_COASTING;
    if (in->refused >= VERDICT_REFUSED)
        because(j, REASON_REFUSED, in->last_sensor);
    bool is_doubtful = n_above > 0 || in->refused >= VERDICT_REFUSED ||
                       (n_aside > 0 && n_aside >= n_believed);
    return is_doubtful ? VERDICT_DOUBTFUL : VERDICT_GOOD;
}

void verdict_judge(const struct rig_kind *kind, const struct verdict_input *in,
                   struct judged *j)
{
    j->n_why = 0;
    j->verdict = (uint8_t)judge(kind, in, j);
    for (int i = 0; i < in->n_sensors; i++)
        if (in->is_aside[i])
            because(j, REASON_SET_ASIDE, in->sensor[i]);
    for (int i = 0; i < in->n_sensors; i++)
        if (in->is_silent[i])
            because(j, REASON_SILENT, in->sensor[i]);
}

bool verdict_equal(const struct judged *a, const struct judged *b)
{
    if (a->verdict != b->verdict || a->n_why != b->n_why)
        return false;
    for (int i = 0; i < a->n_why; i++)
        if (a->why[i].code != b->why[i].code ||
            a->why[i].subject != b->why[i].subject)
            return false;
    return true;
}
