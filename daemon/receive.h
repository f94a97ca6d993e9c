/* receive.h - the UDP socket: stamped by the kernel, read in batches.
 *
 * The clock is read before each batch; when the socket turns out empty, time
 * is known to have reached that reading less 5 ms, and never more: so a
 * stall or a backlog restamps nothing.  At most RECEIVE_BATCHES batches are
 * taken per wake, so that nothing else on the loop starves.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_RECEIVE_H
#define DAEMON_RECEIVE_H

#include <uv.h>

#include "daemon/endpoint.h"
#include "daemon/line.h"

enum {
    RECEIVE_SLOTS = 64,
    RECEIVE_SLOT_SIZE = 65536, /* a merged buffer is never cut             */
    RECEIVE_BATCHES = 4
};

/* Who takes what comes in. */
struct receive_taker {
    /* One datagram; `now` was read before the batch, stamp_ns is the kernel's
     * realtime stamp. */
    void (*datagram)(void *ctx, struct line_reading now, int64_t stamp_ns,
                     const struct sender *from, const uint8_t *bytes,
                     size_t len);
    /* The socket was empty at `now`. */
    void (*empty)(void *ctx, struct line_reading now);
    void *ctx;
};

struct receive_counts {
    uint64_t n_cut;     /* longer than a slot                           */
    uint64_t n_dropped; /* by the kernel, socket buffer full            */
    uint64_t n_merged;  /* merged buffers split                         */
    uint64_t n_errors;  /* reads that failed otherwise                  */
};

struct receive;

/* Binds and begins to listen on the loop.  `at` gets the port in use. */
status receive_start(struct receive **r, uv_loop_t *loop, struct endpoint *at,
                     int64_t buffer_bytes, struct receive_taker taker,
                     struct err *err) MUST_USE;

/* As if the socket had woken the loop: takes what is there, or finds it empty
 * and so lets time pass. */
void receive_look(struct receive *r);

/* Takes what is in the socket, until it is empty, but not for ever. */
void receive_drain(struct receive *r);

/* Counts; asks the kernel for its drops. */
struct receive_counts receive_counts(struct receive *r);

/* Socket buffer that was granted, in bytes. */
int receive_buffer(const struct receive *r);

void receive_close(struct receive *r);

#endif
