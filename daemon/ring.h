/* ring.h - a bounded queue of byte records from one thread to one other.
 *
 * The writer never waits: a record that does not fit is refused and counted
 * by the caller.  Records are a multiple of 8 bytes long and stand in one
 * piece.  Each side writes its own cursor only.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_RING_H
#define DAEMON_RING_H

#include <stdatomic.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "core/math/status.h"

struct ring {
    uint8_t *bytes;
    size_t size;                      /* a power of two                   */
    _Alignas(64) _Atomic size_t head; /* written up to here               */
    size_t tail_seen;                 /* writer's copy of tail            */
    _Alignas(64) _Atomic size_t tail; /* read up to here                  */
    size_t head_seen;                 /* reader's copy of head            */
};

/* `size` is rounded up to a power of two; the memory is touched at once. */
status ring_init(struct ring *r, size_t size) MUST_USE;
void ring_fini(struct ring *r);

/* Room for len bytes in one piece, or NULL.  Only the writer calls this. */
void *ring_reserve(struct ring *r, size_t len);

/* Makes the reserved record visible; len as reserved or less. */
void ring_commit(struct ring *r, size_t len);

/* The oldest record and its length, or NULL.  Only the reader calls this. */
const void *ring_front(struct ring *r, size_t *len);
void ring_pop(struct ring *r);

/* Bytes waiting, roughly: for whoever watches. */
size_t ring_used(struct ring *r);

#endif
