/* roster.h - who is being estimated: tracks by id, and who brought them.
 *
 * Tracks of the file have their place from the start.  The remaining places
 * belong to prefixes; a sender may bring only so many ids.  Look-ups go
 * through a sorted index, so they cost the same for any ids.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_ROSTER_H
#define CORE_ENGINE_ROSTER_H

#include "core/engine/track.h"

enum { ROSTER_SENDERS_MAX = 256 };

struct roster_sender {
    uint8_t family, address[16];
    int n_ids;
};

struct roster {
    const struct rig *rig;
    int n_places, n;     /* places, tracks                             */
    struct track *track; /* by place                                   */
    int32_t *by_id;      /* places of the n tracks in order of id      */
    uint64_t *key;       /* of those ids, in the same order            */
    int n_fixed;         /* places of tracks of the file               */
    int n_senders;
    struct roster_sender sender[ROSTER_SENDERS_MAX];
};

void roster_layout(struct roster *r, const struct rig *rig,
                   struct arena *arena);

/* Opens the tracks of the file. */
void roster_start(struct roster *r, int64_t now_ns);

/* The track with this id, or NULL. */
struct track *roster_find(const struct roster *r, const char *id, size_t len);

/* A new prefix track brought by this sender; NULL when there is no place or
 * the sender brought too many. */
struct track *roster_add(struct roster *r, int kind, const struct text *id,
                         const struct sender *from, int64_t now_ns);

void roster_remove(struct roster *r, struct track *t);

#endif
