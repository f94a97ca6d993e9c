/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/shared.h"

#include <stdlib.h>
#include <string.h>

static size_t size_of(int place)
{
    return (size_t)512 << (2 * place);
}

void pool_fini(struct pool *p)
{
    for (int i = 0; i < POOL_SIZES; i++) {
        while (p->unused[i]) {
            struct shared *s = p->unused[i];
            p->unused[i] = s->next;
            free(s);
        }
    }
    p->kept = 0;
}

static struct shared *take(struct pool *p, size_t len)
{
    int place = 0;
    while (place < POOL_SIZES && size_of(place) < len)
        place++;
    struct shared *s = place < POOL_SIZES ? p->unused[place] : NULL;
    if (s) {
        p->unused[place] = s->next;
        p->kept -= size_of(place);
        return s;
    }
    s = malloc(sizeof *s + (place < POOL_SIZES ? size_of(place) : len));
    if (s) {
        s->pool = p;
        s->place = place;
    }
    return s;
}

struct shared *shared_new(struct pool *p, const char *bytes, size_t len)
{
    struct shared *s = take(p, len);
    if (!s)
        return NULL;
    s->n_users = 1;
    s->len = len;
    memcpy(s->bytes, bytes, len);
    return s;
}

void shared_drop(struct shared *s)
{
    if (!s || --s->n_users > 0)
        return;
    struct pool *p = s->pool;
    if (s->place == POOL_SIZES || p->kept + size_of(s->place) > POOL_KEPT_MAX) {
        free(s);
        return;
    }
    s->next = p->unused[s->place];
    p->unused[s->place] = s;
    p->kept += size_of(s->place);
}
