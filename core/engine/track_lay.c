/* Laying, settling and what becomes of a track when the line jumps. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/track.h"

#include <stddef.h>

/* --- laying ----------------------------------------------------------------
 */

/* The newest checkpoint before step i, and the step after it. */
static const struct track_state *ground(const struct track *t, int i, int *from)
{
    for (int k = i - 1; k >= 0; k--) {
        const struct step *s = track_step(t, k);
        if (s->state >= 0) {
            *from = k + 1;
            return track_checkpoint(t, s);
        }
    }
    *from = 0;
    return t->base;
}

static void take_time(struct track *t, const struct track_state *from,
                      struct track_state *to, const struct lay *lay,
                      struct step *s)
{
    const struct rig_kind *kind = t->kind;
    bool is_reborn = from->is_born && !from->is_floating &&
                     track_is_over(t, s->t_ns - from->kf.t_ns);
    if (!from->is_born || is_reborn) {
        memset(to, 0, sizeof *to);
        to->is_born = 1;
        int64_t t_ns = kind->has_start_at && kind->start_at_ns < s->t_ns
                           ? kind->start_at_ns
                           : s->t_ns;
        kf_birth(kind, t_ns, &to->kf);
        kf_predict(kind, lay->work, &to->kf, s->t_ns, &to->kf);
        s->flags |= STEP_BIRTH;
    } else if (from->is_floating) {
        if (to != from)
            memcpy(to, from, t->state_bytes);
        to->is_floating = 0;
        to->kf.t_ns = s->t_ns;
    } else {
        size_t head = offsetof(struct track_state, kf);
        if (to != from)
            memcpy(to, from, head);
        to->is_born = 1;
        to->is_floating = 0;
        kf_predict(kind, lay->work, &from->kf, s->t_ns, &to->kf);
    }
}

static bool can_restart(const struct rig *rig, const struct rig_kind *kind)
{
    for (int i = 0; i < rig->n_sensors; i++)
        if (&rig->kind[rig->sensor[i].kind] == kind &&
            !reads_is_linear(&rig->sensor[i].reads))
            return false;
    return true;
}

static int count_bits(uint64_t bits)
{
    int n = 0;
    for (; bits != 0; bits &= bits - 1)
        n++;
    return n;
}

/* Which sensors were heard, and which were refused when last heard.  True
 * while most refuse. */
static bool vote(struct track_state *st, int sensor, bool is_used)
{
    uint64_t bit = sensor < 64 ? (uint64_t)1 << sensor : 0;
    st->heard |= bit;
    st->refusing = is_used ? st->refusing & ~bit : st->refusing | bit;
    return st->refusing != 0 &&
           2 * count_bits(st->refusing) > count_bits(st->heard);
}

static uint16_t count_up(uint16_t *n)
{
    if (*n < UINT16_MAX)
        ++*n;
    return *n;
}

/* For long enough, and often enough? */
static bool is_due(uint16_t n, int64_t since_ns, const struct rig_kind *kind,
                   int64_t t_ns)
{
    return n >= kind->recover_refused &&
           t_ns - since_ns >= kind->recover_for_ns;
}

/* All that was heard lately was refused, or most sensors refuse: the track,
 * not the sensors, must be wrong.  Returns true when it was widened or
 * restarted. */
static bool recover(struct track *t, const struct lay *lay,
                    struct track_state *st, struct step *s)
{
    const struct rig_kind *kind = t->kind;
    count_up(&st->refused);
    if (count_up(&st->waited) == 1)
        st->refused_since_ns = s->t_ns;
    if (!vote(st, lay->local[s->sensor], false))
        st->outvoted = 0;
    else if (count_up(&st->outvoted) == 1)
        st->outvoted_since_ns = s->t_ns;
    if (!is_due(st->waited, st->refused_since_ns, kind, s->t_ns) &&
        !is_due(st->outvoted, st->outvoted_since_ns, kind, s->t_ns))
        return false;
    st->waited = st->outvoted = 0;
    st->refusing = 0;
    if (st->widened >= TRACK_RESTART_AFTER && can_restart(lay->rig, kind)) {
        kf_restart(kind, lay->work, &st->kf);
        st->widened = 0;
        s->flags |= STEP_RESTARTED;
    } else {
        kf_widen(kind, lay->work, &st->kf);
        st->widened = st->widened < 255 ? (uint8_t)(st->widened + 1) : 255;
        s->flags |= STEP_WIDENED;
    }
    return true;
}

/* Variances where u is relative to what is read, as it is predicted; what is
 * not determined yet is read from z itself. */
static const double *variances(const struct rig_sensor *sensor,
                               const struct kf *kf, const double *z,
                               struct kf_work *work, double *r)
{
    if (!sensor->has_relative)
        return sensor->r;
    for (int i = 0; i < sensor->reads.m; i++) {
        double h = kf->n_free > 0
                       ? z[i]
                       : reads_row_at(&sensor->reads, i, kf->n, kf->v, work->H);
        double u = sensor->relative[i] * (h - sensor->shift[i]);
        r[i] = sensor->r[i] + u * u; /* r = fixed^2 + (relative h)^2 */
    }
    return r;
}

