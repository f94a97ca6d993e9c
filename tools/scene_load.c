/* A rehearsal file to a scene: seed, length and truth.  What concerns sensors
 * stands in scene_network.c and scene_fault.c. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "tools/rig_text.h"
#include "tools/scene_fault.h"
#include "tools/scene_network.h"
#include "tools/scene_text.h"

enum { REHEARSAL_BYTES_MAX = 4 << 20, Q_UNIT_SIZE = RIG_UNIT_SIZE + 16 };

struct loader {
    struct scene_text text;
    struct scene *scene;
    struct scene_track *track;   /* the one being read                  */
    const struct rig_kind *kind; /* its kind                            */
};

/* --- names of states and blocks ------------------------------------------- */

static int find_state(const struct rig_kind *kind, const char *name)
{
    for (int i = 0; i < kind->n; i++)
        if (strcmp(kind->state[i].name, name) == 0)
            return i;
    return -1;
}

static int find_block(const struct rig_kind *kind, const char *name)
{
    int state = find_state(kind, name);
    for (int i = 0; i < kind->n_blocks; i++)
        if (kind->block[i].at == state)
            return i;
    return -1;
}

static void refuse_state(struct loader *l, bool is_key, const char *name)
{
    const char *list[RIG_STATES_MAX + 1];
    for (int i = 0; i < l->kind->n; i++)
        list[i] = l->kind->state[i].name;
    list[l->kind->n] = NULL;
    scene_text_refuse_name(&l->text, is_key, "state of this track", name, list);
}

static void refuse_block(struct loader *l, bool is_key, const char *name)
{
    const char *list[RIG_BLOCKS_MAX + 1];
    for (int i = 0; i < l->kind->n_blocks; i++)
        list[i] = l->kind->state[l->kind->block[i].at].name;
    list[l->kind->n_blocks] = NULL;
    scene_text_refuse_name(&l->text, is_key, "block of this track", name, list);
}

/* --- start ---------------------------------------------------------------- */

/* "3 m", or {"mean": "3 m", "u": "5 mm"}. */
static void load_start_value(struct loader *l, const cJSON *value, int state)
{
    static const char *const keys[] = {"mean", "u", NULL};
    const char *unit = l->kind->state[state].unit;
    double *mean = &l->track->start[state], *u = &l->track->start_u[state];
    if (!cJSON_IsObject(value)) {
        scene_text_quantity(&l->text, value, unit, QUANTITY_POINT, mean);
        return;
    }
    if (!scene_text_keys(&l->text, value, keys))
        return;
    const cJSON *item;
    cJSON_ArrayForEach(item, value)
    {
        bool is_u = strcmp(item->string, "u") == 0;
        scene_text_enter(&l->text, item->string);
        if (scene_text_quantity(&l->text, item, unit,
                                is_u ? QUANTITY_DIFFERENCE : QUANTITY_POINT,
                                is_u ? u : mean) &&
            *u < 0)
            scene_text_refuse(&l->text, NULL, "u is below 0");
        scene_text_leave(&l->text);
    }
}

static void load_start(struct loader *l, const cJSON *start)
{
    if (!cJSON_IsObject(start)) {
        scene_text_refuse(&l->text, "write {\"x\": \"3 m\"}",
                          "a start is an object of states");
        return;
    }
    const cJSON *item;
    cJSON_ArrayForEach(item, start)
    {
        int state = find_state(l->kind, item->string);
        scene_text_enter(&l->text, item->string);
        if (state < 0)
            refuse_state(l, true, item->string);
        else
            load_start_value(l, item, state);
        scene_text_leave(&l->text);
    }
}

static int count_blocks(const struct rig_kind *kind)
{
    int n = 0;
    for (int i = 0; i < kind->n_blocks; i++)
        n += !rig_text_is_of_sensor(kind, &kind->block[i]);
    return n;
}

/* Without a start: the rig's prior, what the block returns to, or 0. */
static void default_start(struct loader *l)
{
    for (int i = 0; i < l->kind->n; i++)
        if (l->kind->state[i].has_prior)
            l->track->start[i] = l->kind->state[i].prior_mean;
    for (int i = 0; i < l->kind->n_blocks; i++) {
        const struct block *b = &l->kind->block[i];
        if (!rig_text_is_of_sensor(l->kind, b))
            continue;
        if (b->model == BLOCK_CONSTANT) /* drawn once */
            l->track->start_u[b->at] = l->kind->state[b->at].prior_u;
        l->track->block[i].q = b->q;
    }
}

