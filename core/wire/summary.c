/* The last message of a replay, in pieces: there may be many tracks. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/ledger.h"
#include "core/wire/writer.h"

size_t wire_summary_begin(const struct rig *rig, const struct counts *c,
                          char *buf, size_t size)
{
    struct writer w;
    writer_init(&w, WIRE_JSON, buf, size);
    writer_open_map(&w);
    writer_key(&w, "type");
    writer_text(&w, "summary");
    writer_key(&w, "counts");
    writer_open_map(&w);
    ledger_write(&w, rig, c);
    writer_close(&w);
    writer_key(&w, "tracks");
    writer_open_map(&w);
    return writer_length(&w);
}

static void write_mean(struct writer *w, double sum, uint64_t n)
{
    if (n == 0)
        writer_null(w);
    else
        writer_number(w, sum / (double)n);
}

static void write_nis(struct writer *w, const struct sensor_summary *s)
{
    writer_open_map(w);
    writer_key(w, "mean");
    write_mean(w, s->nis_sum, s->n);
    writer_key(w, "n");
    writer_count(w, s->n);
    writer_key(w, "accepted_mean");
    write_mean(w, s->nis_accepted_sum, s->n_accepted);
    writer_close(w);
}

size_t wire_summary_track(const struct rig *rig, const struct track_summary *t,
                          bool is_first, char *buf, size_t size)
{
    struct writer w;
    writer_init_inside(&w, buf, size, is_first);
    writer_name(&w, t->id);
    writer_open_map(&w);
    writer_key(&w, "loglik");
    writer_number(&w, t->loglik);
    writer_key(&w, "measurements");
    writer_count(&w, t->measurements);
    writer_key(&w, "nis");
    writer_open_map(&w);
    for (int i = 0; i < rig->n_sensors; i++) {
        if (t->sensor[i].n == 0)
            continue; /* it never measured this track                     */
        writer_name(&w, rig->sensor[i].name);
        write_nis(&w, &t->sensor[i]);
    }
    writer_close(&w);
    writer_close(&w);
    return writer_length(&w);
}

size_t wire_summary_end(char *buf, size_t size)
{
    static const char end[3] = "}}\n"; /* of the tracks, of the summary   */
    if (size < sizeof end)
        return 0;
    memcpy(buf, end, sizeof end);
    return sizeof end;
}
