/* ingest.h - the run and everything that feeds it, on one thread.
 *
 * datagram -> arrival on the line -> recorder -> run -> hub.  It never waits
 * for anybody.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_INGEST_H
#define DAEMON_INGEST_H

#include "core/run/run.h"
#include "daemon/hub.h"
#include "daemon/receive.h"
#include "daemon/recorder.h"

struct ingest;

/* Builds the run, begins the line and listens on the loop.  The hub and the
 * recorder (NULL: no capture) must outlive it; `at` gets the port in use. */
status ingest_start(struct ingest **in, uv_loop_t *loop,
                    const struct settings *s, struct line_reading now,
                    struct hub *hub, struct recorder *recorder,
                    struct endpoint *at, struct err *err) MUST_USE;

/* Takes what is in the socket, settles the rest, records `stop`. */
void ingest_finish(struct ingest *in);

struct run *ingest_run(struct ingest *in);
struct receive *ingest_receive(struct ingest *in);

/* After ingest_finish; the loop must run until its handles are closed. */
void ingest_close(struct ingest *in);
void ingest_free(struct ingest *in);

#endif
