/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/rig.h"

#include <string.h>

#include "core/math/chi2.h"
#include "core/model/component.h"

static int levels_of(const struct rig_kind *kind)
{
    enum block_model model = kind->block[0].model;
    for (int k = 1; k < kind->n_blocks; k++)
        if (kind->block[k].model != model)
            return 0;
    return model == BLOCK_CONSTANT_VELOCITY       ? 2
           : model == BLOCK_CONSTANT_ACCELERATION ? 3
                                                  : 0;
}

static void find_stationary(struct rig_kind *kind)
{
    for (int k = 0; k < kind->n_blocks; k++) {
        const struct block *b = &kind->block[k];
        for (int i = 0; i < b->n; i++) {
            struct rig_state *s = &kind->state[b->at + i];
            s->is_stationary = block_is_stationary(b, i, &s->stationary_mean,
                                                   &s->stationary_u);
        }
    }
}

void rig_prepare_kind(struct rig_kind *kind)
{
    kind->id_len = (int)strlen(kind->id);
    component_build(kind);
    find_stationary(kind);
    kind->levels = kind->n_components > 0 ? 0 : levels_of(kind);
    kind->has_limits = false;
    for (int i = 0; i < kind->n; i++)
        kind->has_limits = kind->has_limits || kind->state[i].good_u > 0 ||
                           kind->state[i].lost_u > 0;
}

void rig_prepare(struct rig *rig)
{
    for (int i = 0; i < rig->n_sensors; i++) {
        struct rig_sensor *s = &rig->sensor[i];
        s->gate[0] = 0;
        for (int m = 1; m <= READS_MAX; m++)
            s->gate[m] = s->has_gate ? chi2_quantile(s->gate_p, m) : 0;
        s->key = rig_key(s->name, strlen(s->name));
    }
    for (int i = 0; i < rig->n_kinds; i++)
        rig_prepare_kind(&rig->kind[i]);
}

double rig_rate_hz(const struct rig *rig)
{
    int n_fixed = 0;
    double rate_hz = 0;
    for (int i = 0; i < rig->n_kinds; i++)
        n_fixed += !rig->kind[i].is_prefix;
    int n_free = rig->max_tracks - n_fixed;
    for (int i = 0; i < rig->n_sensors; i++) {
        bool is_prefix = rig->kind[rig->sensor[i].kind].is_prefix;
        rate_hz +=
            rig->sensor[i].rate_hz * (is_prefix && n_free > 1 ? n_free : 1);
    }
    return rate_hz;
}

int rig_find_sensor(const struct rig *rig, const char *name, size_t len)
{
    int low = 0, high = rig->n_sensors - 1;
    uint64_t key = rig_key(name, len);
    while (low <= high) {
        int middle = (low + high) / 2;
        const struct rig_sensor *s = &rig->sensor[middle];
        int order = key != s->key ? (key < s->key ? -1 : 1)
                                  : rig_compare(name, len, s->name);
        if (order == 0)
            return middle;
        if (order < 0)
            high = middle - 1;
        else
            low = middle + 1;
    }
    return -1;
}

int rig_find_kind(const struct rig *rig, const char *id, size_t len)
{
    int best = -1;
    size_t best_len = 0;
    for (int i = 0; i < rig->n_kinds; i++) {
        const struct rig_kind *k = &rig->kind[i];
        size_t n = (size_t)k->id_len;
        if (n > len || k->id[0] != id[0])
            continue;
        if (!k->is_prefix && n == len && memcmp(id, k->id, n) == 0)
            return i;
        if (k->is_prefix && n <= len && memcmp(id, k->id, n) == 0 &&
            (best < 0 || n > best_len)) {
            best = i;
            best_len = n;
        }
    }
    return best;
}

int rig_pending_quota(const struct rig *rig, const struct rig_sensor *s)
{
    if (rig->max_pending > 0)
        return rig->max_pending;
    double window_s = (double)(rig->horizon_ns + rig->ahead_ns) * 1e-9;
    double quota = 4 * s->rate_hz * window_s + 16;
    return quota < 1e6 ? (int)quota : 1000000;
}