/* --- moves ---------------------------------------------------------------- */

static const char *const move_keys[] = {"of",    "at",    "for", "jerk",
                                        "accel", "speed", "to",  NULL};

/* Which of jerk, accel, speed, to stands in the move; -1 after a complaint. */
static int move_kind(struct loader *l, const cJSON *item)
{
    static const char *const names[] = {"jerk", "accel", "speed", "to"};
    int kind = -1, n = 0;
    for (int i = 0; i < 4; i++)
        if (cJSON_HasObjectItem(item, names[i])) {
            kind = i;
            n++;
        }
    if (n == 1)
        return kind;
    scene_text_refuse(&l->text, "write it as a move of its own",
                      "a move has one of jerk, accel, speed, to; this has %d",
                      n);
    return -1;
}

static int move_block(struct loader *l, const cJSON *item)
{
    const cJSON *of = cJSON_GetObjectItemCaseSensitive(item, "of");
    if (of == NULL && count_blocks(l->kind) == 1)
        return 0;
    if (of == NULL) {
        scene_text_refuse(&l->text, "add \"of\": and a block's name",
                          "the track has %d blocks and the move does not say "
                          "which it moves",
                          l->kind->n_blocks);
        return -1;
    }
    scene_text_enter(&l->text, "of");
    const char *name = scene_text_string(&l->text, of);
    int block = name == NULL ? -1 : find_block(l->kind, name);
    if (name != NULL && block < 0)
        refuse_block(l, false, name);
    scene_text_leave(&l->text);
    return block;
}

static bool move_time(struct loader *l, const cJSON *item, const char *key,
                      int64_t *ns)
{
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(item, key);
    *ns = 0;
    if (value == NULL)
        return true;
    scene_text_enter(&l->text, key);
    bool is_ok = scene_text_time(&l->text, value, ns);
    scene_text_leave(&l->text);
    return is_ok;
}

static bool move_value(struct loader *l, const cJSON *item,
                       struct scene_move *m)
{
    static const struct {
        const char *name;
        int times;
    } row[] = {{"jerk", 3}, {"accel", 2}, {"speed", 1}, {"to", 0}};
    char unit[Q_UNIT_SIZE];
    int state = l->kind->block[m->block].at;
    quantity_derivative_unit(l->kind->state[state].unit, row[m->kind].times,
                             unit, sizeof unit);
    scene_text_enter(&l->text, row[m->kind].name);
    bool is_ok = scene_text_quantity(
        &l->text, cJSON_GetObjectItemCaseSensitive(item, row[m->kind].name),
        unit, m->kind == SCENE_VALUE ? QUANTITY_POINT : QUANTITY_DIFFERENCE,
        &m->value);
    scene_text_leave(&l->text);
    return is_ok;
}

/* Moves of one block follow each other. */
static void check_order(struct loader *l, const struct scene_move *m)
{
    for (int i = l->track->n_moves - 1; i >= 0; i--) {
        const struct scene_move *was = &l->track->move[i];
        if (was->block != m->block)
            continue;
        if (m->at_ns < was->at_ns + was->for_ns)
            scene_text_refuse(&l->text, "write moves in order, without overlap",
                              "this move begins at %g s, before the one above "
                              "it ends at %g s",
                              (double)m->at_ns * 1e-9,
                              (double)(was->at_ns + was->for_ns) * 1e-9);
        return;
    }
}

static void load_move(struct loader *l, const cJSON *item)
{
    struct scene_move m = {0};
    if (!scene_text_keys(&l->text, item, move_keys))
        return;
    int kind = move_kind(l, item), block = move_block(l, item);
    if (!move_time(l, item, "at", &m.at_ns) ||
        !move_time(l, item, "for", &m.for_ns) || kind < 0 || block < 0)
        return;
    m.kind = (enum scene_move_kind)kind;
    m.block = block;
    if (!move_value(l, item, &m))
        return;
    if (m.for_ns == 0 && (m.kind == SCENE_JERK || m.kind == SCENE_ACCEL)) {
        scene_text_refuse(&l->text, "add \"for\": and how long it lasts",
                          "a jerk or an accel needs a time above 0");
        return;
    }
    check_order(l, &m);
    l->track->move[l->track->n_moves++] = m;
}

