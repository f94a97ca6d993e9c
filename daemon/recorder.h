/* recorder.h - every accepted datagram to disk, without making anybody wait.
 *
 * Ingest copies the record into a bounded ring, no system call; a thread of
 * its own writes segments.  A full disk, an error or a slow disk never stops
 * fusion: what could not be kept is counted, told, and the next segment
 * begins with a gap record.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_RECORDER_H
#define DAEMON_RECORDER_H

#include "config/load.h"
#include "core/wire/pcap.h"

struct recorder;

/* Told from the writer's thread; `n` records are concerned. */
struct recorder_watch {
    void (*gap)(void *ctx, const char *why, uint64_t n);
    void *ctx;
};

/* Makes the folder, begins the first segment and the thread. */
status recorder_start(struct recorder **r, const struct settings *s,
                      int64_t line_ns, struct recorder_watch watch,
                      struct err *err) MUST_USE;

/* One datagram; false when the ring was full and it is lost to the capture. */
bool recorder_put(struct recorder *r, int64_t a_ns, const struct sender *from,
                  const struct sender *to, const uint8_t *payload, size_t len);

bool recorder_control(struct recorder *r, enum control_kind kind,
                      int64_t line_ns, uint64_t n, const char *text);

/* Writes all that is in the ring, syncs, closes, ends the thread. */
void recorder_stop(struct recorder *r);

/* Where the current segment is. */
const char *recorder_folder(const struct recorder *r);

/* Seconds that the disk lasts at this many bytes a second, down to the
 * floor; -1 if the disk does not say. */
double recorder_lasts_s(const struct settings *s, double bytes_per_s);

#endif
