/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/message.h"

#include <stddef.h>

const char *datagram_outcome_text(enum datagram_outcome o)
{
    switch (o) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        DATAGRAM_OUTCOMES(X)
#undef X
    case DATAGRAM_OUTCOME_COUNT:
        break;
    }
    return "";
}

const char *outcome_text(enum outcome o)
{
    switch (o) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        OUTCOMES(X)
#undef X
    case OUTCOME_COUNT:
        break;
    }
    return "";
}

const char *tally_text(enum tally t)
{
    switch (t) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        TALLIES(X)
#undef X
    case TALLY_COUNT:
        break;
    }
    return "";
}

const char *verdict_text(enum verdict v)
{
    switch (v) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        VERDICTS(X)
#undef X
    case VERDICT_COUNT:
        break;
    }
    return "";
}

const char *reason_code_text(enum reason_code c)
{
    switch (c) {
#define X(name, code, text, remedy)                                            \
    case name:                                                                 \
        return code;
        REASONS(X)
#undef X
    case REASON_COUNT:
        break;
    }
    return "";
}

const char *reason_meaning(enum reason_code c)
{
    switch (c) {
#define X(name, code, text, remedy)                                            \
    case name:                                                                 \
        return text;
        REASONS(X)
#undef X
    case REASON_COUNT:
        break;
    }
    return "";
}

const char *reason_remedy(enum reason_code c)
{
    switch (c) {
#define X(name, code, text, remedy)                                            \
    case name:                                                                 \
        return remedy;
        REASONS(X)
#undef X
    case REASON_COUNT:
        break;
    }
    return "";
}

const char *event_text(enum event_kind e)
{
    switch (e) {
#define X(name, text)                                                          \
    case name:                                                                 \
        return text;
        EVENTS(X)
#undef X
    case EVENT_COUNT:
        break;
    }
    return "";
}
