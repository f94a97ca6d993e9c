/* tcp.h - TCP lines: subscribers of the hub, each with a bounded queue.
 *
 * A subscriber says in one line within 200 ms what it wants, or gets every
 * live estimate as JSON lines.  Whoever asked for `every` and is slow loses
 * messages beyond its queue and is told how many; whoever asked for `newest`
 * gets the newest estimate of each track when its socket has room.
 *
 * All calls are the hub's, on its loop.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_TCP_H
#define DAEMON_TCP_H

#include "daemon/endpoint.h"
#include "daemon/subscriber.h"

enum {
    TCP_TRACKS_MAX = 4096,
    TCP_ANYTHING = 4 /* bit of tcp_interest: anybody there at all     */
};

struct tcp;

/* What the hub does for a connection. */
struct tcp_host {
    /* The description in this form; owned by the caller afterwards. */
    struct shared *(*description)(void *ctx, enum wire_form form);
    /* Somebody came, changed what he wants, or left. */
    void (*interest)(void *ctx);
    struct pool *pool;
    void *ctx;
};

status tcp_start(struct tcp **t, uv_loop_t *loop, struct endpoint *at,
                 int max_subscribers, struct tcp_host host,
                 struct err *err) MUST_USE;

/* A message that may be conflated carries its track's number, others -1. */
struct tcp_offer {
    struct shared *bytes[2]; /* by form; NULL where nobody wants it        */
    const char *track;       /* "" = concerns everybody                    */
    int number;
    int stream; /* of an estimate, -1 for anything else       */
};

void tcp_offer(struct tcp *t, const struct tcp_offer *offer);

/* Does anybody want it in this form? */
bool tcp_wants(const struct tcp *t, enum wire_form form, int stream,
               const char *track);

/* Streams that anybody wants, bit by bit, and TCP_ANYTHING; who has not asked
 * yet wants all. */
unsigned tcp_interest(const struct tcp *t);

/* Sends what is queued, as far as the sockets take it. */
void tcp_flush(struct tcp *t);

/* Every few milliseconds: rates, heartbeats, deadlines; sends what is due. */
void tcp_tick(struct tcp *t, int64_t now_ms);

/* The same number of skipped messages for everybody: lost before the hub. */
void tcp_skipped(struct tcp *t, uint64_t n);

/* True when every queue is sent. */
bool tcp_is_drained(const struct tcp *t);
void tcp_bye(struct tcp *t, const char *reason);
void tcp_close(struct tcp *t);

#endif
