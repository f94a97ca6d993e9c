/* err.h - an error as text: where, what, the limit, the remedy.
 *
 * One sentence, lower case, no full stop: "place: key: value problem limit;
 * remedy".  struct err carries one; struct problems collects all that a rig
 * file has, each with its line, a caret and a hint.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_ERR_H
#define CONFIG_ERR_H

#include <stddef.h>

#include "core/math/status.h"

struct err {
    status code;
    char text[512];
};

/* Fills *e (if not NULL) and returns `code`, so that callers can write
 * `return err_set(err, ST_IO, "%s: cannot open: %s", path, reason);` */
status err_set(struct err *e, status code, const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));

/* A growing text of whole reports, as `check` prints them. */
struct problems {
    int n;
    size_t len, size;
    char *text; /* NUL-terminated, owned */
};

void problems_init(struct problems *p);
void problems_fini(struct problems *p);

#endif
