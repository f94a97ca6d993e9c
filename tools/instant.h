/* instant.h - times and addresses as people write them. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_INSTANT_H
#define TOOLS_INSTANT_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

/* Realtime now, ns since 1970. */
int64_t instant_now_ns(void);

/* "2026-03-01T10:00:00Z" or decimal seconds since 1970 ("12.5"), exactly: no
 * double in between.  False for anything else, and beyond +-292 years. */
bool instant_parse(const char *text, size_t len, int64_t *t_ns);

/* Whole nanoseconds of the whole text; false if it is anything else. */
bool instant_parse_ns(const char *text, size_t len, int64_t *t_ns);

#endif
