/* message.h - what a run takes and what it says, as plain structs.
 *
 * The wire turns bytes into `struct measurement` and messages into bytes; the
 * engine knows neither.  A message is one flat run of bytes that starts with
 * struct message, so a driver may copy it through a ring and encode it later.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_MESSAGE_H
#define CORE_MODEL_MESSAGE_H

#include <stdbool.h>
#include <stdint.h>

#include "core/model/rig.h"

/* Bytes inside somebody else's buffer; not NUL-terminated.  len 0 = absent. */
struct text {
    const char *at;
    int len;
};

enum mark_kind { MARK_NONE, MARK_START, MARK_STOP, MARK_ZERO, MARK_NOTE };

/* One element of a datagram, decoded but not yet believed. */
struct measurement {
    struct text sensor, track;
    enum mark_kind mark;    /* not MARK_NONE: a run mark, no reading  */
    struct text name, note; /* of a mark                              */
    bool has_t, has_seq;
    int64_t t_ns; /* stamp, UTC since 1970                  */
    uint64_t seq;
    int n_z;             /* components of z; 0: `z` was null       */
    double z[READS_MAX]; /* NaN = no reading of that component     */
    int n_u;             /* reported u: how many, 0 = none         */
    double u[READS_MAX];
    bool has_cov;
};

/* --- ledgers ------------------------------------------------------------ */

#define DATAGRAM_OUTCOMES(X)                                                   \
    X(DATAGRAM_DECODED, "decoded")                                             \
    X(DATAGRAM_MALFORMED, "malformed")                                         \
    X(DATAGRAM_WRONG_VERSION, "wrong-version")                                 \
    X(DATAGRAM_NOT_ALLOWED, "not-allowed")                                     \
    X(DATAGRAM_BAD_KEY, "bad-key")                                             \
    X(DATAGRAM_OVER_QUOTA, "over-quota")

/* In order of precedence from the right: where several refusals hold, the
 * last one of this list is the outcome. */
#define OUTCOMES(X)                                                            \
    X(OUTCOME_USED, "used")                                                    \
    X(OUTCOME_GATED, "gated")                                                  \
    X(OUTCOME_WITHHELD, "withheld")                                            \
    X(OUTCOME_PENDING, "pending")                                              \
    X(OUTCOME_NO_READING, "no-reading")                                        \
    X(OUTCOME_DUPLICATE, "duplicate")                                          \
    X(OUTCOME_TOO_LATE, "too-late")                                            \
    X(OUTCOME_TOO_EARLY, "too-early")                                          \
    X(OUTCOME_NO_STAMP, "no-stamp")                                            \
    X(OUTCOME_WRONG_SIZE, "wrong-size")                                        \
    X(OUTCOME_IMPLAUSIBLE, "implausible")                                      \
    X(OUTCOME_UNKNOWN_SENSOR, "unknown-sensor")                                \
    X(OUTCOME_UNKNOWN_TRACK, "unknown-track")                                  \
    X(OUTCOME_OVER_QUOTA, "over-quota")

/* Beside the outcomes; they sum to nothing. */
#define TALLIES(X)                                                             \
    X(TALLY_LATE, "late")                                                      \
    X(TALLY_SEQ_CONFLICT, "seq-conflict")                                      \
    X(TALLY_LOST, "lost")                                                      \
    X(TALLY_U_IGNORED, "u-ignored")

enum datagram_outcome {
#define X(name, text) name,
    DATAGRAM_OUTCOMES(X)
#undef X
        DATAGRAM_OUTCOME_COUNT
};

enum outcome {
#define X(name, text) name,
    OUTCOMES(X)
#undef X
        OUTCOME_COUNT
};

enum tally {
#define X(name, text) name,
    TALLIES(X)
#undef X
        TALLY_COUNT
};

const char *datagram_outcome_text(enum datagram_outcome o);
const char *outcome_text(enum outcome o);
const char *tally_text(enum tally t);

struct ledger {
    uint64_t outcome[OUTCOME_COUNT];
    uint64_t tally[TALLY_COUNT];
};

/* --- verdicts and reasons ------------------------------------------------ */

#define VERDICTS(X)                                                            \
    X(VERDICT_STARTING, "starting")                                            \
    X(VERDICT_GOOD, "good")                                                    \
    X(VERDICT_COASTING, "coasting")                                            \
    X(VERDICT_DOUBTFUL, "doubtful")                                            \
    X(VERDICT_LOST, "lost")

enum verdict {
#define X(name, text) name,
    VERDICTS(X)
#undef X
        VERDICT_COUNT
};

