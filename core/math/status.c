/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/status.h"

const char *status_text(status code)
{
    switch (code) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        STATUS_LIST(X)
#undef X
    case ST_COUNT:
        break;
    }
    return "unknown status";
}
