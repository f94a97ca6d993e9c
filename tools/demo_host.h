/* demo_host.h - the demo's folder, and a daemon of its own that serves it. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_DEMO_HOST_H
#define TOOLS_DEMO_HOST_H

#include <sys/types.h>

#include "tools/call.h"

struct demo_host {
    char folder[SETTINGS_PATH_SIZE];
    char rig[SETTINGS_PATH_SIZE]; /* its copy there                 */
    char rehearsal[SETTINGS_PATH_SIZE];
    char log[SETTINGS_PATH_SIZE];     /* what the daemon said           */
    char daemon[SETTINGS_PATH_SIZE];  /* the program beside this one    */
    char capture[SETTINGS_PATH_SIZE]; /* the folder, "" without one     */
    pid_t pid;                        /* 0: not running                 */
    int udp_port, tcp_port;
};

/* Makes the folder and copies rig and rehearsal there, both ports 0.  `rig`
 * is a name ("carriage") or a file.  An exit code; says what is wrong. */
int demo_host_prepare(const struct call *call, struct demo_host *h,
                      const char *rig, const char *folder);

/* Starts the daemon and waits until it serves. */
int demo_host_start(const struct call *call, struct demo_host *h);

/* True while the daemon lives; notices its end. */
bool demo_host_lives(struct demo_host *h);

/* Asks it to stop and waits.  True if it ended by itself with status 0. */
bool demo_host_stop(struct demo_host *h);

#endif
