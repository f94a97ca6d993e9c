/* decode_form.h - the two encodings, for decode.c alone. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_DECODE_FORM_H
#define CORE_WIRE_DECODE_FORM_H

#include <string.h>

#include "core/wire/decode.h"
#include "core/wire/element.h"

/* Begins the next element of the decoder's list in place. */
void decode_begin(struct wire_decoder *d, struct element *e);

/* It has ended: it stays in the list or is counted as bad. */
void decode_take(struct wire_decoder *d, struct element *e,
                 bool *is_wrong_version);

/* Both return NULL, or the reason why the syntax is broken, with d->at.  The
 * bytes may end in NULs or line ends. */
const char *decode_json(struct wire_decoder *d, const uint8_t *bytes,
                        size_t len, bool *is_wrong_version);
const char *decode_msgpack(struct wire_decoder *d, const uint8_t *bytes,
                           size_t len, bool *is_wrong_version);

/* True if these bytes are UTF-8 without surrogates or overlong forms. */
bool decode_is_utf8_beyond_ascii(const uint8_t *s, size_t len);

/* The same, quick for the short ASCII texts that keys and ids are: loads
 * that overlap cover any length. */
static inline bool decode_is_utf8(const uint8_t *s, size_t len)
{
    uint64_t all = 0, last = 0;
    uint32_t first4 = 0, last4 = 0;
    if (len >= 8) {
        for (size_t i = 0; i + 8 <= len; i += 8) {
            memcpy(&last, s + i, 8);
            all |= last;
        }
        memcpy(&last, s + len - 8, 8);
        all |= last;
    } else if (len >= 4) {
        memcpy(&first4, s, 4);
        memcpy(&last4, s + len - 4, 4);
        all = first4 | last4;
    } else if (len > 0) {
        all = s[0] | s[len / 2] | s[len - 1];
    }
    return (all & 0x8080808080808080u) == 0 ||
           decode_is_utf8_beyond_ascii(s, len);
}

/* Writes the 1 to 4 bytes of a code point; returns how many. */
int decode_put_utf8(char *out, uint32_t code);

#endif
