/* rig.h - the rig as the engine sees it: plain structs that config fills.
 *
 * Everything is checked and converted before it stands here: times are
 * int64 ns, states are in the unit that the rig file declares for them, and
 * a sensor's z becomes  z * scale + shift  in the unit of what it reads.
 * Sensors stand in byte order of their names: a sensor's index is its place
 * in canonical order.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_RIG_H
#define CORE_MODEL_RIG_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <string.h>

#include "core/math/ud.h"
#include "core/model/block.h"
#include "core/model/reads.h"

enum {
    RIG_ID_SIZE = 64, /* an id of up to 63 characters and its NUL    */
    RIG_UNIT_SIZE = 32,
    RIG_STATES_MAX = UD_MAX,
    RIG_BLOCKS_MAX = 48,
    RIG_KINDS_MAX = 64, /* tracks written in the file                  */
    RIG_SENSORS_MAX = 256,
    RIG_SENDERS_MAX = 32,
    RIG_COUPLINGS_MAX = 96,
    RIG_COMPONENTS_MAX = RIG_BLOCKS_MAX,
    RIG_LINEAR_MAX = 16, /* states of a linear block                  */
    RIG_OWN_MAX = 1200,
    RIG_SYSTEM_MAX = 2 * RIG_STATES_MAX * RIG_STATES_MAX + RIG_STATES_MAX
};

struct rig_state {
    char name[RIG_ID_SIZE];
    char unit[RIG_UNIT_SIZE];
    bool is_constant;   /* belongs to a block without noise            */
    bool is_stationary; /* has a spread of its own in the long run, by
                           rig_prepare_kind                                 */
    double stationary_mean, stationary_u;
    bool has_prior; /* a start was given, or it is stationary      */
    double prior_mean, prior_u;
    double good_u, lost_u; /* limits on its u, 0 = none                   */
};

/* dx_state/dt has a part rate * x_on: a lag and the like. */
struct rig_coupling {
    int state, on;
    double rate; /* per second, times the ratio of the units              */
};

/* States that are discretised together. */
struct rig_component {
    int n;
    int16_t state[RIG_STATES_MAX]; /* ascending                           */
    int at; /* where its system begins in rig_kind.system: A, W (n x n), c */
};

/* A track of the file: one id, or every id that starts with a prefix. */
struct rig_kind {
    char id[RIG_ID_SIZE]; /* without the '*' of a prefix                 */
    int id_len;           /* by rig_prepare_kind                         */
    bool is_prefix;
    int n_blocks, n; /* n: states                                   */
    int levels;      /* states per axis where all blocks are axes of
                        one kinematic model, else 0; by
                        rig_prepare_kind                            */
    struct block block[RIG_BLOCKS_MAX];
    struct rig_state state[RIG_STATES_MAX];
    int n_couplings, n_own;
    struct rig_coupling coupling[RIG_COUPLINGS_MAX];
    double own[RIG_OWN_MAX]; /* of linear blocks: A, W (n x n), c (n)      */
    int n_components;        /* by rig_prepare_kind, with what follows     */
    struct rig_component component[RIG_COMPONENTS_MAX];
    double system[RIG_SYSTEM_MAX];
    bool has_start_at; /* start.at given: the prior belongs to that time */
    int64_t start_at_ns;
    bool has_good;          /* any good.u given                            */
    bool has_limits;        /* any good.u or lost.u, by rig_prepare_kind   */
    int64_t lost_after_ns;  /* coasting longer than this is lost           */
    int recover_refused;    /* refused in a row ...                        */
    int64_t recover_for_ns; /* ... for at least so long: widen            */
};

enum rig_stamp { RIG_STAMP_ANY, RIG_STAMP_SENSOR, RIG_STAMP_ARRIVAL };

struct rig_sensor {
    char name[RIG_ID_SIZE];
    uint64_t key; /* of the name, by rig_prepare                 */
    char unit[READS_MAX][RIG_UNIT_SIZE];
    int kind; /* its track: index into rig.kind              */
    struct reads reads;
    double scale[READS_MAX], shift[READS_MAX]; /* z -> unit of what it reads */
    double r[READS_MAX]; /* variance of each component, that unit squared */
    bool has_relative;
    double relative[READS_MAX]; /* u grows by so much of what is read      */
    double rate_hz; /* per track                                   */
    int64_t silent_after_ns;
    bool has_gate;
    double gate_p; /* probability, 0 < p < 1                      */
    double gate[READS_MAX + 1]; /* NIS limit by degrees of freedom, from
                                   gate_p by rig_prepare                  */
    enum rig_stamp stamp;
    int64_t delay_ns;
};

struct rig_network { /* receive.senders                             */
    uint8_t family;  /* 4 or 6                                      */
    uint8_t bits;
    uint8_t address[16];
};

struct rig {
    char name[128];
    char file_hash[65]; /* SHA-256 of the file's bytes, hex            */
    int64_t hold_ns, horizon_ns, ahead_ns;
    int max_tracks;         /* limits.tracks                               */
    int max_ids_per_sender; /* limits.ids_per_sender                      */
    double max_steps;       /* limits.steps: re-run steps per sensor and
                               second                                      */
    int max_pending;        /* limits.pending per sensor and track, 0 = the
                               default 4 rate (horizon + ahead) + 16       */
    int n_kinds, n_sensors, n_senders;
    struct rig_kind kind[RIG_KINDS_MAX];
    struct rig_sensor sensor[RIG_SENSORS_MAX];
    struct rig_network sender[RIG_SENDERS_MAX]; /* none: everyone may send */
};

/* The first eight bytes of a text as a number that sorts as they do. */
static inline uint64_t rig_key(const char *s, size_t len)
{
    uint64_t first8 = 0;
    uint32_t first4 = 0, last4 = 0;
    if (len >= 8) {
        memcpy(&first8, s, 8);
        return __builtin_bswap64(first8);
    }
    if (len >= 4) { /* two loads that overlap */
        memcpy(&first4, s, 4);
        memcpy(&last4, s + len - 4, 4);
        return (uint64_t)__builtin_bswap32(first4) << 32 |
               (uint64_t)__builtin_bswap32(last4) << (64 - 8 * len);
    }
    for (size_t i = 0; i < len; i++)
        first8 |= (uint64_t)(uint8_t)s[i] << (56 - 8 * i);
    return first8;
}

/* Order of an id against an entry, NUL-terminated, whose key is the same. */
static inline int rig_compare(const char *id, size_t len, const char *entry)
{
    if (len < 8)
        return 0; /* the key holds all of it, and where it ends */
    size_t n = strlen(entry);
    int order = memcmp(id, entry, len < n ? len : n);
    return order != 0 ? order : (len > n) - (len < n);
}

/* Measurements per second that the rig declares: rates are per track, and a
 * prefix stands for as many tracks as limits.tracks leaves room for. */
double rig_rate_hz(const struct rig *rig);

/* Fills what follows from the rest: gate limits from gate_p, keys, lengths.
 * Call once after config filled the struct. */
void rig_prepare(struct rig *rig);

/* The part of it that concerns one kind of track. */
void rig_prepare_kind(struct rig_kind *kind);

/* Index of the sensor with this name, or -1; binary search. */
int rig_find_sensor(const struct rig *rig, const char *name, size_t len);

/* Index of the kind that an id belongs to, or -1: an exact id wins over a
 * prefix, the longest prefix over a shorter one. */
int rig_find_kind(const struct rig *rig, const char *id, size_t len);

/* How many measurements of this sensor one track may hold pending. */
int rig_pending_quota(const struct rig *rig, const struct rig_sensor *s);

#endif
