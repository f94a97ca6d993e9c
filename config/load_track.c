/* Tracks: starts and limits. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <stdio.h>
#include <string.h>

#include "core/wire/decode.h"

int loading_state(const struct rig_kind *kind, const char *name)
{
    for (int i = 0; i < kind->n; i++)
        if (strcmp(kind->state[i].name, name) == 0)
            return i;
    return -1;
}

void loading_state_names(const struct rig_kind *kind,
                         const char *list[RIG_STATES_MAX + 1])
{
    for (int i = 0; i < kind->n; i++)
        list[i] = kind->state[i].name;
    list[kind->n] = NULL;
}

/* The state that a key names, or NULL and a report. */
static struct rig_state *named(struct loading *l, const cJSON *node,
                               struct rig_kind *kind)
{
    const char *list[RIG_STATES_MAX + 1];
    int i = loading_state(kind, node->string);
    if (i >= 0)
        return &kind->state[i];
    loading_state_names(kind, list);
    loading_unknown(l, node, true, "state", node->string, list);
    return NULL;
}

static void start(struct loading *l, const cJSON *object, struct rig_kind *kind)
{
    const cJSON *node;
    cJSON_ArrayForEach(node, object)
    {
        if (strcmp(node->string, "at") == 0) {
            const char *text = loading_text(node);
            kind->has_start_at =
                wire_parse_time(text, strlen(text), &kind->start_at_ns);
            if (!kind->has_start_at && cJSON_IsString(node))
                loading_error(l, node,
                              "\"%.64s\" is not a time; write it "
                              "like \"2026-05-04T10:00:00Z\"",
                              text);
            continue;
        }
        struct rig_state *s = named(l, node, kind);
        const cJSON *mean = loading_get(node, "mean");
        const cJSON *u = loading_get(node, "u");
        if (s == NULL || !cJSON_IsObject(node))
            continue;
        if (mean == NULL || u == NULL)
            loading_error_key(l, node,
                              "the start of \"%s\" needs \"mean\" "
                              "and \"u\"; give both",
                              s->name);
        else if (loading_quantity(l, mean, s->unit, QUANTITY_POINT,
                                  &s->prior_mean) &&
                 loading_size(l, u, s->unit, true, &s->prior_u))
            s->has_prior = true;
    }
}

/* good.u or lost.u. */
static bool spreads(struct loading *l, const cJSON *object,
                    struct rig_kind *kind, bool is_good)
{
    const cJSON *node;
    bool has_any = false;
    cJSON_ArrayForEach(node, loading_get(object, "u"))
    {
        struct rig_state *s = named(l, node, kind);
        if (s == NULL)
            continue;
        has_any = true;
        loading_size(l, node, s->unit, true, is_good ? &s->good_u : &s->lost_u);
    }
    return has_any;
}

/* The id, or the prefix before a '*'. */
static void identify(struct loading *l, const cJSON *node,
                     struct rig_kind *kind)
{
    size_t n = strlen(node->string);
    kind->is_prefix = n > 1 && node->string[n - 1] == '*';
    n -= kind->is_prefix;
    if (!wire_is_id(node->string, n))
        loading_error_key(l, node,
                          "\"%.64s\" cannot name a track; use "
                          "letters, digits and _ . : - (up to 63), \"raft-*\" "
                          "for a prefix",
                          node->string);
    snprintf(kind->id, sizeof kind->id, "%.*s", (int)(n < 63 ? n : 63),
             node->string);
}

static void add_track(struct loading *l, const cJSON *node,
                      struct rig_kind *kind)
{
    const cJSON *state = loading_get(node, "state"), *block;
    int n = l->problems->n;
    identify(l, node, kind);
    if (loading_get(node, "like") != NULL)
        return; /* reported: what it lacks is not known */
    if (state == NULL)
        loading_error_key(l, node,
                          "the track \"%.64s\" has no state; give "
                          "\"state\": [{\"model\": ..}]",
                          node->string);
    if (cJSON_IsObject(state))
        loading_block(l, state, kind);
    else
        cJSON_ArrayForEach(block, state)
        {
            if (cJSON_IsObject(block))
                loading_block(l, block, kind);
        }
    const cJSON *recover = loading_get(node, "recover");
    loading_time(l, loading_get(node, "lost"), "tracks.*.lost.after", 0,
                 &kind->lost_after_ns);
    loading_integer(l, recover, "tracks.*.recover.refused", 1, 65535,
                    &kind->recover_refused);
    loading_time(l, recover, "tracks.*.recover.for", 0, &kind->recover_for_ns);
    l->is_sound[kind - l->s->rig.kind] =
        kind->n_blocks > 0 && l->problems->n == n;
}

void loading_track_values(struct loading *l)
{
    const cJSON *node;
    struct rig_kind *kind = l->s->rig.kind;
    cJSON_ArrayForEach(node, loading_get(l->root, "tracks"))
    {
        if (!cJSON_IsObject(node) || kind == l->s->rig.kind + l->s->rig.n_kinds)
            continue;
        if (l->is_sound[kind - l->s->rig.kind]) {
            start(l, loading_get(node, "start"), kind);
            kind->has_good = spreads(l, loading_get(node, "good"), kind, true);
            spreads(l, loading_get(node, "lost"), kind, false);
        }
        kind++;
    }
}

void loading_tracks(struct loading *l)
{
    const cJSON *tracks = loading_get(l->root, "tracks"), *node;
    struct rig *rig = &l->s->rig;
    if (tracks == NULL || (cJSON_IsObject(tracks) && tracks->child == NULL)) {
        loading_error(l, tracks != NULL ? tracks : l->root,
                      "the file has no tracks; give \"tracks\": {\"name\": "
                      "{\"state\": ..}}");
        return;
    }
    if (!cJSON_IsObject(tracks))
        return;
    cJSON_ArrayForEach(node, tracks)
    {
        if (rig->n_kinds == RIG_KINDS_MAX) {
            loading_error_key(l, node,
                              "more than %d tracks are written; use "
                              "a prefix like \"raft-*\"",
                              RIG_KINDS_MAX);
            return;
        }
        if (cJSON_IsObject(node))
            add_track(l, node, &rig->kind[rig->n_kinds++]);
    }
}
