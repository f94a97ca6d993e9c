/* scene.h - the truth of a rehearsal: what the rig really does.
 *
 * Loaded from a rehearsal file, JSON beside the rig file:
 *   {"seed": 7, "lasts": "70 s",
 *    "truth": {"carriage": {
 *       "start":  {"x": "3 m", "x.rate": {"mean": "0 m/s", "u": "1 mm/s"}},
 *       "moves":  [{"of": "x", "at": "5 s", "jerk": "2 m/s3", "for": "0.5 s"}],
 *       "wander": {"x": "0.02 m2/s5"}}},
 *    "network": {"laser": {"delay": ["30 ms", "50 ms"], "loss": 0.01,
 *                "duplicates": 0.01, "reordering": 0.01, "form": "msgpack"}},
 *    "faults": [{"at": "40 s", "for": "0.5 s", "sensor": "laser",
 *                "jump": "0.6 m"}]}
 * A track may also be the list of moves alone; `of` may be left out where the
 * track has one block.
 *
 * Truth is what the script says plus what wanders.  The script is exact:
 * pieces of constant jerk, evaluated in closed form.  What wanders is driven
 * by white noise of the given density, held for 0.1 ms at a time:
 *   random-walk, gauss-markov   d value = .. + w    L^2/s
 *   constant-velocity           d rate  = .. + w    L^2/s^3
 *   constant-acceleration       d accel = .. + w    L^2/s^5
 * Times are ns from the beginning of the rehearsal; values stand in the unit
 * that the rig declares for the state.  No equation is shared with core/model.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_H
#define TOOLS_SCENE_H

#include "config/load.h"
#include "core/math/random.h"
#include "core/wire/encode.h"

enum {
    SCENE_TRACKS_MAX = 64,
    SCENE_MOVES_MAX = 500, /* of one track                               */
    SCENE_FAULTS_MAX = 100,
    SCENE_STEP_NS = 100000 /* how long a drawn noise is held             */
};

enum scene_move_kind {
    SCENE_JERK,  /* accel changes at this rate, then stays                */
    SCENE_ACCEL, /* accel is this, then 0                                 */
    SCENE_SPEED, /* rate goes evenly to this, then stays                  */
    SCENE_VALUE  /* value goes evenly to this, then stays                 */
};

struct scene_move {
    enum scene_move_kind kind;
    int block;
    int64_t at_ns, for_ns;
    double value;
};

/* Value, rate, accel and jerk at at_ns; the jerk holds until the next. */
struct scene_piece {
    int64_t at_ns;
    double c[4];
};

/* What wanders, since its last noise was drawn. */
struct scene_wander {
    struct random random;
    int64_t step; /* whole steps taken; -1: not begun                    */
    double c[4];  /* as in a piece, the noise in its place               */
    double noise;
};

struct scene_block {
    double q; /* density of what wanders, 0 = nothing does           */
    int n_pieces;
    struct scene_piece *piece;
    struct scene_wander wander;
};

struct scene_track {
    char id[RIG_ID_SIZE];
    int kind; /* index into rig.kind                                 */
    double start[RIG_STATES_MAX], start_u[RIG_STATES_MAX];
    int n_moves;
    struct scene_move *move;
    struct scene_block block[RIG_BLOCKS_MAX];
};

/* What the network does with one sensor's datagrams. */
struct scene_link {
    int64_t delay_min_ns, delay_max_ns;  /* even between                   */
    double loss, duplicates, reordering; /* shares                        */
    enum wire_form form;
};

enum scene_fault_kind { SCENE_JUMP, SCENE_SILENCE };

struct scene_fault {
    enum scene_fault_kind kind;
    int sensor;
    int track; /* index into scene.track, -1: all                     */
    int64_t at_ns, for_ns;
    double jump[READS_MAX]; /* in the sensor's unit                       */
};

struct scene {
    const struct rig *rig; /* not owned */
    uint64_t seed;
    int64_t lasts_ns;
    int n_tracks, n_faults;
    struct scene_track *track;
    struct scene_fault fault[SCENE_FAULTS_MAX];
    struct scene_link link[RIG_SENSORS_MAX]; /* by sensor index           */
};

/* What a rehearsal is loaded for. */
struct scene_source {
    const struct rig *rig; /* kept by the scene: it must outlive it        */
    const char *path;
    const char *const *left_out; /* sensors that are not in the rig and yet
                               may be named (ends with NULL); or NULL       */
};

/* Loads a rehearsal.  On anything but ST_OK *s is NULL and *problems holds at
 * least one report with its place. */
status scene_load(struct scene **s, const struct scene_source *from,
                  struct problems *problems) MUST_USE;
/* The same from memory; `path` only names it. */
status scene_parse(struct scene **s, const struct scene_source *from,
                   const char *text, size_t len,
                   struct problems *problems) MUST_USE;
void scene_free(struct scene *s);

/* The whole rehearsal with another seed, from its beginning. */
status scene_reseed(struct scene *s, uint64_t seed) MUST_USE;

/* A stream of the scene's own for one purpose: the same whatever else the
 * scene holds. */
void scene_random(const struct scene *s, const char *purpose, const char *of,
                  struct random *random);

int scene_find_track(const struct scene *s, const char *id);

/* The true states of a track, as many as its kind has, in the rig's order.
 * Going forward in time is cheap; going back begins the track anew. */
void scene_truth(struct scene *s, int track, int64_t t_ns, double *x);

#endif
