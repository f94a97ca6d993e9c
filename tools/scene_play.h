/* scene_play.h - a rehearsal as datagrams, in order of their arrival.
 *
 * scene -> sensors sample it -> network delays, loses, doubles -> datagrams.
 * Pure: the same scene, seed and beginning give the same bytes.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_PLAY_H
#define TOOLS_SCENE_PLAY_H

#include <stdio.h>

#include "tools/scene_network.h"

enum { SCENE_DATAGRAM_MAX = 1024 };

struct scene_play {
    struct scene *scene; /* not owned; its truth goes along with the play  */
    int64_t begin_ns;    /* since 1970: where the rehearsal's 0 lies       */
    int n_sensors;       /* sensors times the tracks that they read        */
    struct scene_sensor *sensor;
    struct scene_network network;
    uint64_t n_silent; /* samples that a fault swallowed                 */
    uint64_t n_datagrams;
};

struct scene_datagram {
    int64_t arrives_ns; /* since 1970                                     */
    int sensor, track;
    size_t len;
    char bytes[SCENE_DATAGRAM_MAX];
};

status scene_play_init(struct scene_play *p, struct scene *s,
                       int64_t begin_ns) MUST_USE;
void scene_play_fini(struct scene_play *p);

/* The next datagram; *is_over when there are no more. */
status scene_play_next(struct scene_play *p, struct scene_datagram *d,
                       bool *is_over) MUST_USE;

/* Truth as a table: time_ns, track, then every state name of the rig's
 * tracks; rows each 10 ms.  The scene is one of its own. */
struct scene_table {
    struct scene *scene;
    int64_t begin_ns, next_ns;
    FILE *to;
};

void scene_table_init(struct scene_table *t, struct scene *s, int64_t begin_ns,
                      FILE *to);
/* Writes the rows before until_ns (of the rehearsal). */
void scene_table_write(struct scene_table *t, int64_t until_ns);

/* The script's faults as a table: from_ns, to_ns, sensor, track, fault. */
void scene_table_faults(const struct scene *s, int64_t begin_ns, FILE *to);

#endif
