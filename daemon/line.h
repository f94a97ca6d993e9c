/* line.h - the arrival line: realtime at the start plus monotonic elapsed.
 *
 * Whatever the host's clock does, the line runs on evenly.  A step of that
 * clock is noticed and told; the caller re-anchors.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_LINE_H
#define DAEMON_LINE_H

#include <stdbool.h>
#include <stdint.h>

/* Both clocks, read together. */
struct line_reading {
    int64_t real_ns, mono_ns;
};

struct line {
    int64_t real0_ns, mono0_ns;
    int64_t off_since_ns; /* monotonic; 0 = the clocks agree              */
};

/* The clocks of this host. */
struct line_reading line_read(void);

void line_start(struct line *l, struct line_reading now);

/* Where the line is. */
int64_t line_now(const struct line *l, struct line_reading now);

/* When a datagram arrived whose kernel stamp (realtime) is stamp_ns: the line
 * at `now` less the age of the stamp, at most 1 s back. */
int64_t line_arrival(const struct line *l, struct line_reading now,
                     int64_t stamp_ns);

/* True when the host's clock has been off the line by more than 100 ms for
 * more than 2 s: it was stepped. */
bool line_is_stepped(struct line *l, struct line_reading now);

#endif
