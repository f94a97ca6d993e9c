/* decode.h - one datagram, MessagePack or JSON, to measurements.
 *
 * Wire 1: a map, or an array of maps (DEVELOPERS.md, "Datagrams").  The first
 * byte tells the encoding: '{' or '[' (after blanks) is JSON, a MessagePack
 * map or array otherwise.  A trailing newline or NULs are accepted.
 *
 * Nothing is allocated and nothing is believed: lengths, depth and element
 * counts are bounded before they are used.  Text in the result points into
 * the datagram or into the decoder, and lives until the next call.
 *
 * An array whose syntax is sound gives all its good elements; the bad ones
 * are counted.  Broken syntax anywhere spoils the whole datagram.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_DECODE_H
#define CORE_WIRE_DECODE_H

#include <stddef.h>

#include "core/model/message.h"
#include "core/wire/pattern.h"

enum {
    WIRE_VERSION = 1,
    WIRE_ELEMENTS_MAX = 1024, /* elements of one datagram                 */
    WIRE_DEPTH_MAX = 8,
    WIRE_SCRATCH_SIZE = 4096 /* unescaped texts of one datagram          */
};

/* All zero before the first call. */
struct wire_decoder {
    int n;              /* good elements                            */
    int n_bad;          /* bad elements of an array                 */
    const char *reason; /* why the datagram or the first bad element
                           was refused, with the remedy; NULL if none */
    int at;             /* byte offset that the reason belongs to   */
    struct measurement element[WIRE_ELEMENTS_MAX + 1]; /* one to work on  */
    char scratch[WIRE_SCRATCH_SIZE];
    int scratch_used;
    struct pattern pattern[PATTERNS]; /* of MessagePack datagrams before   */
};

/* DATAGRAM_DECODED when at least one element is good; DATAGRAM_MALFORMED or
 * DATAGRAM_WRONG_VERSION with d->reason otherwise.  The bytes need no
 * terminator. */
enum datagram_outcome wire_decode(struct wire_decoder *d, const uint8_t *bytes,
                                  size_t len);

/* True for [A-Za-z0-9][A-Za-z0-9_.:-]{0,62}. */
bool wire_is_id(const char *s, size_t len);

/* RFC 3339 with up to 9 decimals and Z or an offset, to ns since 1970;
 * false if it is anything else or outside the years 1678..2261. */
bool wire_parse_time(const char *s, size_t len, int64_t *t_ns);

/* A finite decimal number of the whole text, correctly rounded. */
bool wire_parse_number(const char *s, size_t len, double *value);

#endif
