/* engine.h - measurements in, estimates and verdicts out.
 *
 * The engine knows no bytes: core/run decodes datagrams, calls
 *     engine_begin(a); engine_take(m) for each element; engine_end()
 * and runs the ticks.  Outputs are a pure function of the rig and of that
 * sequence of calls.  What belongs to a state changes only at measurements,
 * in canonical order; ticks release, settle, judge and speak.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_ENGINE_H
#define CORE_ENGINE_ENGINE_H

#include <stddef.h>

#include "core/model/message.h"

struct engine;

size_t engine_bytes(const struct rig *rig);

/* Builds an engine in `memory` (engine_bytes, aligned to 64). */
struct engine *engine_init(void *memory, const struct rig *rig,
                           struct message_sink sink);

void engine_start(struct engine *e, int64_t line_ns);

/* Engine time becomes a_ns; what is due goes in and settles. */
void engine_begin(struct engine *e, int64_t a_ns);

/* Judges one element at the door; accepted ones wait for engine_end. */
void engine_take(struct engine *e, const struct measurement *m,
                 const struct sender *from);

/* Lays what the datagram brought, once per track, and says it. */
void engine_end(struct engine *e);

/* One tick of the arrival line. */
void engine_tick(struct engine *e, int64_t tick_ns);

/* The end of the line: everything goes in and settles. */
void engine_finish(struct engine *e);

/* Everything settles, then tracks restart on a line that begins at line_ns. */
void engine_reanchor(struct engine *e, int64_t line_ns);

/* The ledger; datagram outcomes are counted into it by the caller. */
struct counts *engine_counts(struct engine *e);

/* Says the counts as of t_ns. */
void engine_say_counts(struct engine *e, int64_t t_ns);

/* Why the last measurement was refused, or NULL. */
const char *engine_last_refusal(const struct engine *e);

bool engine_track_summary(struct engine *e, int i, struct track_summary *out);
uint64_t engine_steps(const struct engine *e);

#endif
