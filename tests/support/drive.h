/* drive.h - a run under test: a rig from text, datagrams in, lines out. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_SUPPORT_DRIVE_H
#define TESTS_SUPPORT_DRIVE_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "config/load.h"
#include "core/run/run.h"

struct drive {
    struct settings *settings;
    struct run *run;
    void *memory;
    char *line; /* scratch of one encoded message                */
    size_t line_size;
    char *live, *settled, *all; /* what was said, as JSON lines           */
    size_t n_live, n_settled, n_all, size;
    bool keeps_text;         /* false: count only                             */
    uint64_t n_estimates[2]; /* by stream                                 */
    const struct estimate *last; /* newest estimate of `stream_kept`       */
    void (*on_message)(void *ctx, const struct message *m);
    void *ctx;
};

/* Fails the test with all problems if the rig does not load. */
void drive_init(struct drive *d, const char *rig_text);
void drive_fini(struct drive *d);

/* Begins the line. */
void drive_start(struct drive *d, int64_t line_ns);

/* One datagram from 127.0.0.1 made by printf. */
void drive_feed(struct drive *d, int64_t a_ns, const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));

/* The bytes as they are. */
void drive_feed_bytes(struct drive *d, int64_t a_ns, const void *bytes,
                      size_t len);

uint64_t drive_total(struct drive *d, enum outcome o);

/* Both ledgers: outcomes sum to `n_measurements`, sensors to the total (less
 * unknown ones), datagrams to `n_datagrams`. */
void drive_check_ledgers(struct drive *d, uint64_t n_measurements,
                         uint64_t n_datagrams);

#endif
