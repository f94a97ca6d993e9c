/* encode.h - messages to JSON Lines or MessagePack maps with the same keys.
 *
 * Numbers print as the shortest text that reads back as the same double.
 * Never NaN or Inf: what is not a number yet is null.  The key order is
 * fixed, so equal messages give equal bytes.  Times are RFC 3339 text in JSON
 * and timestamps (extension -1) in MessagePack.
 *
 * Every function writes whole messages only.  It returns the length, without
 * a terminator, or 0 when `size` does not suffice; JSON ends in '\n'.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_ENCODE_H
#define CORE_WIRE_ENCODE_H

#include <stddef.h>

#include "core/model/message.h"

enum { ENGINE_NUMBER = 2 };

enum wire_form { WIRE_JSON, WIRE_MSGPACK };

enum { WIRE_TEXT_MAX = 1000 };

/* Enough for any one message of this rig in either form, and for any one
 * piece of a summary; a build, reason, word or sentence handed in may have
 * up to WIRE_TEXT_MAX bytes. */
size_t wire_message_bound(const struct rig *rig);

/* An estimate, event or counts message. */
size_t wire_encode(const struct rig *rig, const struct message *m,
                   enum wire_form form, char *buf, size_t size);

/* The first message of every connection and replay: rig, wire, engine
 * number, build, rig-file hash, tracks with state names and units, layout of
 * P, sensors. */
size_t wire_encode_description(const struct rig *rig, const char *build,
                               enum wire_form form, char *buf, size_t size);

size_t wire_encode_heartbeat(int64_t t_ns, uint64_t skipped,
                             enum wire_form form, char *buf, size_t size);
size_t wire_encode_bye(const char *reason, enum wire_form form, char *buf,
                       size_t size);

/* A host message: what only the machine can know.  `what` is a word (start,
 * stop, drops, gap, skipped, clock), `text` a sentence, `n` a number. */
size_t wire_encode_host(int64_t t_ns, const char *what, const char *text,
                        uint64_t n, enum wire_form form, char *buf,
                        size_t size);

/* The last message of a replay: counts, then any number of tracks.  JSON
 * only; each piece is appended by the caller. */
size_t wire_summary_begin(const struct rig *rig, const struct counts *c,
                          char *buf, size_t size);
size_t wire_summary_track(const struct rig *rig, const struct track_summary *t,
                          bool is_first, char *buf, size_t size);
size_t wire_summary_end(char *buf, size_t size);

/* "2001-09-09T01:46:40.000000000Z"; buf holds at least 31 bytes.  Returns 30.
 */
size_t wire_print_time(int64_t t_ns, char *buf);

/* Shortest text that reads back as x ("0.1", "1e+22"); "null" if x is not
 * finite.  buf holds at least 32 bytes.  Returns the length. */
size_t wire_print_number(double x, char *buf);

#endif
