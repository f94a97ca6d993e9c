/* segment.h - one file of a capture, and its copy of the rig file. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_SEGMENT_H
#define DAEMON_SEGMENT_H

#include "config/load.h"

enum { SEGMENT_BUFFER = 256 * 1024 };

struct segment {
    int fd; /* -1: none open                               */
    char path[SETTINGS_PATH_SIZE + 64];
    uint64_t written;    /* bytes of the file                           */
    int64_t begun_ns;    /* arrival line                                */
    size_t used;         /* of the buffer                               */
    uint64_t n_buffered; /* records in it                               */
    bool is_dirty;       /* written since the last sync                 */
    uint8_t buffer[SEGMENT_BUFFER];
};

/* Begins FOLDER/<start>-<number>.pcap and its rig copy beside it; the number
 * is the next free one after *number, which it becomes. */
status segment_open(struct segment *g, const struct settings *s,
                    int64_t start_ns, int *number, int64_t line_ns,
                    struct err *err) MUST_USE;

/* Buffers one record; writes when the buffer is full. */
status segment_put(struct segment *g, const void *bytes, size_t len,
                   struct err *err) MUST_USE;
status segment_flush(struct segment *g, struct err *err) MUST_USE;
status segment_sync(struct segment *g, struct err *err) MUST_USE;

/* Also takes back a file that nothing was written to. */
void segment_close(struct segment *g);

#endif
