/* endpoint.h - "HOST:PORT" to a bound socket, and what it is called. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_ENDPOINT_H
#define DAEMON_ENDPOINT_H

#include <sys/socket.h>

#include "config/err.h"
#include "core/model/message.h"

struct endpoint {
    struct sockaddr_storage address;
    socklen_t len;
};

/* Numeric IPv4 or IPv6 ("127.0.0.1:8410", "[::1]:8410") or a host name. */
status endpoint_parse(struct endpoint *e, const char *text,
                      struct err *err) MUST_USE;

/* A bound, non-blocking socket of this type; -1 with *err. */
int endpoint_bind(struct endpoint *e, int type, struct err *err);

int endpoint_port(const struct endpoint *e);
bool endpoint_is_loopback(const struct endpoint *e);
void endpoint_print(const struct endpoint *e, char *out, size_t size);

/* The same for a sender. */
void endpoint_print_sender(const struct sender *from, char *out, size_t size);

struct sender endpoint_sender(const struct sockaddr_storage *address);

#endif
