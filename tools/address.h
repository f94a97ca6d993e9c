/* address.h - "HOST:PORT" to a socket that is connected there. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_ADDRESS_H
#define TOOLS_ADDRESS_H

#include "config/err.h"

/* Where the daemon listens unless a rig file says otherwise. */
#define ADDRESS_UDP "127.0.0.1:8410"
#define ADDRESS_TCP "127.0.0.1:8411"

/* The port of "HOST:PORT" or "[HOST]:PORT", 0 if it has none. */
int address_port(const char *address);

/* A connected socket, type SOCK_DGRAM or SOCK_STREAM; -1 with *err, ST_SCHEMA
 * when the text is no address. */
int address_connect(const char *address, int type, struct err *err);

#endif
