/* Whatever arrives: no crash, and what decodes keeps its bounds. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>

#include "core/wire/decode.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t len);

static struct wire_decoder d;

static void check_text(const struct text *t, const uint8_t *data, size_t len)
{
    const char *from = (const char *)data, *end = from + len;
    int is_inside = t->at >= from && t->at + t->len <= end;
    int is_scratch = t->at >= d.scratch &&
                     t->at + t->len <= d.scratch + WIRE_SCRATCH_SIZE;
    if (t->len < 0 || (t->len > 0 && !is_inside && !is_scratch))
        abort();
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t len)
{
    enum datagram_outcome o = wire_decode(&d, data, len);
    if ((o == DATAGRAM_DECODED) != (d.n > 0) || d.n > WIRE_ELEMENTS_MAX)
        abort();
    if (o != DATAGRAM_DECODED && !d.reason)
        abort();
    for (int i = 0; i < d.n; i++) {
        const struct measurement *m = &d.element[i];
        check_text(&m->sensor, data, len);
        check_text(&m->track, data, len);
        check_text(&m->name, data, len);
        check_text(&m->note, data, len);
        if (m->mark == MARK_NONE &&
            !wire_is_id(m->sensor.at, (size_t)m->sensor.len))
            abort();
        if (m->n_z < 0 || m->n_u < 0 || m->n_u > READS_MAX)
            abort();
    }
    return 0;
}
