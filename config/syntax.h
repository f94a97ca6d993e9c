/* syntax.h - is a text sound JSON (RFC 8259)?
 *
 * Stricter than the parser behind it: no leading zeros, no raw control
 * characters in strings, no number beyond a double, nothing after the end.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_SYNTAX_H
#define CONFIG_SYNTAX_H

#include <stdbool.h>
#include <stddef.h>

/* True if sound.  Otherwise *at is the byte of the first fault and *what says
 * "fault; remedy".  The text ends with a NUL. */
bool syntax_check(const char *text, size_t *at, const char **what);

#endif
