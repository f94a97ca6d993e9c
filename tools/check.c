/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/check.h"

#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "core/run/run.h"
#include "tools/import.h"

#define CHECK_START_NS 1000000000000000000 /* 2001-09-09 */

enum {
    CHECK_WALL_NS = 60000000, /* how long the trial may take              */
    CHECK_SLICE_NS = 1000000, /* steps of the made-up time                */
    CHECK_SPAN_S = 60
};

static int64_t cpu_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
    return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

static void say_nothing(void *ctx, const struct message *m)
{
    (void)ctx;
    (void)m;
}

/* One datagram of a sensor that reads 1 everywhere. */
static size_t made_up(const struct rig *rig, int sensor, int64_t t_ns,
                      char *buf, size_t size)
{
    const struct rig_sensor *s = &rig->sensor[sensor];
    const struct rig_kind *kind = &rig->kind[s->kind];
    char id[RIG_ID_SIZE + 1];
    struct measurement m = {.has_t = s->stamp != RIG_STAMP_ARRIVAL,
                            .t_ns = t_ns,
                            .n_z = s->reads.m};
    m.sensor = (struct text){s->name, (int)strlen(s->name)};
    if (kind->is_prefix) {
        memcpy(id, kind->id, strlen(kind->id));
        id[strlen(kind->id)] = '1';
        m.track = (struct text){id, (int)strlen(kind->id) + 1};
    }
    for (int i = 0; i < m.n_z; i++)
        m.z[i] = (1 - s->shift[i]) / s->scale[i];
    return import_encode(&m, buf, size);
}

double check_cost_s(const struct rig *rig)
{
    struct sender from = {4, {127, 0, 0, 1}, 49152};
    if (rig->n_senders > 0) {
        from.family = rig->sender[0].family;
        memcpy(from.address, rig->sender[0].address, sizeof from.address);
    }
    size_t bytes = (run_bytes(rig) + 63) / 64 * 64;
    void *memory = aligned_alloc(64, bytes);
    struct message_sink sink = {say_nothing, NULL, NULL};
    struct run *r = memory == NULL ? NULL : run_init(memory, bytes, rig, sink);
    if (r == NULL) {
        free(memory);
        return 0;
    }
    double due[RIG_SENSORS_MAX] = {0};
    char buf[1024];
    uint64_t n = 0;
    run_start(r, CHECK_START_NS);
    int64_t began = cpu_ns(), now = began;
    for (int64_t dt_ns = 0; now - began < CHECK_WALL_NS &&
                            dt_ns < (int64_t)CHECK_SPAN_S * 1000000000;
         dt_ns += CHECK_SLICE_NS) {
        for (int i = 0; i < rig->n_sensors; i++) {
            due[i] += rig->sensor[i].rate_hz * CHECK_SLICE_NS * 1e-9;
            for (; due[i] >= 1; due[i]--, n++) {
                int64_t a_ns = CHECK_START_NS + dt_ns;
                size_t len = made_up(rig, i, a_ns, buf, sizeof buf);
                run_feed(r, a_ns, &from, (const uint8_t *)buf, len);
            }
        }
        if (dt_ns % (16 * CHECK_SLICE_NS) == 0)
            now = cpu_ns();
    }
    now = cpu_ns();
    free(memory);
    return n == 0 ? 0 : (double)(now - began) * 1e-9 / (double)n;
}
