/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/decode.h"

#include <string.h>

#include "core/wire/decode_form.h"

bool wire_is_id(const char *s, size_t len)
{
    if (len == 0 || len > 63)
        return false;
    for (size_t i = 0; i < len; i++) {
        char c = s[i];
        bool is_word = (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') ||
                       (c >= '0' && c <= '9');
        bool is_joint = c == '_' || c == '.' || c == ':' || c == '-';
        if (!is_word && !(is_joint && i > 0))
            return false;
    }
    return true;
}

bool decode_is_utf8(const uint8_t *s, size_t len)
{
    for (size_t i = 0; i < len;) {
        uint8_t c = s[i++];
        if (c < 0x80)
            continue;
        int more = c >= 0xf0 ? 3 : c >= 0xe0 ? 2 : 1;
        static const uint32_t least[] = {0, 0x80, 0x800, 0x10000};
        if (c < 0xc2 || c > 0xf4 || len - i < (size_t)more)
            return false;
        uint32_t code = c & (0x3fu >> more);
        for (int k = 0; k < more; k++, i++) {
            if ((s[i] & 0xc0) != 0x80)
                return false;
            code = code << 6 | (s[i] & 0x3fu);
        }
        if (code < least[more] || code > 0x10ffff ||
            (code >= 0xd800 && code <= 0xdfff))
            return false;
    }
    return true;
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
    if (!d->reason)
        d->reason = e->reason ? e->reason
                              : "more than 1024 elements in one datagram: send "
                                "several";
}

enum datagram_outcome wire_decode(struct wire_decoder *d, const uint8_t *bytes,
                                  size_t len)
{
    bool is_wrong_version = false;
    d->n = d->n_bad = d->at = d->scratch_used = 0;
    d->reason = NULL;
    while (len > 0 && (bytes[len - 1] == 0 || bytes[len - 1] == '\n' ||
                       bytes[len - 1] == '\r') &&
           (bytes[0] < 0x80)) /* MessagePack may end in such a byte */
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