static void load_moves(struct loader *l, const cJSON *moves)
{
    int n = cJSON_GetArraySize(moves), i = 0;
    if (!cJSON_IsArray(moves)) {
        scene_text_refuse(&l->text, "write them in [ ]", "moves are a list");
        return;
    }
    if (n > SCENE_MOVES_MAX) {
        scene_text_refuse(&l->text, NULL, "%d moves, %d are the most", n,
                          SCENE_MOVES_MAX);
        return;
    }
    l->track->move = calloc((size_t)n + 1, sizeof *l->track->move);
    if (l->track->move == NULL) {
        scene_text_refuse(&l->text, NULL, "out of memory");
        return;
    }
    const cJSON *item;
    cJSON_ArrayForEach(item, moves)
    {
        scene_text_enter_at(&l->text, i++);
        load_move(l, item);
        scene_text_leave(&l->text);
    }
}

/* --- wander --------------------------------------------------------------- */

static void load_density(struct loader *l, const cJSON *value, int block)
{
    char unit[Q_UNIT_SIZE];
    const struct block *b = &l->kind->block[block];
    double *q = &l->track->block[block].q;
    rig_text_q_unit(b->model, l->kind->state[b->at].unit, unit, sizeof unit);
    if (unit[0] == '\0')
        scene_text_refuse(&l->text, "move it with \"to\" instead",
                          "a constant does not wander");
    else if (scene_text_quantity(&l->text, value, unit, QUANTITY_DIFFERENCE,
                                 q) &&
             !(*q >= 0))
        scene_text_refuse(&l->text, NULL, "the density %g %s is below 0", *q,
                          unit);
}

static void load_wander(struct loader *l, const cJSON *wander)
{
    if (!cJSON_IsObject(wander)) {
        scene_text_refuse(&l->text, "write {\"x\": \"0.02 m2/s3\"}",
                          "wander is an object of blocks");
        return;
    }
    const cJSON *item;
    cJSON_ArrayForEach(item, wander)
    {
        int block = find_block(l->kind, item->string);
        scene_text_enter(&l->text, item->string);
        if (block < 0)
            refuse_block(l, true, item->string);
        else
            load_density(l, item, block);
        scene_text_leave(&l->text);
    }
}

/* --- tracks --------------------------------------------------------------- */

static void load_track_parts(struct loader *l, const cJSON *item)
{
    static const char *const keys[] = {"start", "moves", "wander", NULL};
    static void (*const load[])(struct loader *, const cJSON *) = {
        load_start, load_moves, load_wander};
    if (cJSON_IsArray(item)) {
        load_moves(l, item);
        return;
    }
    if (!scene_text_keys(&l->text, item, keys))
        return;
    for (int i = 0; keys[i] != NULL; i++) {
        const cJSON *part = cJSON_GetObjectItemCaseSensitive(item, keys[i]);
        if (part == NULL)
            continue;
        scene_text_enter(&l->text, keys[i]);
        load[i](l, part);
        scene_text_leave(&l->text);
    }
}

static void refuse_track(struct loader *l, const char *id)
{
    const struct rig *rig = l->scene->rig;
    const char *list[RIG_KINDS_MAX + 1];
    for (int i = 0; i < rig->n_kinds; i++)
        list[i] = rig->kind[i].id;
    list[rig->n_kinds] = NULL;
    scene_text_refuse_name(&l->text, true, "track of the rig", id, list);
}

static void load_track(struct loader *l, const cJSON *item)
{
    const struct rig *rig = l->scene->rig;
    size_t len = strlen(item->string);
    int kind = rig_find_kind(rig, item->string, len);
    if (kind < 0 || len >= RIG_ID_SIZE) {
        refuse_track(l, item->string);
        return;
    }
    for (int i = 0; i < rig->kind[kind].n_blocks; i++) {
        if (rig->kind[kind].block[i].model != BLOCK_LINEAR)
            continue;
        scene_text_refuse(&l->text, "rehearse a track without it",
                          "rehearsing a linear block is not built yet");
        return;
    }
    l->track = &l->scene->track[l->scene->n_tracks++];
    l->kind = &rig->kind[kind];
    l->track->kind = kind;
    snprintf(l->track->id, sizeof l->track->id, "%s", item->string);
    default_start(l);
    load_track_parts(l, item);
}