static void lay_step(struct track *t, const struct lay *lay,
                     const struct track_state *from, struct track_state *to,
                     struct step *s)
{
    const struct rig_sensor *sensor = &lay->rig->sensor[s->sensor];
    const double *gate = sensor->has_gate ? sensor->gate : NULL;
    double z[READS_MAX], own_r[READS_MAX];
    struct kf_seen seen;
    s->flags = 0;
    for (int i = 0; i < sensor->reads.m; i++)
        z[i] = s->v[i] * sensor->scale[i] + sensor->shift[i];
    take_time(t, from, to, lay, s);
    const double *r = variances(sensor, &to->kf, z, lay->work, own_r);
    bool is_used = kf_update(t->kind, lay->work, &to->kf, &sensor->reads, z, r,
                             gate, &seen);
    s->nis = s->nis_used = seen.nis;
    s->dof = (uint8_t)seen.dof;
    if (!is_used && recover(t, lay, to, s)) {
        is_used = kf_update(t->kind, lay->work, &to->kf, &sensor->reads, z, r,
                            gate, &seen);
        s->nis_used = seen.nis;
    }
    memcpy(s->v + t->m_max, seen.s, (size_t)seen.dof * sizeof(double));
    if (is_used) {
        s->flags |= STEP_ACCEPTED;
        to->refused = to->waited = 0;
        if (!vote(to, lay->local[s->sensor], true))
            to->outvoted = 0;
        if (!(s->flags & STEP_WIDENED))
            to->widened = 0;
    }
    s->refused = to->refused;
    ++*lay->steps;
}

int track_lay(struct track *t, const struct lay *lay, int64_t until_ns)
{
    if (t->n_laid >= t->n || track_step(t, t->n_laid)->t_ns > until_ns)
        return 0;
    int from = 0, n = 0;
    const struct track_state *tip = ground(t, t->n_laid, &from);
    int since = 0;
    /* Appending: the newest state is at hand and nothing is laid again. */
    if (from < t->n_laid && t->scratch_at == t->n_laid) {
        since = t->n_laid - from;
        from = t->n_laid;
        tip = t->scratch;
    }
    for (int i = from; i < t->n; i++) {
        struct step *s = track_step(t, i);
        if (s->t_ns > until_ns && i >= t->n_laid)
            break;
        bool is_checkpoint = ++since >= t->stride;
        if (!is_checkpoint)
            track_free_checkpoint(t, s);
        else if (s->state < 0)
            s->state = t->free_state[--t->n_free_states];
        struct track_state *to =
            is_checkpoint ? track_checkpoint(t, s) : t->scratch;
        lay_step(t, lay, tip, to, s);
        if (is_checkpoint)
            since = 0;
        tip = to;
        n++;
        if (i >= t->n_laid)
            t->n_laid = i + 1;
    }
    t->scratch_at = tip == t->scratch ? t->n_laid : -1;
    return n;
}

const struct track_state *track_tip(const struct track *t)
{
    if (t->n_laid == 0)
        return t->base->is_born && !t->base->is_floating ? t->base : NULL;
    const struct step *s = track_step(t, t->n_laid - 1);
    return s->state >= 0 ? track_checkpoint(t, s) : t->scratch;
}

/* --- settling --------------------------------------------------------------
 */

struct step *track_settle(struct track *t, const struct lay *lay,
                          const struct track_state **state)
{
    int i = t->n_settled;
    struct step *s = track_step(t, i);
    if (s->state >= 0) {
        *state = track_checkpoint(t, s);
    } else {
        int from;
        const struct track_state *tip = ground(t, i, &from);
        if (from < i)
            tip = t->final; /* as the settling before left it */
        lay_step(t, lay, tip, t->final, s);
        *state = t->final;
    }
    t->n_settled++;
    /* The newest settled checkpoint is ground enough. */
    int keep = t->n_settled - 1;
    while (keep > 0 && track_step(t, keep)->state < 0)
        keep--;
    for (; keep > 0; keep--) {
        track_drop_first(t);
        t->n_settled--;
        t->n_laid--;
    }
    return track_step(t, t->n_settled - 1);
}

void track_reanchor(struct track *t, const struct rig *rig,
                    struct kf_work *work)
{
    const struct track_state *tip = track_tip(t);
    if (!can_restart(rig, t->kind)) {
        memset(t->base, 0, t->state_bytes); /* only a start finds it again */
    } else if (tip) {
        memcpy(t->base, tip, t->state_bytes);
        for (int i = 0; i < t->kind->n; i++)
            work->b[i] = 10;
        ud_scale(t->kind->n, kf_ud(&t->base->kf), work->b);
        kf_restart(t->kind, work, &t->base->kf);
        t->base->is_floating = 1;
        t->base->refused = t->base->waited = 0;
        t->base->widened = 0;
    }
    while (t->n > 0)
        track_drop_first(t);
    t->n_settled = t->n_laid = 0;
    t->scratch_at = -1;
    t->has_greatest = false;
}
