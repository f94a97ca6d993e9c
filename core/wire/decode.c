/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/decode.h"

#include <string.h>

#include "core/wire/decode_form.h"

/* 1: may stand first in an id; 2: only later. */
static const uint8_t id_letter[256] = {
    ['-'] = 2, ['.'] = 2, [':'] = 2, ['_'] = 2, ['0'] = 1, ['1'] = 1, ['2'] = 1,
    ['3'] = 1, ['4'] = 1, ['5'] = 1, ['6'] = 1, ['7'] = 1, ['8'] = 1, ['9'] = 1,
    ['A'] = 1, ['B'] = 1, ['C'] = 1, ['D'] = 1, ['E'] = 1, ['F'] = 1, ['G'] = 1,
    ['H'] = 1, ['I'] = 1, ['J'] = 1, ['K'] = 1, ['L'] = 1, ['M'] = 1, ['N'] = 1,
    ['O'] = 1, ['P'] = 1, ['Q'] = 1, ['R'] = 1, ['S'] = 1, ['T'] = 1, ['U'] = 1,
    ['V'] = 1, ['W'] = 1, ['X'] = 1, ['Y'] = 1, ['Z'] = 1, ['a'] = 1, ['b'] = 1,
    ['c'] = 1, ['d'] = 1, ['e'] = 1, ['f'] = 1, ['g'] = 1, ['h'] = 1, ['i'] = 1,
    ['j'] = 1, ['k'] = 1, ['l'] = 1, ['m'] = 1, ['n'] = 1, ['o'] = 1, ['p'] = 1,
    ['q'] = 1, ['r'] = 1, ['s'] = 1, ['t'] = 1, ['u'] = 1, ['v'] = 1, ['w'] = 1,
    ['x'] = 1, ['y'] = 1, ['z'] = 1};

bool wire_is_id(const char *s, size_t len)
{
    if (len == 0 || len > 63 || id_letter[(uint8_t)s[0]] != 1)
        return false;
    bool is_good = true;
    for (size_t i = 1; i < len; i++)
        is_good &= id_letter[(uint8_t)s[i]] != 0;
    return is_good;
}

void decode_begin(struct wire_decoder *d, struct element *e)
{
    element_begin(e, &d->element[d->n]);
}

void decode_take(struct wire_decoder *d, struct element *e,
                 bool *is_wrong_version)
{
    if (element_end(e) && d->n < WIRE_ELEMENTS_MAX) {
        d->n++;
        return;
    }
    d->n_bad++;
    *is_wrong_version = *is_wrong_version || e->is_wrong_version;
    if (d->reason)
        return;
    element_wrong(e, "more than 1024 elements in one datagram: send several");
    d->reason = e->reason;
    d->at = e->at;
}

enum datagram_outcome wire_decode(struct wire_decoder *d, const uint8_t *bytes,
                                  size_t len)
{
    bool is_wrong_version = false;
    d->n = d->n_bad = d->at = d->scratch_used = 0;
    d->reason = NULL;
    while (len > 0 &&
           bytes[0] < 0x80 && /* MessagePack may end in such a byte */
           (bytes[len - 1] == 0 || bytes[len - 1] == '\n' ||
            bytes[len - 1] == '\r'))
        len--;
    if (len == 0) {
        d->reason = "the datagram is empty: send a map or an object";
        return DATAGRAM_MALFORMED;
    }
    const char *broken = bytes[0] < 0x80
                             ? decode_json(d, bytes, len, &is_wrong_version)
                             : decode_msgpack(d, bytes, len, &is_wrong_version);
    if (broken) {
        d->n = 0;
        d->reason = broken;
        return DATAGRAM_MALFORMED;
    }
    if (d->n > 0)
        return DATAGRAM_DECODED;
    if (!d->reason)
        d->reason = "an empty list: send at least one element";
    return is_wrong_version ? DATAGRAM_WRONG_VERSION : DATAGRAM_MALFORMED;
}
