/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/due.h"

#include <stdbool.h>
#include <string.h>

#include "core/model/rig.h"

void due_init(struct due *d, int n)
{
    d->n = n;
    for (int i = 0; i < n; i++) {
        d->heap[i] = d->at[i] = i;
        d->time[i] = DUE_NEVER;
    }
}

static bool is_before(const struct due *d, int32_t a, int32_t b)
{
    if (d->time[a] != d->time[b] || d->time[a] == DUE_NEVER)
        return d->time[a] < d->time[b];
    if (d->key[a] != d->key[b])
        return d->key[a] < d->key[b];
    return strcmp(d->id[a], d->id[b]) < 0;
}

static void put(struct due *d, int i, int32_t place)
{
    d->heap[i] = place;
    d->at[place] = i;
}

static void up(struct due *d, int i, int32_t place)
{
    while (i > 0 && is_before(d, place, d->heap[(i - 1) / 2])) {
        put(d, i, d->heap[(i - 1) / 2]);
        i = (i - 1) / 2;
    }
    put(d, i, place);
}

static void down(struct due *d, int i, int32_t place)
{
    for (;;) {
        int child = 2 * i + 1;
        if (child + 1 < d->n &&
            is_before(d, d->heap[child + 1], d->heap[child]))
            child++;
        if (child >= d->n || !is_before(d, d->heap[child], place))
            break;
        put(d, i, d->heap[child]);
        i = child;
    }
    put(d, i, place);
}

void due_set(struct due *d, int place, int64_t time_ns)
{
    int64_t was = d->time[place];
    if (was == time_ns)
        return;
    d->time[place] = time_ns;
    if (was == DUE_NEVER)
        d->key[place] = rig_key(d->id[place], strlen(d->id[place]));
    if (time_ns < was)
        up(d, d->at[place], place);
    else
        down(d, d->at[place], place);
}
