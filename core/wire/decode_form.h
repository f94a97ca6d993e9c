/* decode_form.h - the two encodings, for decode.c alone. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_DECODE_FORM_H
#define CORE_WIRE_DECODE_FORM_H

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
bool decode_is_utf8(const uint8_t *s, size_t len);

#endif
