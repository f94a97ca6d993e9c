/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/ledger.h"

#include <assert.h>

static void write_datagrams(struct writer *w, const struct counts *c)
{
    uint64_t received = 0;
    for (int i = 0; i < DATAGRAM_OUTCOME_COUNT; i++)
        received += c->datagrams[i];
    writer_open_map(w);
    writer_key(w, "received");
    writer_count(w, received);
    for (int i = 0; i < DATAGRAM_OUTCOME_COUNT; i++) {
        writer_key(w, datagram_outcome_text((enum datagram_outcome)i));
        writer_count(w, c->datagrams[i]);
    }
    writer_close(w);
}

static void write_outcomes(struct writer *w, const struct ledger *l)
{
    writer_open_map(w);
    for (int i = 0; i < OUTCOME_COUNT; i++) {
        writer_key(w, outcome_text((enum outcome)i));
        writer_count(w, l->outcome[i]);
    }
    writer_close(w);
}

static void write_tallies(struct writer *w, const struct ledger *l)
{
    writer_open_map(w);
    for (int i = 0; i < TALLY_COUNT; i++) {
        writer_key(w, tally_text((enum tally)i));
        writer_count(w, l->tally[i]);
    }
    writer_close(w);
}

/* {"total":{..},"sensors":{"laser":{..}}}, left open for more keys. */
static void write_parts(struct writer *w, const struct rig *rig,
                        const struct counts *c,
                        void (*write)(struct writer *, const struct ledger *))
{
    assert(c->n_sensors <= (uint32_t)rig->n_sensors);
    writer_open_map(w);
    writer_key(w, "total");
    write(w, &c->total);
    writer_key(w, "sensors");
    writer_open_map(w);
    for (uint32_t i = 0; i < c->n_sensors; i++) {
        writer_name(w, rig->sensor[i].name);
        write(w, &c->sensor[i]);
    }
    writer_close(w);
}

void ledger_write(struct writer *w, const struct rig *rig,
                  const struct counts *c)
{
    writer_key(w, "datagrams");
    write_datagrams(w, c);
    writer_key(w, "measurements");
    write_parts(w, rig, c, write_outcomes);
    writer_key(w, "tallies");
    write_parts(w, rig, c, write_tallies);
    writer_close(w); /* tallies                                           */
    writer_close(w); /* measurements                                      */
}
