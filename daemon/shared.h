/* shared.h - encoded bytes that several subscribers send.
 *
 * Counted references to pooled buffers: in steady state nothing is asked of
 * the heap.  A pool and its buffers belong to one thread.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_SHARED_H
#define DAEMON_SHARED_H

#include <stddef.h>

enum {
    POOL_SIZES = 4,                 /* 512 B, 2, 8, 32 KiB               */
    POOL_KEPT_MAX = 8 * 1024 * 1024 /* bytes kept for the next ones      */
};

struct pool {
    struct shared *unused[POOL_SIZES];
    size_t kept;
};

struct shared {
    struct pool *pool;
    struct shared *next; /* among the unused                             */
    int n_users;
    int place; /* which size of the pool, POOL_SIZES = none    */
    size_t len;
    char bytes[];
};

/* All zero is an empty pool. */
void pool_fini(struct pool *p);

/* A copy of the bytes with one user, or NULL. */
struct shared *shared_new(struct pool *p, const char *bytes, size_t len);

/* One user less; NULL is fine. */
void shared_drop(struct shared *s);

#endif