/* One table: code, what it means, what to do.  Printed as `code:subject`. */
#define REASONS(X)                                                             \
    X(REASON_SILENT, "silent", "nothing heard from this sensor",               \
      "check its power, cable, address and port")                              \
    X(REASON_U, "u", "standard uncertainty above its limit",                   \
      "wait, add a sensor, or widen the limit in good.u or lost.u")            \
    X(REASON_UNDETERMINED, "undetermined",                                     \
      "no measurement says anything about this state yet",                     \
      "wait for more sensors, or give the state a start")                      \
    X(REASON_REFUSED, "refused",                                               \
      "the last measurements of this sensor were refused by the gate",         \
      "compare its reading, unit and u with the others")                       \
    X(REASON_SET_ASIDE, "set-aside",                                           \
      "this sensor is refused while others are believed",                      \
      "compare its reading, unit and u with the others: either may be wrong")

enum reason_code {
#define X(name, code, text, remedy) name,
    REASONS(X)
#undef X
        REASON_COUNT
};

const char *verdict_text(enum verdict v);
const char *reason_code_text(enum reason_code c);
const char *reason_meaning(enum reason_code c);
const char *reason_remedy(enum reason_code c);

/* The subject is a sensor (SILENT, REFUSED) or a state of the track's kind. */
struct reason {
    uint8_t code;
    int16_t subject;
};

/* --- messages ------------------------------------------------------------ */

enum message_type { MESSAGE_ESTIMATE, MESSAGE_EVENT, MESSAGE_COUNTS };

struct message {
    uint32_t bytes; /* whole message, a multiple of 8              */
    uint16_t type;
    uint16_t kind;           /* the track's kind, or 0xffff                 */
    char track[RIG_ID_SIZE]; /* "" where no track is meant                */
};

enum stream { STREAM_LIVE, STREAM_SETTLED };

enum { MESSAGE_REASONS_MAX = 8 };

struct estimate {
    struct message head;
    uint64_t n;            /* per track and stream, from 1                */
    int64_t t_ns;          /* the instant that x belongs to               */
    int64_t arrived_ns;    /* live only                                   */
    uint64_t undetermined; /* bit i: nothing has determined state i; its x,
                              u and P are not numbers yet                 */
    double nis;            /* of the last measurement in canonical order  */
    uint32_t rerun;        /* live only: steps laid again                 */
    int16_t sensor;        /* of that measurement                         */
    uint8_t dof;
    uint8_t accepted;
    uint8_t stream, verdict, n_why, n_states;
    struct reason why[MESSAGE_REASONS_MAX];
    double v[]; /* x: n_states, then ud: UD_SIZE(n_states)     */
};

#define EVENTS(X)                                                              \
    X(EVENT_SILENT, "silent")                                                  \
    X(EVENT_BACK, "back")                                                      \
    X(EVENT_VERDICT, "verdict")                                                \
    X(EVENT_REFUSALS, "refusals")                                              \
    X(EVENT_WIDENED, "widened")                                                \
    X(EVENT_RESTART, "restart")                                                \
    X(EVENT_TRACK, "track")                                                    \
    X(EVENT_SET_ASIDE, "set-aside")                                            \
    X(EVENT_TAKEN_BACK, "taken-back")                                          \
    X(EVENT_RETIRED, "retired")                                                \
    X(EVENT_REANCHOR, "reanchor")                                              \
    X(EVENT_MARK, "mark")

enum event_kind {
#define X(name, text) name,
    EVENTS(X)
#undef X
        EVENT_COUNT
};

const char *event_text(enum event_kind e);

struct event {
    struct message head;
    int64_t t_ns;
    uint8_t event;        /* enum event_kind                             */
    uint8_t mark;         /* enum mark_kind, for EVENT_MARK              */
    uint8_t verdict, was; /* for EVENT_VERDICT                           */
    int16_t sensor;       /* -1: none                                    */
    uint8_t n_why;
    struct reason why[MESSAGE_REASONS_MAX];
    char name[RIG_ID_SIZE]; /* of a mark                                  */
    char note[200];
};

struct counts {
    struct message head;
    int64_t t_ns;
    uint64_t datagrams[DATAGRAM_OUTCOME_COUNT];
    uint64_t marks;
    uint64_t bad_elements; /* elements of arrays that decoded to nothing  */
    struct ledger total;
    uint32_t n_sensors, unused;
    struct ledger sensor[]; /* by sensor index                            */
};

/* Who sent a datagram. */
struct sender {
    uint8_t family; /* 4 or 6                                      */
    uint8_t address[16];
    uint16_t port;
};

/* Where a run says things.  `m` lives only during the call.  Estimates of a
 * stream that nobody wants need not be made: `wants` (by stream) may change
 * between calls of the run; NULL = both are wanted.  Nothing else depends on
 * it, and numbers `n` run on. */
struct message_sink {
    void (*say)(void *ctx, const struct message *m);
    void *ctx;
    const bool *wants;
};

/* --- the last word of a run, per track ----------------------------------- */

struct sensor_summary {
    uint64_t n, n_accepted;
    double nis_sum, nis_accepted_sum;
};

struct track_summary {
    char id[RIG_ID_SIZE];
    int kind;
    double loglik;         /* over used components, diffuse ones left out */
    uint64_t measurements; /* used                                        */
    const struct sensor_summary *sensor; /* by sensor index               */
};

#endif
