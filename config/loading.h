/* loading.h - what the files of the loader share.
 *
 * Every cJSON node carries in `valueint` where it came from: its offset in
 * the text, or LOADING_CHANGE - i for the i-th change.  Numbers are read from
 * `valuedouble` only.  Copies made by names in braces and by `like` keep it,
 * so reports point at what the user wrote.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_LOADING_H
#define CONFIG_LOADING_H

#include <cJSON.h>

#include "config/load.h"
#include "config/quantity.h"
#include "config/table.h"
#include "config/textpos.h"

enum {
    LOADING_CHANGE = -2, /* valueint of what the first change brought     */
    LOADING_LIST_MAX = 512,
    LOADING_BYTES_MAX = 4 * 1024 * 1024
};

struct loading {
    struct settings *s;
    struct quantity_units *units;
    struct problems *problems;
    const char *path;
    const char *raw; /* as the user wrote it                             */
    char *text;      /* the same without comments                        */
    size_t len;
    const struct settings_change *changes;
    int n_changes;
    cJSON *root;
    bool is_out_of_memory;
    bool is_sound[RIG_KINDS_MAX]; /* tracks whose states are all known     */
    int n_marks;
    struct {
        long place; /* order among reports: offset, then changes        */
        size_t start, len; /* its part of problems->text                  */
    } mark[PROBLEMS_MAX];
};

/* One report at a value, or at its key: "reason; remedy". */
void loading_error(struct loading *l, const cJSON *at, const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));
void loading_error_key(struct loading *l, const cJSON *at, const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));

/* Puts the reports in the order of the file and drops equal ones, which names
 * in braces make. */
void loading_sort(struct loading *l);

/* An unknown name: the nearest of the list, or all of it, is the remedy. */
void loading_unknown(struct loading *l, const cJSON *at, bool at_key,
                     const char *what, const char *name,
                     const char *const *list);

/* load_tree.c: braces, changes and `like`, in this order. */
void loading_expand(struct loading *l, cJSON *group);
void loading_change(struct loading *l);
void loading_like(struct loading *l, cJSON *group, const char *what);
void loading_remove(struct loading *l);

/* load_check.c: unknown and planned keys, types. */
void loading_check(struct loading *l);

/* load_value.c: values of rows.  Each takes the object that holds the key and
 * the row's path; the default is the row's.  A value of a wrong type was
 * reported by loading_check and is passed over in silence. */
const cJSON *loading_get(const cJSON *object, const char *key);
const char *loading_text(const cJSON *node); /* "" unless it is a text */
bool loading_time(struct loading *l, const cJSON *object, const char *row,
                  double least_s, int64_t *ns);
bool loading_bytes(struct loading *l, const cJSON *object, const char *row,
                   int64_t *bytes);
bool loading_integer(struct loading *l, const cJSON *object, const char *row,
                     int least, int most, int *value);
/* A number or a text with a unit, to the unit `to`. */
bool loading_quantity(struct loading *l, const cJSON *node, const char *to,
                      enum quantity_role role, double *value);
/* The same, refused below zero (or at zero, if `is_positive`). */
bool loading_size(struct loading *l, const cJSON *node, const char *to,
                  bool is_positive, double *value);

/* load_host.c, load_track.c, load_sensor.c, load_reads.c: a part each. */
void loading_host(struct loading *l);
void loading_tracks(struct loading *l);
void loading_sensors(struct loading *l);
/* load_block.c: adds a state block to the kind. */
void loading_block(struct loading *l, const cJSON *node, struct rig_kind *kind);
/* load_noise.c: the models by their number, and b->q from the block's object;
 * `state` is the block's first. */
extern const char *const loading_models[];
void loading_noise(struct loading *l, const cJSON *node, struct block *b,
                   struct rig_state *state);
/* The unit of q: the state unit squared, over seconds to the power. */
void loading_density_unit(const char *unit, int seconds, char *out,
                          size_t size);
/* load_track.c: starts and limits, when all states are there. */
void loading_track_values(struct loading *l);
/* load_sensor.c: the i-th of a list, or the one value for all m components. */
const cJSON *loading_component(struct loading *l, const cJSON *node, int i,
                               int m);
/* load_error.c: what stands between what is read and the reading; `units` are
 * those of what is read. */
void loading_errors(struct loading *l, const cJSON *sensor,
                    struct rig_sensor *s, char units[READS_MAX][RIG_UNIT_SIZE]);
/* load_place.c: what is read from far needs a start, until that is built. */
void loading_check_starts(struct loading *l);
/* Fills s->reads and the unit of each row ("rad" for a bearing); false if
 * anything was reported. */
bool loading_reads(struct loading *l, const cJSON *sensor, struct rig_sensor *s,
                   char units[READS_MAX][RIG_UNIT_SIZE]);

/* Index of a state of the kind, or -1. */
int loading_state(const struct rig_kind *kind, const char *name);
/* Names of all states, for loading_unknown; ends with NULL. */
void loading_state_names(const struct rig_kind *kind,
                         const char *list[RIG_STATES_MAX + 1]);

#endif
