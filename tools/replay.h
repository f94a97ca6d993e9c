/* replay.h - records of a capture into a run, exactly as it was live.
 *
 * A capture of ours begins the line at its `start` record; `time`, `reanchor`
 * and `stop` are obeyed.  A foreign capture has no such records: the line
 * begins at its first datagram and ends at the last one plus the horizon.
 *
 * Files are daemon/capture.h's business, what is said goes to the run's sink.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_REPLAY_H
#define TOOLS_REPLAY_H

#include "core/run/run.h"
#include "core/wire/pcap.h"

struct replay {
    const struct rig *rig;
    struct run *run;
    void *memory;
    struct message_sink sink;
    int port;           /* only datagrams to this one; 0 = all         */
    bool port_is_given; /* else a capture of ours is taken whole        */
    bool is_begun, is_ours, is_ended;
    int64_t line_ns; /* how far the line is known to have come      */
    uint64_t n_fed, n_other_port;
    uint64_t n_starts, n_gaps, n_other_rig, n_drops; /* control records */
};

/* ST_NOMEM when the run does not fit into memory.  The rig must outlive it. */
status replay_init(struct replay *r, const struct rig *rig, int port,
                   struct message_sink sink) MUST_USE;
void replay_fini(struct replay *r);

void replay_take(struct replay *r, const struct pcap_record *record);

/* The end of the capture: what is still open settles. */
void replay_end(struct replay *r);

#endif
