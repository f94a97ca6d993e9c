/* Whatever arrives: no crash; what decodes has valid ids, a time in range and
 * counts in bounds; a reason points into the datagram. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>

#include "core/wire/decode.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t len);

enum { Z_COUNT_MAX = 255 };

/* A time that was given as seconds, text or timestamp lies in 1678..2261;
 * only `ns` may use the rest of an int64. */
static const int64_t t_max = 9214646400000000000;

static struct wire_decoder d;

static int was_said_in_ns(const uint8_t *data, size_t len)
{
    for (size_t i = 0; i + 1 < len; i++)
        if ((data[i] == 'n' && data[i + 1] == 's') || data[i] == '\\')
            return 1;
    return 0;
}

static void check_text(const struct text *t, const uint8_t *data, size_t len)
{
    const char *from = (const char *)data, *end = from + len;
    int is_inside = t->at >= from && t->at + t->len <= end;
    int is_scratch =
        t->at >= d.scratch && t->at + t->len <= d.scratch + WIRE_SCRATCH_SIZE;
    if (t->len < 0 || (t->len > 0 && !is_inside && !is_scratch))
        abort();
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t len)
{
    enum datagram_outcome o = wire_decode(&d, data, len);
    if (d.at < 0 || (size_t)d.at > len)
        abort();
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
            (!wire_is_id(m->sensor.at, (size_t)m->sensor.len) ||
             m->n_z > Z_COUNT_MAX))
            abort();
        if (m->track.len > 0 && !wire_is_id(m->track.at, (size_t)m->track.len))
            abort();
        if (m->n_z < 0 || m->n_u < 0 || m->n_u > READS_MAX)
            abort();
        if (m->has_t && (m->t_ns < -t_max || m->t_ns > t_max) &&
            !was_said_in_ns(data, len))
            abort();
    }
    return 0;
}
