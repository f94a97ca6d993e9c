/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/element.h"

/* Constant lengths, so that each comparison is two loads. */
#define IS_KEY(at, name) (memcmp(at, name, sizeof name - 1) == 0)

static enum element_key key_of_one(char c)
{
    switch (c) {
    case 't':
        return ELEMENT_T;
    case 'u':
        return ELEMENT_U;
    case 'v':
        return ELEMENT_V;
    case 'z':
        return ELEMENT_Z;
    default:
        return ELEMENT_OTHER;
    }
}

enum element_key element_key(const char *at, size_t len)
{
    switch (len) {
    case 1:
        return key_of_one(at[0]);
    case 2:
        return IS_KEY(at, "ns") ? ELEMENT_NS : ELEMENT_OTHER;
    case 3:
        return IS_KEY(at, "seq")   ? ELEMENT_SEQ
               : IS_KEY(at, "cov") ? ELEMENT_COV
                                   : ELEMENT_OTHER;
    case 4:
        return IS_KEY(at, "mark")   ? ELEMENT_MARK
               : IS_KEY(at, "name") ? ELEMENT_NAME
               : IS_KEY(at, "text") ? ELEMENT_TEXT
               : IS_KEY(at, "tick") ? ELEMENT_TICK
                                    : ELEMENT_OTHER;
    case 5:
        return IS_KEY(at, "track") ? ELEMENT_TRACK : ELEMENT_OTHER;
    case 6:
        return IS_KEY(at, "sensor") ? ELEMENT_SENSOR : ELEMENT_OTHER;
    case 7:
        return IS_KEY(at, "samples") ? ELEMENT_SAMPLES : ELEMENT_OTHER;
    default:
        return ELEMENT_OTHER;
    }
}
