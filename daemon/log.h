/* log.h - logfmt lines on stderr: what the operator must know.
 *
 *     t=2026-05-04T10:00:00.123Z level=warn msg="..."
 *
 * Under a service manager's journal the priority goes in front and the time
 * is left out.  A site that may repeat uses log_often: once per second, with
 * how many were left out.  Nobody waits for a stderr that is not read: the
 * line is left out.  Any thread may call; a site belongs to one thread.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_LOG_H
#define DAEMON_LOG_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

void log_info(const char *fmt, ...) __attribute__((format(printf, 1, 2)));
void log_warn(const char *fmt, ...) __attribute__((format(printf, 1, 2)));

/* Bytes as they are, at the end of a run: waits 100 ms at most for a reader
 * that stands still, then gives up and returns false. */
bool log_text(const char *text, size_t len);

/* One per site, static and zero at first. */
struct log_site {
    int64_t last_s;
    uint64_t n_left_out;
};

/* Says how many were left out if a second has passed; call it now and then. */
void log_flush(struct log_site *site, const char *what);

void log_often(struct log_site *site, const char *fmt, ...)
    __attribute__((format(printf, 2, 3)));

#endif
