/* process.h - real processes under test: start, wait for ports, end by id. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_SUPPORT_PROCESS_H
#define TESTS_SUPPORT_PROCESS_H

#include <stdbool.h>
#include <stddef.h>
#include <sys/types.h>

/* A fresh folder under /tmp; the caller removes it with folder_remove. */
void folder_make(char *path, size_t size);
void folder_remove(const char *path);

/* Starts argv[0] (found by its path); stdout and stderr go to files, NULL =
 * discarded.  Fails the test if it cannot be started. */
pid_t process_start(char *const argv[], const char *out, const char *err);

/* Waits at most seconds; the exit status, or -1 if it still runs, or
 * 1000 + signal. */
int process_wait(pid_t pid, double seconds);

/* Runs to the end: exit status as above. */
int process_run(char *const argv[], const char *out, const char *err);

struct daemon_ports {
    pid_t pid;
    int udp, tcp;
    char capture[1024];
};

/* Starts ropewalkd on this rig with ports of its own choice and waits until
 * it is ready; logs to FOLDER/daemon.log. */
struct daemon_ports daemon_start(const char *rig, const char *folder);

/* Connected sockets to loopback. */
int connect_tcp(int port);
int connect_udp(int port);

/* The whole file, NUL-terminated; to be freed. */
char *file_read(const char *path, size_t *len);

/* Lines of a JSON Lines text that a comparison of live and replay looks at:
 * without description, heartbeat, bye, summary and host.  In place. */
void lines_said(char *text);

#endif
