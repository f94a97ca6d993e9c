/* SPDX-License-Identifier: Apache-2.0 */
#include "core/run/run.h"

#include "core/engine/arena.h"
#include "core/engine/engine.h"
#include "core/wire/decode.h"

#define TICK_NS   10000000
#define SECOND_NS 1000000000

struct run {
    const struct rig *rig;
    struct engine *engine;
    int64_t next_tick_ns, last_a_ns, last_tick_ns;
    const char *refusal;
    struct wire_decoder decoder;
};

static size_t round_up(size_t bytes)
{
    return (bytes + ARENA_ALIGN - 1) / ARENA_ALIGN * ARENA_ALIGN;
}

size_t run_bytes(const struct rig *rig)
{
    return round_up(sizeof(struct run)) + engine_bytes(rig);
}

struct run *run_init(void *memory, size_t bytes, const struct rig *rig,
                     struct message_sink sink)
{
    if (bytes < run_bytes(rig))
        return NULL;
    struct run *r = memory;
    memset(r, 0, sizeof *r);
    r->rig = rig;
    r->engine = engine_init((char *)memory + round_up(sizeof *r), rig, sink);
    return r;
}

static void begin_line(struct run *r, int64_t line_ns)
{
    r->last_a_ns = r->last_tick_ns = line_ns;
    r->next_tick_ns = (line_ns / TICK_NS + 1) * TICK_NS;
}

void run_start(struct run *r, int64_t line_ns)
{
    begin_line(r, line_ns);
    engine_start(r->engine, line_ns);
}

void run_advance(struct run *r, int64_t line_ns)
{
    while (r->next_tick_ns <= line_ns) {
        int64_t tick_ns = r->next_tick_ns;
        engine_tick(r->engine, tick_ns);
        if (tick_ns % SECOND_NS == 0)
            engine_say_counts(r->engine, tick_ns);
        r->last_tick_ns = tick_ns;
        r->next_tick_ns = tick_ns + TICK_NS;
    }
}

int64_t run_arrival(const struct run *r, int64_t a_ns)
{
    int64_t least =
        r->last_a_ns > r->last_tick_ns ? r->last_a_ns : r->last_tick_ns;
    return a_ns > least ? a_ns : least;
}

static bool is_inside(const struct rig_network *network,
                      const struct sender *from)
{
    if (network->family != from->family)
        return false;
    for (int bit = 0; bit < network->bits; bit++) {
        int mask = 0x80 >> (bit % 8);
        if ((network->address[bit / 8] ^ from->address[bit / 8]) & mask)
            return false;
    }
    return true;
}

static bool is_allowed(const struct rig *rig, const struct sender *from)
{
    for (int i = 0; i < rig->n_senders; i++)
        if (is_inside(&rig->sender[i], from))
            return true;
    return rig->n_senders == 0;
}

int64_t run_feed(struct run *r, int64_t a_ns, const struct sender *from,
                 const uint8_t *bytes, size_t len)
{
    a_ns = run_arrival(r, a_ns);
    r->last_a_ns = a_ns;
    run_advance(r, a_ns);
    engine_begin(r->engine, a_ns);
    struct counts *counts = engine_counts(r->engine);
    r->refusal = NULL;
    if (!is_allowed(r->rig, from)) {
        counts->datagrams[DATAGRAM_NOT_ALLOWED]++;
        r->refusal = "the sender is not in receive.senders: add its network";
        return a_ns;
    }
    struct wire_decoder *d = &r->decoder;
    enum datagram_outcome o = wire_decode(d, bytes, len);
    counts->datagrams[o]++;
    r->refusal = d->reason;
    if (o != DATAGRAM_DECODED)
        return a_ns;
    counts->bad_elements += (uint64_t)d->n_bad;
    for (int i = 0; i < d->n; i++)
        engine_take(r->engine, &d->element[i], from);
    if (engine_last_refusal(r->engine))
        r->refusal = engine_last_refusal(r->engine);
    engine_end(r->engine);
    return a_ns;
}

void run_stop(struct run *r, int64_t line_ns)
{
    run_advance(r, line_ns);
    engine_finish(r->engine);
}

void run_reanchor(struct run *r, int64_t line_ns)
{
    begin_line(r, line_ns);
    engine_reanchor(r->engine, line_ns);
}

void run_count_datagram(struct run *r, enum datagram_outcome outcome)
{
    engine_counts(r->engine)->datagrams[outcome]++;
}

const struct counts *run_counts(struct run *r)
{
    return engine_counts(r->engine);
}

const char *run_last_refusal(const struct run *r)
{
    return r->refusal;
}

bool run_track_summary(struct run *r, int i, struct track_summary *out)
{
    return engine_track_summary(r->engine, i, out);
}

uint64_t run_steps(const struct run *r)
{
    return engine_steps(r->engine);
}
