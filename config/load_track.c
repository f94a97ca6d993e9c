/* Tracks: their state blocks, starts and limits. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "core/wire/decode.h"

static const char *const models[] = {
    "constant",          "random-walk",           "gauss-markov",
    "constant-velocity", "constant-acceleration", NULL};

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

/* The unit of q: the state unit squared, over seconds to the power. */
static void density_unit(const char *unit, int seconds, char *out, size_t size)
{
    bool is_word = true;
    for (const char *s = unit; *s != '\0'; s++)
        is_word = is_word && isalpha((unsigned char)*s);
    char over[12] = "";
    if (seconds > 1)
        snprintf(over, sizeof over, "%d", seconds);
    if (strcmp(unit, "1") == 0)
        snprintf(out, size, "1/s%s", over);
    else
        snprintf(out, size, is_word ? "%s2/s%s" : "(%s)^2/s%s", unit, over);
}

/* What an unmodelled motion is called, and how often it is integrated. */
static const char *unmodelled_key(enum block_model model)
{
    switch (model) {
    case BLOCK_RANDOM_WALK:
        return "rate";
    case BLOCK_CONSTANT_VELOCITY:
        return "accel";
    case BLOCK_CONSTANT_ACCELERATION:
        return "jerk";
    case BLOCK_CONSTANT:
    case BLOCK_GAUSS_MARKOV:
        break;
    }
    return NULL;
}

/* q = a^2 lasts. */
static void unmodelled(struct loading *l, const cJSON *object, struct block *b,
                       const char *unit)
{
    const char *key = unmodelled_key(b->model);
    const cJSON *lasts = loading_get(object, "lasts");
    const cJSON *node = loading_get(object, key), *each;
    char motion[2 * RIG_UNIT_SIZE];
    double a, t_s;
    if (!cJSON_IsObject(object))
        return;
    cJSON_ArrayForEach(each, object)
    {
        if (each != node && each != lasts &&
            (strcmp(each->string, "rate") == 0 ||
             strcmp(each->string, "accel") == 0 ||
             strcmp(each->string, "jerk") == 0))
            loading_error_key(l, each,
                              "\"%s\" does not belong to %s; give "
                              "\"%s\"",
                              each->string, models[b->model], key);
    }
    if (node == NULL || lasts == NULL) {
        loading_error_key(l, object,
                          "\"unmodelled\" needs \"%s\" and "
                          "\"lasts\"; give both",
                          key);
        return;
    }
    quantity_derivative_unit(unit, b->n, motion, sizeof motion);
    if (loading_size(l, node, motion, false, &a) &&
        loading_size(l, lasts, "s", false, &t_s))
        b->q = a * a * t_s; /* q = a^2 lasts */
}

/* Keys that another model has. */
static void refuse_key(struct loading *l, const cJSON *node, const char *key,
                       const struct block *b)
{
    const cJSON *at = loading_get(node, key);
    if (at != NULL)
        loading_error_key(l, at,
                          "\"%s\" does not belong to the model %s; "
                          "remove it",
                          key, models[b->model]);
}

static void gauss_markov(struct loading *l, const cJSON *node, struct block *b,
                         struct rig_state *state)
{
    const cJSON *tau = loading_get(node, "tau"), *u = loading_get(node, "u");
    const cJSON *q = loading_get(node, "q"), *mean = loading_get(node, "mean");
    char unit[2 * RIG_UNIT_SIZE];
    double spread;
    refuse_key(l, node, "unmodelled", b);
    density_unit(state->unit, 1, unit, sizeof unit);
    if (mean != NULL)
        loading_quantity(l, mean, state->unit, QUANTITY_POINT, &b->mean);
    if (tau == NULL || (u == NULL) == (q == NULL)) {
        loading_error_key(l, node,
                          "the gauss-markov state \"%s\" needs "
                          "\"tau\" and either \"u\" or \"q\"; give them",
                          state->name);
        return;
    }
    if (!loading_size(l, tau, "s", true, &b->tau_s))
        return;
    if (u != NULL && loading_size(l, u, state->unit, true, &spread))
        b->q = 2 * spread * spread / b->tau_s; /* u^2 = q tau / 2 */
    if (q != NULL)
        loading_size(l, q, unit, true, &b->q);
    state->has_prior = true;
    state->prior_mean = b->mean;
    state->prior_u = sqrt(b->q * b->tau_s / 2); /* u^2 = q tau / 2 */
}

