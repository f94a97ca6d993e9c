/* pages.h - memory for a run.
 *
 * A run walks through all of its memory once per horizon; with pages of 4 KiB
 * looking up where they lie costs more than the work.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_PAGES_H
#define DAEMON_PAGES_H

#include <stddef.h>

/* At least `bytes`, aligned for any use, in large pages where the system has
 * them; NULL if memory is short.  Freed with free. */
void *pages_new(size_t bytes);

#endif
