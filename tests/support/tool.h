/* tool.h - the tool as a process: words and input in, text and status out.
 *
 * Every test has a folder of its own, made and removed by a checked fixture.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_SUPPORT_TOOL_H
#define TESTS_SUPPORT_TOOL_H

#include <stddef.h>
#include <sys/types.h>

enum { TOOL_OUTPUT_MAX = 4 << 20 };

/* What the last run wrote to standard output and standard error. */
extern char tool_out[TOOL_OUTPUT_MAX], tool_said[TOOL_OUTPUT_MAX];
extern size_t tool_out_len;

extern char tool_folder[];
void tool_folder_make(void);
void tool_folder_remove(void);

/* A small rig, and a table of measurements that it reads but for one row. */
extern const char tool_rig[], tool_table[];

/* A path in the folder; 64 may be in use at once. */
const char *tool_path(const char *name);
const char *tool_write(const char *name, const char *text);
size_t tool_read(const char *path, char *buf);

/* Runs the tool with these words, NULL last; the exit status. */
int tool_run(const char *input, ...);
#define TOOL(...) tool_run("", __VA_ARGS__, NULL)

pid_t tool_start(const char *const argv[], const char *input);
int tool_end(pid_t pid);

#endif
