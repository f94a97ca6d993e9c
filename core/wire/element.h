/* element.h - one element of a datagram, whatever its encoding.
 *
 * Both decoders turn a key and its value into element_set; what a key means
 * and what it may hold stands here once.  The first thing that is wrong with
 * an element is kept as its reason.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_ELEMENT_H
#define CORE_WIRE_ELEMENT_H

#include <stddef.h>

#include "core/model/message.h"

enum element_key {
    ELEMENT_SENSOR,
    ELEMENT_TRACK,
    ELEMENT_Z,
    ELEMENT_T,
    ELEMENT_NS,
    ELEMENT_SEQ,
    ELEMENT_U,
    ELEMENT_COV,
    ELEMENT_MARK,
    ELEMENT_NAME,
    ELEMENT_TEXT,
    ELEMENT_V,
    ELEMENT_SAMPLES,
    ELEMENT_TICK,
    ELEMENT_OTHER
};

enum value_kind {
    VALUE_NULL,
    VALUE_BOOL,
    VALUE_INT,    /* i                                                     */
    VALUE_UINT,   /* u, above what an int64 holds                          */
    VALUE_DOUBLE, /* d                                                     */
    VALUE_FLOAT,  /* d, came as 32 bits                                    */
    VALUE_TEXT,   /* text                                                  */
    VALUE_TIME,   /* i: ns since 1970                                      */
    VALUE_LIST,   /* n numbers or nulls, the first READS_MAX in list       */
    VALUE_OTHER   /* a map, bytes, a list of something else                */
};

struct value {
    enum value_kind kind;
    int64_t i;
    uint64_t u;
    double d;
    struct text text;
    int n;
    double list[READS_MAX];
};

struct element {
    struct measurement *m; /* where it is put together                   */
    uint32_t seen;         /* bit per key                                */
    bool is_wrong_version;
    const char *reason; /* NULL while all is well                     */
    int here, at;       /* byte offset of the key in work, of reason  */
};

void element_begin(struct element *e, struct measurement *m);

/* Says that the element is wrong; only the first reason is kept. */
void element_wrong(struct element *e, const char *reason);

/* ELEMENT_OTHER is ignored with all that it holds. */
enum element_key element_key(const char *at, size_t len);
void element_set(struct element *e, enum element_key k, const struct value *v);

/* Checks the whole; false with e->reason when it is no measurement. */
bool element_end(struct element *e);

/* Seconds since 1970 to the nearest ns; false where that is no stamp. */
bool element_seconds(double s, int64_t *t_ns);

/* The value as a number, NaN for null; false for anything else. */
bool value_number(const struct value *v, double *number);

#endif
