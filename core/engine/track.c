/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/track.h"

/* --- memory ---------------------------------------------------------------- */

static size_t round8(size_t bytes)
{
    return (bytes + 7) / 8 * 8;
}

struct track_size track_size(const struct rig *rig, int kind)
{
    const struct rig_kind *k = &rig->kind[kind];
    struct track_size s = {0};
    s.stride = k->n <= TRACK_DENSE_STATES ? 1 : TRACK_STRIDE;
    for (int i = 0; i < rig->n_sensors; i++) {
        if (rig->sensor[i].kind != kind)
            continue;
        s.capacity += rig_pending_quota(rig, &rig->sensor[i]);
        s.n_watches++;
        if (rig->sensor[i].reads.m > s.m_max)
            s.m_max = rig->sensor[i].reads.m;
    }
    s.capacity += 2 * s.stride + 2; /* settled ones kept as ground */
    s.n_states = s.stride == 1 ? s.capacity : s.capacity / s.stride + 4;
    s.step_bytes = sizeof(struct step) + 2 * (size_t)s.m_max * sizeof(double);
    s.state_bytes =
        round8(sizeof(struct track_state) - sizeof(struct kf) + kf_bytes(k));
    return s;
}

void track_layout(struct track *t, const struct track_size *size,
                  struct arena *arena)
{
    size_t capacity = (size_t)size->capacity, states = (size_t)size->n_states;
    int32_t *order = arena_take(arena, capacity * sizeof *order);
    int32_t *free_slot = arena_take(arena, capacity * sizeof *free_slot);
    int32_t *free_state = arena_take(arena, states * sizeof *free_state);
    char *slots = arena_take(arena, capacity * size->step_bytes);
    char *checkpoints = arena_take(arena, states * size->state_bytes);
    void *base = arena_take(arena, size->state_bytes);
    void *scratch = arena_take(arena, size->state_bytes);
    void *final = arena_take(arena, size->state_bytes);
    void *watch =
        arena_take(arena, (size_t)size->n_watches * sizeof(struct watch));
    if (!t)
        return;
    t->order = order;
    t->free_slot = free_slot;
    t->free_state = free_state;
    t->slots = slots;
    t->states = checkpoints;
    t->base = base;
    t->scratch = scratch;
    t->final = final;
    t->watch = watch;
}

void track_open(struct track *t, const struct rig *rig, int kind,
                const char *id, size_t len, int64_t now_ns)
{
    struct track_size size = track_size(rig, kind);
    struct track was = *t;
    memset(t, 0, sizeof *t);
    memcpy(t->id, id, len);
    t->kind = &rig->kind[kind];
    t->kind_index = kind;
    t->place = was.place;
    t->sender = -1;
    t->is_used = true;
    t->is_confirmed = !t->kind->is_prefix;
    t->scratch_at = -1;
    kf_total_begin(&t->total);
    t->order = was.order;
    t->free_slot = was.free_slot;
    t->free_state = was.free_state;
    t->slots = was.slots;
    t->states = was.states;
    t->base = was.base;
    t->scratch = was.scratch;
    t->final = was.final;
    t->watch = was.watch;
    t->capacity = size.capacity;
    t->step_bytes = size.step_bytes;
    t->m_max = size.m_max;
    t->n_states = size.n_states;
    t->stride = size.stride;
    t->state_bytes = size.state_bytes;
    for (int i = 0; i < t->capacity; i++)
        t->free_slot[t->n_free_slots++] = t->capacity - 1 - i;
    for (int i = 0; i < t->n_states; i++)
        t->free_state[t->n_free_states++] = t->n_states - 1 - i;
    memset(t->base, 0, t->state_bytes);
    for (int i = 0; i < size.n_watches; i++)
        t->watch[i] = (struct watch){.heard_ns = now_ns,
                                     .settled_t_ns = INT64_MIN};
}

/* --- the ring -------------------------------------------------------------- */

static int32_t *entry(const struct track *t, int i)
{
    int at = t->head + i;
    return &t->order[at < t->capacity ? at : at - t->capacity];
}

static struct track_state *checkpoint(const struct track *t,
                                      const struct step *s)
{
    return (struct track_state *)(void *)(t->states +
                                          (size_t)s->state * t->state_bytes);
}

static uint64_t bits_of(double x)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    return bits;
}

/* Canonical order within a track. */
static int compare(const struct track *t, const struct step *a,
                   const struct step *b)
{
    if (a->t_ns != b->t_ns)
        return a->t_ns < b->t_ns ? -1 : 1;
    if (a->sensor != b->sensor)
        return a->sensor < b->sensor ? -1 : 1;
    if (a->has_seq != b->has_seq)
        return a->has_seq < b->has_seq ? -1 : 1;
    if (a->seq != b->seq)
        return a->seq < b->seq ? -1 : 1;
    for (int i = 0; i < t->m_max; i++) {
        uint64_t za = bits_of(a->v[i]), zb = bits_of(b->v[i]);
        if (za != zb)
            return za < zb ? -1 : 1;
    }
    return (a->u_mark > b->u_mark) - (a->u_mark < b->u_mark);
}

int track_find(const struct track *t, const struct step *s, bool *is_duplicate)
{
    int i = t->n; /* mostly at the end: look from there */
    *is_duplicate = false;
    while (i > 0) {
        int order = compare(t, s, track_step(t, i - 1));
        if (order > 0)
            break;
        i--;
        if (order == 0) {
            *is_duplicate = true;
            break;
        }
    }
    return i;
}

