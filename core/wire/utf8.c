/* UTF-8 [RFC 3629]. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/decode_form.h"

/* One character from s[*i] on, which is not ASCII. */
static bool is_utf8_character(const uint8_t *s, size_t len, size_t *i)
{
    static const uint32_t least[] = {0, 0x80, 0x800, 0x10000};
    uint8_t c = s[(*i)++];
    int more = c >= 0xf0 ? 3 : c >= 0xe0 ? 2 : 1;
    if (c < 0xc2 || c > 0xf4 || len - *i < (size_t)more)
        return false;
    uint32_t code = c & (0x3fu >> more);
    for (int k = 0; k < more; k++, (*i)++) {
        if ((s[*i] & 0xc0) != 0x80)
            return false;
        code = code << 6 | (s[*i] & 0x3fu);
    }
    return code >= least[more] && code <= 0x10ffff &&
           (code < 0xd800 || code > 0xdfff);
}

bool decode_is_utf8_beyond_ascii(const uint8_t *s, size_t len)
{
    for (size_t i = 0; i < len;) {
        if (s[i] < 0x80)
            i++;
        else if (!is_utf8_character(s, len, &i))
            return false;
    }
    return true;
}

int decode_put_utf8(char *out, uint32_t code)
{
    if (code < 0x80) {
        out[0] = (char)code;
        return 1;
    }
    int n = code < 0x800 ? 2 : code < 0x10000 ? 3 : 4;
    static const uint8_t lead[] = {0, 0, 0xc0, 0xe0, 0xf0};
    for (int i = n - 1; i > 0; i--, code >>= 6)
        out[i] = (char)(0x80 | (code & 0x3f));
    out[0] = (char)(lead[n] | code);
    return n;
}