static void load_truth(struct loader *l, const cJSON *truth)
{
    int n = cJSON_GetArraySize(truth);
    if (!cJSON_IsObject(truth) || n == 0 || n > SCENE_TRACKS_MAX) {
        scene_text_refuse(&l->text, "write {\"TRACK\": [MOVES]}",
                          "truth is an object of 1 .. %d tracks",
                          SCENE_TRACKS_MAX);
        return;
    }
    l->scene->track = calloc((size_t)n, sizeof *l->scene->track);
    if (l->scene->track == NULL) {
        scene_text_refuse(&l->text, NULL, "out of memory");
        return;
    }
    const cJSON *item;
    cJSON_ArrayForEach(item, truth)
    {
        scene_text_enter(&l->text, item->string);
        load_track(l, item);
        scene_text_leave(&l->text);
    }
}

/* --- the file ------------------------------------------------------------- */

static void load_seed(struct loader *l, const cJSON *value)
{
    double seed = cJSON_IsNumber(value) ? value->valuedouble : -1;
    if (!(seed >= 0 && seed <= 9007199254740992.0) ||
        seed != (double)(uint64_t)seed) {
        scene_text_refuse(&l->text, NULL,
                          "a seed is a whole number of 0 .. 2^53");
        return;
    }
    l->scene->seed = (uint64_t)seed;
}

static void load_lasts(struct loader *l, const cJSON *value)
{
    if (scene_text_time(&l->text, value, &l->scene->lasts_ns) &&
        l->scene->lasts_ns == 0)
        scene_text_refuse(&l->text, NULL, "it must last longer than 0 s");
}

static void load_links(struct loader *l, const cJSON *value)
{
    scene_network_load(&l->text, l->scene, value);
}

static void load_faults(struct loader *l, const cJSON *value)
{
    scene_fault_load(&l->text, l->scene, value);
}

static void load_all(struct loader *l)
{
    static const char *const keys[] = {"seed",    "lasts",  "truth",
                                       "network", "faults", NULL};
    static void (*const load[])(struct loader *, const cJSON *) = {
        load_seed, load_lasts, load_truth, load_links, load_faults};
    scene_text_keys(&l->text, l->text.root, keys);
    for (int i = 0; keys[i] != NULL; i++) {
        const cJSON *item =
            cJSON_GetObjectItemCaseSensitive(l->text.root, keys[i]);
        scene_text_enter(&l->text, keys[i]);
        if (item != NULL)
            load[i](l, item);
        scene_text_leave(&l->text);
        if (item == NULL && i == 2)
            scene_text_refuse(&l->text, "add \"truth\": {\"TRACK\": [MOVES]}",
                              "the key \"truth\" is missing");
    }
}

status scene_parse(struct scene **s, const struct scene_source *from,
                   const char *text, size_t len, struct problems *problems)
{
    struct loader l = {0};
    status st = ST_SCHEMA;
    *s = NULL;
    l.scene = calloc(1, sizeof *l.scene);
    if (l.scene == NULL) {
        problems_append(problems, "out of memory\n");
        return ST_NOMEM;
    }
    l.scene->rig = from->rig;
    l.scene->seed = 1;
    l.scene->lasts_ns = 60000000000;
    bool is_sound = scene_text_init(&l.text, from->path, text, len, problems);
    l.text.left_out = from->left_out;
    if (is_sound)
        load_all(&l);
    if (!l.text.is_bad)
        st = scene_reseed(l.scene, l.scene->seed);
    scene_text_fini(&l.text);
    if (st == ST_OK)
        *s = l.scene;
    else
        scene_free(l.scene);
    return st;
}

status scene_load(struct scene **s, const struct scene_source *from,
                  struct problems *problems)
{
    char report[1400];
    status st = ST_IO;
    *s = NULL;
    char *text = malloc(REHEARSAL_BYTES_MAX);
    FILE *file = text == NULL ? NULL : fopen(from->path, "rb");
    size_t len = file == NULL ? 0 : fread(text, 1, REHEARSAL_BYTES_MAX, file);
    if (file == NULL || ferror(file) || len == REHEARSAL_BYTES_MAX) {
        snprintf(report, sizeof report, "%.1024s: %s\n", from->path,
                 file != NULL && !ferror(file)
                     ? "longer than 4 MiB; a rehearsal is shorter"
                     : strerror(errno));
        problems_append(problems, report);
    } else {
        st = scene_parse(s, from, text, len, problems);
    }
    if (file != NULL)
        fclose(file);
    free(text);
    return st;
}
