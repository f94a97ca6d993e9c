/* status.h - what a function that can fail returns.
 *
 * The texts come from the same list, so they cannot drift from the codes.
 * Errors with a place and a remedy (struct err) are made in config/err.h;
 * core only says which kind of thing went wrong.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_STATUS_H
#define CORE_MATH_STATUS_H

#define STATUS_LIST(X)                                                         \
    X(ST_OK, "ok")                                                             \
    X(ST_ARG, "argument out of range")                                         \
    X(ST_NOTPD, "matrix is not positive definite")                             \
    X(ST_PARSE, "malformed input")                                             \
    X(ST_SCHEMA, "value not allowed by the settings table")                    \
    X(ST_IO, "input/output error")                                             \
    X(ST_NOMEM, "out of memory")                                               \
    X(ST_FULL, "a table or queue is full")                                     \
    X(ST_LATER, "not built yet")

typedef enum {
#define X(name, text) name,
    STATUS_LIST(X)
#undef X
        ST_COUNT
} status;

#define MUST_USE __attribute__((warn_unused_result))

/* One lower-case phrase, never NULL. */
const char *status_text(status code);

#endif
