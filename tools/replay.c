/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/replay.h"

#include <stdlib.h>
#include <string.h>

#include "daemon/pages.h"

status replay_init(struct replay *r, const struct rig *rig, int port,
                   struct message_sink sink)
{
    size_t bytes = run_bytes(rig);
    *r = (struct replay){.rig = rig, .port = port, .sink = sink};
    r->memory = pages_new(bytes);
    if (r->memory == NULL)
        return ST_NOMEM;
    r->run = run_init(r->memory, bytes, rig, sink);
    return r->run == NULL ? ST_NOMEM : ST_OK;
}

void replay_fini(struct replay *r)
{
    free(r->memory);
    r->memory = NULL;
    r->run = NULL;
}

static void begin(struct replay *r, int64_t line_ns)
{
    run_start(r->run, line_ns);
    r->is_begun = true;
    r->is_ended = false;
    r->line_ns = line_ns;
}

/* A line of its own: the one before settles, and a new run begins. */
static void begin_again(struct replay *r, int64_t line_ns)
{
    replay_end(r);
    r->run = run_init(r->memory, run_bytes(r->rig), r->rig, r->sink);
    begin(r, line_ns);
}

static void take_datagram(struct replay *r, const struct pcap_record *record)
{
    bool may_be_other = r->port_is_given || !r->is_ours;
    if (r->port != 0 && may_be_other && record->to.port != r->port) {
        r->n_other_port++;
        return;
    }
    if (!r->is_begun)
        begin(r, record->a_ns);
    r->line_ns = run_feed(r->run, record->a_ns, &record->from, record->payload,
                          record->len);
    r->n_fed++;
}

static bool is_this_rig(const struct replay *r, const struct text *hash)
{
    size_t len = strlen(r->rig->file_hash);
    return hash->len == 0 || ((size_t)hash->len == len &&
                              memcmp(hash->at, r->rig->file_hash, len) == 0);
}

void replay_take(struct replay *r, const struct pcap_record *record)
{
    if (!r->is_begun && record->control != CONTROL_NONE &&
        record->control != CONTROL_START) {
        r->is_ours = true; /* a later segment alone */
        begin(r, record->line_ns);
    }
    switch (record->control) {
    case CONTROL_NONE:
        take_datagram(r, record);
        return;
    case CONTROL_START:
        r->n_starts++;
        r->is_ours = true;
        r->n_other_rig += !is_this_rig(r, &record->rig);
        if (r->is_begun)
            begin_again(r, record->line_ns);
        else
            begin(r, record->line_ns);
        return;
    case CONTROL_TIME:
        run_advance(r->run, record->line_ns);
        break;
    case CONTROL_REANCHOR:
        run_reanchor(r->run, record->line_ns);
        break;
    case CONTROL_STOP:
        run_stop(r->run, record->line_ns);
        r->is_ended = true;
        break;
    case CONTROL_DROPS:
        r->n_drops += record->n;
        return;
    case CONTROL_GAP:
        r->n_gaps++;
        return;
    case CONTROL_RELOAD:
    case CONTROL_RESUME:
        return;
    }
    r->line_ns = record->line_ns;
}

void replay_end(struct replay *r)
{
    if (!r->is_begun || r->is_ended)
        return;
    run_stop(r->run, r->is_ours ? r->line_ns : r->line_ns + r->rig->horizon_ns);
    r->is_ended = true;
}
