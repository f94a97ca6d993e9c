/* arena.h - one block of memory handed out in order, never given back.
 *
 * The same code lays out the engine and measures what it will need: an arena
 * without memory only counts.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_ARENA_H
#define CORE_ENGINE_ARENA_H

#include <stddef.h>
#include <string.h>

enum { ARENA_ALIGN = 64 };

struct arena {
    char *memory; /* NULL: count only */
    size_t used;
};

/* Zeroed, aligned to ARENA_ALIGN; NULL while counting. */
static inline void *arena_take(struct arena *a, size_t bytes)
{
    size_t at = a->used;
    a->used += (bytes + ARENA_ALIGN - 1) / ARENA_ALIGN * ARENA_ALIGN;
    return a->memory ? memset(a->memory + at, 0, bytes) : NULL;
}

#endif