static void noise(struct loading *l, const cJSON *node, struct block *b,
                  struct rig_state *state)
{
    const cJSON *q = loading_get(node, "q");
    const cJSON *words = loading_get(node, "unmodelled");
    char unit[2 * RIG_UNIT_SIZE];
    if (b->model == BLOCK_GAUSS_MARKOV) {
        gauss_markov(l, node, b, state);
        return;
    }
    refuse_key(l, node, "tau", b);
    refuse_key(l, node, "u", b);
    refuse_key(l, node, "mean", b);
    if (b->model == BLOCK_CONSTANT) {
        refuse_key(l, node, "q", b);
        refuse_key(l, node, "unmodelled", b);
        return;
    }
    if ((q == NULL) == (words == NULL)) {
        loading_error_key(l, node,
                          "the state \"%s\" needs either \"q\" or "
                          "\"unmodelled\"; give one, like \"unmodelled\": "
                          "{\"%s\": .., \"lasts\": ..}",
                          state->name, unmodelled_key(b->model));
        return;
    }
    density_unit(state->unit, 2 * b->n - 1, unit, sizeof unit);
    if (q != NULL)
        loading_size(l, q, unit, false, &b->q);
    else
        unmodelled(l, words, b, state->unit);
}

static bool is_state_name(const char *name)
{
    size_t n = strspn(name, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUV"
                            "WXYZ0123456789_");
    return isalpha((unsigned char)name[0]) && name[n] == '\0' && n <= 48 &&
           strcmp(name, "at") != 0;
}

/* Name and unit of the block; false if either was reported. */
static bool block_names(struct loading *l, const cJSON *node,
                        const struct rig_kind *kind)
{
    const cJSON *name = loading_get(node, "name");
    const cJSON *unit = loading_get(node, "unit");
    double scale, shift;
    struct err err;
    int n = l->problems->n;
    if (name == NULL)
        loading_error(l, node,
                      "a state block has no name; give \"name\": "
                      "\"x\"");
    else if (cJSON_IsString(name) && !is_state_name(name->valuestring))
        loading_error(l, name,
                      "\"%.64s\" cannot name a state; use a letter, "
                      "then letters, digits and _ (not \"at\")",
                      name->valuestring);
    else if (loading_state(kind, loading_text(name)) >= 0)
        loading_error(l, name, "the state \"%s\" stands twice; rename one",
                      name->valuestring);
    if (unit == NULL)
        loading_error(l, node,
                      "the state \"%.64s\" has no unit; give "
                      "\"unit\": \"m\", or \"1\" for none",
                      loading_text(name));
    else if (strlen(loading_text(unit)) >= RIG_UNIT_SIZE - 4)
        loading_error(l, unit, "a unit may have 27 bytes; shorten it");
    else if (cJSON_IsString(unit) &&
             quantity_convert(l->units, unit->valuestring, unit->valuestring,
                              &scale, &shift, &err) != ST_OK)
        loading_error(l, unit, "%s", err.text);
    return l->problems->n == n && cJSON_IsString(name) && cJSON_IsString(unit);
}

static void add_block(struct loading *l, const cJSON *node,
                      struct rig_kind *kind)
{
    static const char *const suffix[] = {"", ".rate", ".accel"};
    const cJSON *model = loading_get(node, "model");
    int at = kind->n, m = 0;
    if (model == NULL)
        loading_error(l, node,
                      "a state block has no model; give \"model\": "
                      "\"constant-velocity\" or another");
    while (models[m] != NULL && strcmp(models[m], loading_text(model)) != 0)
        m++;
    if (!block_names(l, node, kind) || models[m] == NULL)
        return;
    struct block b = {.model = (enum block_model)m, .at = at};
    b.n = block_states(b.model);
    if (at + b.n > RIG_STATES_MAX || kind->n_blocks == RIG_BLOCKS_MAX) {
        loading_error(l, node,
                      "a track holds %d states in %d blocks at most; "
                      "leave some out",
                      RIG_STATES_MAX, RIG_BLOCKS_MAX);
        return;
    }
    for (int i = 0; i < b.n; i++) {
        struct rig_state *s = &kind->state[at + i];
        snprintf(s->name, sizeof s->name, "%.50s%s",
                 loading_text(loading_get(node, "name")), suffix[i]);
        quantity_derivative_unit(loading_text(loading_get(node, "unit")), i,
                                 s->unit, sizeof s->unit);
        s->is_constant = b.model == BLOCK_CONSTANT;
    }
    kind->n += b.n;
    noise(l, node, &b, &kind->state[at]);
    kind->block[kind->n_blocks++] = b;
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
        add_block(l, state, kind);
    else
        cJSON_ArrayForEach(block, state)
        {
            if (cJSON_IsObject(block))
                add_block(l, block, kind);
        }
    const cJSON *recover = loading_get(node, "recover");
    loading_time(l, loading_get(node, "lost"), "tracks.*.lost.after", 0,
                 &kind->lost_after_ns);
    loading_integer(l, recover, "tracks.*.recover.refused", 1, 1000000,
                    &kind->recover_refused);
    loading_time(l, recover, "tracks.*.recover.for", 0, &kind->recover_for_ns);
    if (kind->n_blocks == 0 || l->problems->n != n)
        return; /* its states are not all known */
    start(l, loading_get(node, "start"), kind);
    kind->has_good = spreads(l, loading_get(node, "good"), kind, true);
    spreads(l, loading_get(node, "lost"), kind, false);
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
