/* scene_network.h - the way of a rehearsal's datagrams: late, lost, doubled.
 *
 * Each sensor has a link with "delay" (one time, or two and even between),
 * "loss", "duplicates" and "reordering" as shares, and "form" (json or
 * msgpack).  A second copy has a delay of its own; one that is reordered
 * takes one to two of its sensor's periods longer.  What is on the way waits
 * in order of arrival.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_NETWORK_H
#define TOOLS_SCENE_NETWORK_H

#include "tools/scene.h"
#include "tools/scene_sensor.h"
#include "tools/scene_text.h"

enum { SCENE_POSTS_MAX = 1 << 20 };

struct scene_post {
    int64_t arrives_ns;
    uint64_t serial; /* of sending: breaks ties of arrival               */
    uint64_t seq;
    struct scene_reading reading;
};

struct scene_network {
    struct random random[RIG_SENSORS_MAX];
    uint64_t seq[RIG_SENSORS_MAX]; /* a sensor numbers all that it says   */
    uint64_t n_sent, n_lost, n_doubled, n_reordered;
    uint64_t n_full; /* dropped because SCENE_POSTS_MAX were on the way  */
    uint64_t serial;
    int n, size;
    struct scene_post *post; /* heap, the earliest first                  */
};

/* The object "network" of the file into *s; complaints go to the reader. */
void scene_network_load(struct scene_text *r, struct scene *s,
                        const cJSON *network);

void scene_network_init(struct scene_network *n, const struct scene *s);
void scene_network_fini(struct scene_network *n);

status scene_network_send(struct scene_network *n, const struct scene *s,
                          const struct scene_reading *reading) MUST_USE;

/* When the next one arrives, INT64_MAX when none is on the way. */
int64_t scene_network_due(const struct scene_network *n);
/* Takes the next one; there is one. */
void scene_network_take(struct scene_network *n, struct scene_post *post);

#endif
