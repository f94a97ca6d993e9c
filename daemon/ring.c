/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/ring.h"

#include <stdlib.h>
#include <string.h>

/* Every record has an 8-byte head: its length; a length of SKIP fills the end
 * of the ring when a record would not stand in one piece. */
enum { HEAD = 8 };
static const uint64_t skip = UINT64_MAX;

static size_t round8(size_t n)
{
    return (n + 7) / 8 * 8;
}

status ring_init(struct ring *r, size_t size)
{
    memset(r, 0, sizeof *r);
    r->size = 4096;
    while (r->size < size)
        r->size *= 2;
    r->bytes = malloc(r->size);
    if (!r->bytes)
        return ST_NOMEM;
    memset(r->bytes, 0, r->size);
    return ST_OK;
}

void ring_fini(struct ring *r)
{
    free(r->bytes);
    r->bytes = NULL;
}

static bool fits(struct ring *r, size_t head, size_t need)
{
    if (r->size - (head - r->tail_seen) >= need)
        return true;
    r->tail_seen = atomic_load_explicit(&r->tail, memory_order_acquire);
    return r->size - (head - r->tail_seen) >= need;
}

void *ring_reserve(struct ring *r, size_t len)
{
    size_t head = atomic_load_explicit(&r->head, memory_order_relaxed);
    size_t need = HEAD + round8(len);
    size_t to_end = r->size - (head & (r->size - 1));
    if (need > r->size / 2)
        return NULL;
    if (need > to_end) {
        if (!fits(r, head, to_end + need))
            return NULL;
        memcpy(r->bytes + (head & (r->size - 1)), &skip, HEAD);
        head += to_end;
        atomic_store_explicit(&r->head, head, memory_order_release);
    } else if (!fits(r, head, need)) {
        return NULL;
    }
    return r->bytes + (head & (r->size - 1)) + HEAD;
}

void ring_commit(struct ring *r, size_t len)
{
    size_t head = atomic_load_explicit(&r->head, memory_order_relaxed);
    uint64_t n = len;
    memcpy(r->bytes + (head & (r->size - 1)), &n, HEAD);
    atomic_store_explicit(&r->head, head + HEAD + round8(len),
                          memory_order_release);
}

const void *ring_front(struct ring *r, size_t *len)
{
    size_t tail = atomic_load_explicit(&r->tail, memory_order_relaxed);
    for (;;) {
        if (tail == r->head_seen) {
            r->head_seen = atomic_load_explicit(&r->head, memory_order_acquire);
            if (tail == r->head_seen)
                return NULL;
        }
        uint64_t n;
        size_t at = tail & (r->size - 1);
        memcpy(&n, r->bytes + at, HEAD);
        if (n != skip) {
            *len = n;
            return r->bytes + at + HEAD;
        }
        tail += r->size - at;
        atomic_store_explicit(&r->tail, tail, memory_order_release);
    }
}

void ring_pop(struct ring *r)
{
    size_t tail = atomic_load_explicit(&r->tail, memory_order_relaxed);
    uint64_t n;
    memcpy(&n, r->bytes + (tail & (r->size - 1)), HEAD);
    atomic_store_explicit(&r->tail, tail + HEAD + round8(n),
                          memory_order_release);
}

size_t ring_used(struct ring *r)
{
    return atomic_load_explicit(&r->head, memory_order_relaxed) -
           atomic_load_explicit(&r->tail, memory_order_relaxed);
}
