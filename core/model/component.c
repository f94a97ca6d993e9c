/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/component.h"

#include <string.h>

static int block_of(const struct rig_kind *kind, int state)
{
    int k = 0;
    while (state >= kind->block[k].at + kind->block[k].n)
        k++;
    return k;
}

/* group[k]: the least block that block k is joined to. */
static void join(const struct rig_kind *kind, int *group)
{
    for (int k = 0; k < kind->n_blocks; k++)
        group[k] = k;
    for (int i = 0; i < kind->n_couplings; i++) {
        int a = group[block_of(kind, kind->coupling[i].state)];
        int b = group[block_of(kind, kind->coupling[i].on)];
        int least = a < b ? a : b;
        for (int k = 0; k < kind->n_blocks; k++)
            if (group[k] == a || group[k] == b)
                group[k] = least;
    }
}

static bool is_general(const struct rig_kind *kind, const int *group, int g)
{
    int n_members = 0;
    for (int k = 0; k < kind->n_blocks; k++) {
        if (group[k] != g)
            continue;
        n_members++;
        if (block_is_general(kind->block[k].model))
            return true;
    }
    return n_members > 1;
}

/* One block's part of the system; `first` is its place in the component. */
static void put_block(const struct rig_kind *kind, const struct block *b,
                      int first, int n, double *A, double *W, double *c)
{
    double *at = A + first * n + first, *noise = W + first * n + first;
    if (b->model != BLOCK_LINEAR) {
        block_system(b, n, at, noise, c + first);
        return;
    }
    const double *own = kind->own + b->own;
    memcpy(c + first, own + 2 * b->n * b->n, (size_t)b->n * sizeof *own);
    for (int i = 0; i < b->n; i++) {
        memcpy(at + i * n, own + i * b->n, (size_t)b->n * sizeof *own);
        memcpy(noise + i * n, own + (b->n + i) * b->n,
               (size_t)b->n * sizeof *own);
    }
}

static int member(const struct rig_component *c, int state)
{
    for (int i = 0; i < c->n; i++)
        if (c->state[i] == state)
            return i;
    return -1;
}

static void build_one(struct rig_kind *kind, const int *group, int g,
                      struct rig_component *c)
{
    for (int k = g; k < kind->n_blocks; k++) {
        struct block *b = &kind->block[k];
        b->is_joined = b->is_joined || group[k] == g;
        for (int i = 0; i < b->n && group[k] == g; i++)
            c->state[c->n++] = (int16_t)(b->at + i);
    }
    int n = c->n;
    double *A = kind->system + c->at, *W = A + n * n, *shift = W + n * n;
    for (int k = g; k < kind->n_blocks; k++) {
        const struct block *b = &kind->block[k];
        if (group[k] == g)
            put_block(kind, b, member(c, b->at), n, A, W, shift);
    }
    for (int i = 0; i < kind->n_couplings; i++) {
        const struct rig_coupling *p = &kind->coupling[i];
        int row = member(c, p->state), column = member(c, p->on);
        if (row >= 0 && column >= 0)
            A[row * n + column] += p->rate;
    }
}

void component_build(struct rig_kind *kind)
{
    int group[RIG_BLOCKS_MAX], at = 0;
    kind->n_components = 0;
    memset(kind->component, 0, sizeof kind->component);
    memset(kind->system, 0, sizeof kind->system);
    for (int k = 0; k < kind->n_blocks; k++)
        kind->block[k].is_joined = false;
    join(kind, group);
    for (int g = 0; g < kind->n_blocks; g++) {
        if (group[g] != g || !is_general(kind, group, g))
            continue;
        struct rig_component *c = &kind->component[kind->n_components++];
        c->at = at;
        build_one(kind, group, g, c);
        at += 2 * c->n * c->n + c->n;
    }
}