bool track_insert(struct track *t, int i, const struct step *s)
{
    if (t->n == t->capacity || t->n_free_slots == 0)
        return false;
    int32_t slot = t->free_slot[--t->n_free_slots];
    for (int k = t->n; k > i; k--)
        *entry(t, k) = *entry(t, k - 1);
    *entry(t, i) = slot;
    t->n++;
    if (t->n_laid > i) {
        t->n_laid = i;
        t->scratch_at = -1;
    }
    struct step *copy = track_step(t, i);
    memcpy(copy, s, t->step_bytes);
    copy->state = -1;
    return true;
}

static void free_checkpoint(struct track *t, struct step *s)
{
    if (s->state >= 0)
        t->free_state[t->n_free_states++] = s->state;
    s->state = -1;
}

/* Forgets the oldest step, whatever it is. */
static void pop(struct track *t)
{
    free_checkpoint(t, track_step(t, 0));
    t->free_slot[t->n_free_slots++] = *entry(t, 0);
    t->head = t->head + 1 < t->capacity ? t->head + 1 : 0;
    t->n--;
    if (t->scratch_at >= 0)
        t->scratch_at--;
}

void track_drop_first(struct track *t)
{
    pop(t);
}

void track_confirm(struct track *t)
{
    if (!t->is_confirmed && t->n >= 2 &&
        track_step(t, 1)->t_ns - track_step(t, 0)->t_ns <= TRACK_CANDIDATE_NS)
        t->is_confirmed = true;
}

int track_next_settled(const struct track *t)
{
    int next = t->n_settled;
    if (t->kind->is_prefix && t->n_final == 0 && next == 0)
        next = 1;
    return next < t->n_laid ? next : -1;
}

/* --- laying ---------------------------------------------------------------- */

/* The newest checkpoint before step i, and the step after it. */
static const struct track_state *ground(const struct track *t, int i,
                                        int *from)
{
    for (int k = i - 1; k >= 0; k--) {
        const struct step *s = track_step(t, k);
        if (s->state >= 0) {
            *from = k + 1;
            return checkpoint(t, s);
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
    bool is_reborn = kind->is_prefix && from->is_born &&
                     s->t_ns - from->kf.t_ns >
                         kind->lost_after_ns + TRACK_RETIRE_NS;
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
        to->refused_since_ns = from->refused_since_ns;
        to->refused = from->refused;
        to->widened = from->widened;
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

/* All that was heard lately was refused: the track, not the sensors, must be
 * wrong.  Returns true when it was widened or restarted. */
static bool recover(struct track *t, const struct lay *lay,
                    struct track_state *st, struct step *s)
{
    const struct rig_kind *kind = t->kind;
    if (st->refused++ == 0)
        st->refused_since_ns = s->t_ns;
    if (st->refused < kind->recover_refused ||
        s->t_ns - st->refused_since_ns < kind->recover_for_ns)
        return false;
    st->refused = 0;
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

static void lay_step(struct track *t, const struct lay *lay,
                     const struct track_state *from, struct track_state *to,
                     struct step *s)
{
    const struct rig_sensor *sensor = &lay->rig->sensor[s->sensor];
    const double *gate = sensor->has_gate ? sensor->gate : NULL;
    double z[READS_MAX];
    struct kf_seen seen;
    s->flags = 0;
    for (int i = 0; i < sensor->reads.m; i++)
        z[i] = s->v[i] * sensor->scale[i] + sensor->shift[i];
    take_time(t, from, to, lay, s);
    bool is_used = kf_update(t->kind, lay->work, &to->kf, &sensor->reads, z,
                             sensor->r, gate, &seen);
    s->nis = s->nis_used = seen.nis;
    s->dof = (uint8_t)seen.dof;
    if (!is_used && recover(t, lay, to, s)) {
        is_used = kf_update(t->kind, lay->work, &to->kf, &sensor->reads, z,
                            sensor->r, gate, &seen);
        s->nis_used = seen.nis;
    }
    memcpy(s->v + t->m_max, seen.s, (size_t)seen.dof * sizeof(double));
    if (is_used) {
        s->flags |= STEP_ACCEPTED;
        to->refused = 0;
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
            free_checkpoint(t, s);
        else if (s->state < 0)
            s->state = t->free_state[--t->n_free_states];
        struct track_state *to = is_checkpoint ? checkpoint(t, s) : t->scratch;
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
    return s->state >= 0 ? checkpoint(t, s) : t->scratch;
}

/* --- settling -------------------------------------------------------------- */

struct step *track_settle(struct track *t, const struct lay *lay,
                          const struct track_state **state)
{
    int i = t->n_settled;
    struct step *s = track_step(t, i);
    if (s->state >= 0) {
        *state = checkpoint(t, s);
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
        pop(t);
        t->n_settled--;
        t->n_laid--;
    }
    return track_step(t, t->n_settled - 1);
}

void track_reanchor(struct track *t, struct kf_work *work)
{
    const struct track_state *tip = track_tip(t);
    if (tip) {
        memcpy(t->base, tip, t->state_bytes);
        for (int i = 0; i < t->kind->n; i++)
            work->b[i] = 10;
        ud_scale(t->kind->n, kf_ud(&t->base->kf), work->b);
        kf_restart(t->kind, work, &t->base->kf);
        t->base->is_floating = 1;
        t->base->refused = 0;
        t->base->widened = 0;
    }
    while (t->n > 0)
        pop(t);
    t->n_settled = t->n_laid = 0;
    t->scratch_at = -1;
    t->has_greatest = false;
}
