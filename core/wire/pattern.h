/* pattern.h - datagrams that look like one before them, read at known places.
 *
 * A sender puts the same keys in the same order into every datagram; only the
 * values differ.  A pattern keeps one such datagram with a mask over its
 * values: when all unmasked bytes of the next one agree, the values are read
 * where they stood.  What is read is what decode_msgpack would give; where a
 * value is in any doubt the pattern does not match, and decode_msgpack judges.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_PATTERN_H
#define CORE_WIRE_PATTERN_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "core/wire/element.h"

enum {
    PATTERNS = 8, /* one per length modulo this                            */
    PATTERN_LEN_MIN = 8,
    PATTERN_LEN_MAX = 128,
    PATTERN_HOLES_MAX = 6
};

struct pattern {
    uint8_t len; /* 0: none                                                */
    uint8_t n_holes;
    bool is_learning;
    struct pattern_hole {
        uint8_t key, kind, len; /* enum element_key, enum value_kind        */
        uint8_t at;             /* of the value's first byte after its type */
    } hole[PATTERN_HOLES_MAX];
    uint8_t bytes[PATTERN_LEN_MAX], mask[PATTERN_LEN_MAX];
};

/* Fills *m if the datagram matches; false leaves *m undefined. */
bool pattern_read(const struct pattern *p, const uint8_t *bytes, size_t len,
                  struct measurement *m);

/* Learns while a datagram of one map is decoded: begin, then each key's value
 * with the bytes [from, to) that hold it, then end if all was good. */
void pattern_begin(struct pattern *p, const uint8_t *bytes, size_t len);
void pattern_note(struct pattern *p, enum element_key key,
                  const struct value *v, const uint8_t *bytes, size_t from,
                  size_t to);
void pattern_end(struct pattern *p, size_t len);

#endif
