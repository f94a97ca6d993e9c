/* board.h - the newest estimate of every track as a small table for people.
 *
 * It reads the daemon's JSON lines.  Redrawing moves the cursor up over what
 * was drawn before; nothing else on the terminal is touched.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_BOARD_H
#define TOOLS_BOARD_H

#include <stdbool.h>
#include <stdio.h>

struct board;

/* NULL when memory is out. */
struct board *board_new(void);
void board_free(struct board *board);

/* Takes one line, with or without its newline; what is no message of ours is
 * passed over. */
void board_take(struct board *board, const char *line);

/* The connection ended: what is shown is no longer current. */
void board_close(struct board *board);

void board_draw(struct board *board, FILE *to, bool in_style);

#endif
