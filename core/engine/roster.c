/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/roster.h"

static int n_fixed_kinds(const struct rig *rig)
{
    int n = 0;
    for (int i = 0; i < rig->n_kinds; i++)
        n += !rig->kind[i].is_prefix;
    return n;
}

static void widen(struct track_size *a, const struct track_size *b)
{
    if (b->capacity > a->capacity)
        a->capacity = b->capacity;
    if (b->n_states > a->n_states)
        a->n_states = b->n_states;
    if (b->n_watches > a->n_watches)
        a->n_watches = b->n_watches;
    if (b->step_bytes > a->step_bytes)
        a->step_bytes = b->step_bytes;
    if (b->state_bytes > a->state_bytes)
        a->state_bytes = b->state_bytes;
}

void roster_layout(struct roster *r, const struct rig *rig, struct arena *arena)
{
    int n_fixed = n_fixed_kinds(rig), place = 0;
    struct track_size any = {0};
    bool has_prefix = n_fixed < rig->n_kinds;
    int n = has_prefix && rig->max_tracks > n_fixed ? rig->max_tracks : n_fixed;
    struct track *track = arena_take(arena, (size_t)n * sizeof *track);
    int32_t *by_id = arena_take(arena, (size_t)n * sizeof *by_id);
    uint64_t *key = arena_take(arena, (size_t)n * sizeof *key);
    for (int i = 0; i < rig->n_kinds; i++) {
        struct track_size size = track_size(rig, i);
        if (rig->kind[i].is_prefix)
            widen(&any, &size);
        else
            track_layout(track ? &track[place++] : NULL, &size, arena);
    }
    for (int i = n_fixed; i < n; i++)
        track_layout(track ? &track[place++] : NULL, &any, arena);
    if (!track)
        return;
    r->rig = rig;
    r->n_places = n;
    r->n_fixed = n_fixed;
    r->track = track;
    r->by_id = by_id;
    r->key = key;
    for (int i = 0; i < n; i++)
        track[i].place = i;
}

/* Where an id stands or belongs in the index. */
static int search(const struct roster *r, const char *id, size_t len,
                  bool *is_there)
{
    int low = 0, high = r->n;
    uint64_t key = rig_key(id, len);
    *is_there = false;
    while (low < high) {
        int middle = (low + high) / 2;
        int order = key < r->key[middle] ? -1 : key > r->key[middle];
        if (order == 0)
            order = rig_compare(id, len, r->track[r->by_id[middle]].id);
        if (order == 0) {
            *is_there = true;
            return middle;
        }
        if (order < 0)
            high = middle;
        else
            low = middle + 1;
    }
    return low;
}

static struct track *open(struct roster *r, int place, int kind,
                          const struct text *id, int64_t now_ns)
{
    bool is_there;
    int at = search(r, id->at, (size_t)id->len, &is_there);
    memmove(r->by_id + at + 1, r->by_id + at,
            (size_t)(r->n - at) * sizeof *r->by_id);
    memmove(r->key + at + 1, r->key + at, (size_t)(r->n - at) * sizeof *r->key);
    r->by_id[at] = place;
    r->key[at] = rig_key(id->at, (size_t)id->len);
    r->n++;
    track_open(&r->track[place], r->rig, kind, id->at, (size_t)id->len, now_ns);
    return &r->track[place];
}

void roster_start(struct roster *r, int64_t now_ns)
{
    int place = 0;
    for (int i = 0; i < r->rig->n_kinds; i++) {
        const struct rig_kind *k = &r->rig->kind[i];
        if (!k->is_prefix)
            open(r, place++, i, &(struct text){k->id, (int)strlen(k->id)},
                 now_ns);
    }
}

struct track *roster_find(const struct roster *r, const char *id, size_t len)
{
    bool is_there;
    int at = search(r, id, len, &is_there);
    return is_there ? &r->track[r->by_id[at]] : NULL;
}

static struct roster_sender *sender_of(struct roster *r,
                                       const struct sender *from)
{
    for (int i = 0; i < r->n_senders; i++)
        if (r->sender[i].family == from->family &&
            memcmp(r->sender[i].address, from->address, 16) == 0)
            return &r->sender[i];
    if (r->n_senders == ROSTER_SENDERS_MAX)
        return NULL;
    struct roster_sender *s = &r->sender[r->n_senders++];
    memset(s, 0, sizeof *s);
    s->family = from->family;
    memcpy(s->address, from->address, 16);
    return s;
}

struct track *roster_add(struct roster *r, int kind, const struct text *id,
                         const struct sender *from, int64_t now_ns)
{
    struct roster_sender *s = sender_of(r, from);
    if (!s || r->n == r->n_places || s->n_ids >= r->rig->max_ids_per_sender)
        return NULL;
    for (int i = r->n_fixed; i < r->n_places; i++) {
        if (r->track[i].is_used)
            continue;
        s->n_ids++;
        struct track *t = open(r, i, kind, id, now_ns);
        t->sender = (int)(s - r->sender);
        return t;
    }
    return NULL;
}

void roster_remove(struct roster *r, struct track *t)
{
    bool is_there;
    int at = search(r, t->id, strlen(t->id), &is_there);
    memmove(r->by_id + at, r->by_id + at + 1,
            (size_t)(r->n - at - 1) * sizeof *r->by_id);
    memmove(r->key + at, r->key + at + 1,
            (size_t)(r->n - at - 1) * sizeof *r->key);
    r->n--;
    t->is_used = false;
    if (t->sender >= 0)
        r->sender[t->sender].n_ids--;
}
