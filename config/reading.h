/* reading.h - what load_reads.c and load_place.c share. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_READING_H
#define CONFIG_READING_H

#include "config/loading.h"

/* The `reads` of one sensor in work. */
struct reading {
    struct loading *l;
    const struct rig_kind *kind;
    struct rig_sensor *s;
    char (*units)[RIG_UNIT_SIZE];
    const char *own_unit; /* that the sensor declares, "1" if none         */
};

/* Reports a name that is no state of the track. */
void reading_unknown_state(const struct reading *c, const cJSON *at,
                           bool at_key, const char *name);

/* A new row, or NULL and a report when there are too many. */
struct reads_row *reading_add_row(const struct reading *c, const cJSON *node,
                                  enum reads_kind kind, const char *unit);

/* load_place.c: the object and its list of coordinates. */
void reading_place(const struct reading *c, const cJSON *object,
                   const cJSON *form, bool is_range, bool is_bearing);
void reading_range_rate(const struct reading *c, const cJSON *object,
                        const cJSON *form);

#endif
