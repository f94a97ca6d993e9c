/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/track.h"

/* --- memory ----------------------------------------------------------------
 */

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
    t->used_ns = now_ns;
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
        t->watch[i] =
            (struct watch){.heard_ns = now_ns, .settled_t_ns = INT64_MIN};
}

/* --- the ring --------------------------------------------------------------
 */

static int32_t *entry(const struct track *t, int i)
{
    int at = t->head + i;
    return &t->order[at < t->capacity ? at : at - t->capacity];
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

void track_free_checkpoint(struct track *t, struct step *s)
{
    if (s->state >= 0)
        t->free_state[t->n_free_states++] = s->state;
    s->state = -1;
}

void track_drop_first(struct track *t)
{
    track_free_checkpoint(t, track_step(t, 0));
    t->free_slot[t->n_free_slots++] = *entry(t, 0);
    t->head = t->head + 1 < t->capacity ? t->head + 1 : 0;
    t->n--;
    if (t->scratch_at >= 0)
        t->scratch_at--;
}

void track_confirm(struct track *t)
{
    if (!t->kind->is_prefix || t->n_final > 0)
        return;
    t->is_confirmed =
        t->n >= 2 &&
        track_step(t, 1)->t_ns - track_step(t, 0)->t_ns <= TRACK_CANDIDATE_NS;
}

int track_next_settled(const struct track *t)
{
    int next = t->n_settled;
    if (t->kind->is_prefix && t->n_final == 0 && next == 0)
        next = 1;
    return next < t->n_laid ? next : -1;
}
