/* run.h - the pure state machine that every driver drives.
 *
 * A run has two inputs: feed(a, sender, bytes), one datagram with its arrival
 * time, and advance(T), time has reached T.  What it says is a pure function
 * of the rig and of that sequence of calls: no clock, socket, file, thread,
 * random seed or environment, and no allocation after run_init.  Hence replay
 * is live.
 *
 * The arrival line is int64 ns.  Ticks are the multiples of 10 ms since 1970
 * on it, the first strictly after the start; counts go out at ticks divisible
 * by 1 s.  feed(a) runs every tick <= a, then takes the datagram; advance(T)
 * runs every tick <= T.
 *
 * Not thread-safe; distinct runs are independent.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_RUN_RUN_H
#define CORE_RUN_RUN_H

#include <stddef.h>

#include "core/model/message.h"

struct run;

/* Memory that a run of this rig needs, for ever. */
size_t run_bytes(const struct rig *rig);

/* Builds a run inside `memory` (at least run_bytes, aligned to 64).  The rig
 * must outlive it.  NULL when bytes are too few. */
struct run *run_init(void *memory, size_t bytes, const struct rig *rig,
                     struct message_sink sink);

/* Begins the arrival line.  Call once, first. */
void run_start(struct run *r, int64_t line_ns);

/* Takes one datagram that arrived at a_ns; returns the a that was used: never
 * before the last arrival or tick.  `bytes` may be read up to len only. */
int64_t run_feed(struct run *r, int64_t a_ns, const struct sender *from,
                 const uint8_t *bytes, size_t len);

/* The a that run_feed would use: what the recorder writes. */
int64_t run_arrival(const struct run *r, int64_t a_ns);

void run_advance(struct run *r, int64_t line_ns);

/* Ends the line: advances to line_ns, then settles the rest. */
void run_stop(struct run *r, int64_t line_ns);

/* The line jumps to line_ns: everything settles, tracks restart. */
void run_reanchor(struct run *r, int64_t line_ns);

/* Adds datagrams that the host refused before the run saw them. */
void run_count_datagram(struct run *r, enum datagram_outcome outcome);

/* Counts as they stand; valid until the next call on this run. */
const struct counts *run_counts(struct run *r);

/* Why the last datagram was refused, or NULL; a sentence with the remedy. */
const char *run_last_refusal(const struct run *r);

/* The i-th track in byte order of ids; false past the last. */
bool run_track_summary(struct run *r, int i, struct track_summary *out);

/* Filter steps taken so far, first and repeated ones: what tests count. */
uint64_t run_steps(const struct run *r);

#endif
