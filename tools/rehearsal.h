/* rehearsal.h - what the verbs rehearse and demo share: a rehearsal found,
 * loaded and brought to a socket in its own time. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_REHEARSAL_H
#define TOOLS_REHEARSAL_H

#include "tools/call.h"
#include "tools/scene_play.h"

/* "rig.json" to "rig.rehearsal.json"; false when it does not fit. */
bool rehearsal_path(const char *rig_path, char *out, size_t size);

/* Loads the rehearsal with --seed and --lasts laid over it.  Says what is
 * wrong and returns an exit code; *s is NULL then. */
int rehearsal_load(const struct call *call, const struct rig *rig,
                   const char *path, struct scene **s);

/* Datagrams to a connected socket, each when it is due by the clock. */
struct rehearsal_sender {
    struct scene_play play;
    struct scene_datagram next;
    bool is_over;
    int fd;
    int64_t offset_ns; /* realtime minus monotonic at the beginning      */
    uint64_t n_sent, n_refused, n_bytes;
    int64_t behind_ns; /* the most that one was sent after its time      */
};

status rehearsal_sender_init(struct rehearsal_sender *r, struct scene *s,
                             int fd, int64_t begin_ns) MUST_USE;
void rehearsal_sender_fini(struct rehearsal_sender *r);

/* Sends what is due now, one after the other. */
status rehearsal_send_due(struct rehearsal_sender *r) MUST_USE;

/* Monotonic ns until the next one is due, 0 if it is already. */
int64_t rehearsal_wait_ns(const struct rehearsal_sender *r);

#endif
