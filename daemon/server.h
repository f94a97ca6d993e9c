/* server.h - the daemon's life: start, run until a signal, stop. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_SERVER_H
#define DAEMON_SERVER_H

#include "config/load.h"

struct server_options {
    const char *port_file; /* NULL, or where the ports in use are written  */
};

/* Runs until SIGTERM or SIGINT; returns when everything is closed. */
status server_run(const struct settings *s, const struct server_options *o,
                  struct err *err) MUST_USE;

#endif
