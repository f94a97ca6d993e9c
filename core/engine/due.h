/* due.h - which track has to be looked at next: a heap by due time.
 *
 * A track is due when a held measurement may go in or a laid one settles.
 * Equal times come out in order of ids, so that the order of what is said
 * never depends on which track was there first.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_DUE_H
#define CORE_ENGINE_DUE_H

#include <stdint.h>

#define DUE_NEVER INT64_MAX

struct due {
    int n;
    int32_t *heap;   /* places, the earliest first                        */
    int32_t *at;     /* by place: its position in the heap                */
    int64_t *time;   /* by place: when it is due                          */
    const char **id; /* by place: the track's id, for equal times         */
    uint64_t *key;   /* by place: the id's rig_key                        */
};

/* All n places, never due.  The arrays hold n values each; the caller fills
 * `id`, and may change an id only while its place is never due. */
void due_init(struct due *d, int n);

void due_set(struct due *d, int place, int64_t time_ns);

/* The earliest place; DUE_NEVER in d->time when nothing is due. */
static inline int due_first(const struct due *d)
{
    return d->heap[0];
}

#endif
