/* writer.h - one message, JSON or MessagePack, from one sequence of calls.
 *
 * What is written calls these functions once; the form decides the bytes.
 * So the two forms cannot differ in keys, order or content:
 *
 *   value            JSON                        MessagePack
 *   number           shortest text               float 64
 *   count            digits                      shortest unsigned integer
 *   time             RFC 3339, UTC, 9 decimals   timestamp (extension -1)
 *   not a number     null                        nil
 *   text             escaped                     str
 *
 * Text that is no valid UTF-8 gets U+FFFD for each bad byte.  Nothing is
 * written past `size`; a message that does not fit is void as a whole.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_WRITER_H
#define CORE_WIRE_WRITER_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "core/wire/encode.h"

enum { WRITER_DEPTH_MAX = 8 };

struct writer_level {
    size_t head; /* where the map or array begins                        */
    uint32_t n;  /* keys of a map, values of an array                    */
    bool is_map;
};

struct writer {
    enum wire_form form;
    char *buf;
    size_t size, used;
    bool is_full; /* something did not fit                            */
    bool is_after_key;
    int depth;
    struct writer_level level[WRITER_DEPTH_MAX];
};

void writer_init(struct writer *w, enum wire_form form, char *buf, size_t size);

/* Goes on inside a map whose beginning stands elsewhere. */
void writer_init_inside(struct writer *w, char *buf, size_t size,
                        bool is_first);

/* Length of the bytes so far, 0 if they did not fit. */
size_t writer_length(const struct writer *w);

/* Ends the message (JSON: '\n'); all maps and arrays are closed.  Length, 0
 * if it did not fit. */
size_t writer_finish(struct writer *w);

void writer_open_map(struct writer *w);
void writer_open_array(struct writer *w);
void writer_close(struct writer *w);

/* A key of ours: needs no escape, below 32 bytes. */
void writer_key(struct writer *w, const char *key);
/* A key that comes from data. */
void writer_name(struct writer *w, const char *name);

void writer_text(struct writer *w, const char *s);
void writer_number(struct writer *w, double x);
void writer_count(struct writer *w, uint64_t v);
void writer_time(struct writer *w, int64_t t_ns);
void writer_bool(struct writer *w, bool b);
void writer_null(struct writer *w);

#endif
