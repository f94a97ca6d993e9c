/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/endpoint.h"

#include <arpa/inet.h>
#include <errno.h>
#include <fcntl.h>
#include <netdb.h>
#include <netinet/in.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

status endpoint_parse(struct endpoint *e, const char *text, struct err *err)
{
    char host[256];
    const char *colon = strrchr(text, ':');
    struct addrinfo hints = {.ai_flags = AI_PASSIVE | AI_NUMERICSERV};
    struct addrinfo *list = NULL;
    if (!colon || (size_t)(colon - text) >= sizeof host)
        return err_set(err, ST_SCHEMA,
                       "\"%s\" is no address; write HOST:PORT, for example "
                       "127.0.0.1:8410",
                       text);
    size_t digits = strspn(colon + 1, "0123456789");
    if (digits == 0 || digits > 5 || colon[1 + digits] != '\0' ||
        strtol(colon + 1, NULL, 10) > 65535)
        return err_set(err, ST_SCHEMA,
                       "\"%s\": the port must be a number up to 65535; correct "
                       "it",
                       text);
    size_t len = (size_t)(colon - text);
    bool is_bracketed = len >= 2 && text[0] == '[' && text[len - 1] == ']';
    memcpy(host, text + is_bracketed, len);
    host[is_bracketed ? len - 2 : len] = 0;
    int code = getaddrinfo(host[0] ? host : NULL, colon + 1, &hints, &list);
    if (code != 0)
        return err_set(err, ST_SCHEMA, "\"%s\": %s", text, gai_strerror(code));
    memset(e, 0, sizeof *e);
    memcpy(&e->address, list->ai_addr, list->ai_addrlen);
    e->len = list->ai_addrlen;
    freeaddrinfo(list);
    return ST_OK;
}

int endpoint_bind(struct endpoint *e, int type, struct err *err)
{
    char name[80];
    int one = 1;
    endpoint_print(e, name, sizeof name);
    int fd =
        socket(e->address.ss_family, type | SOCK_NONBLOCK | SOCK_CLOEXEC, 0);
    if (fd < 0) {
        err_set(err, ST_IO, "%s: no socket: %s", name, strerror(errno));
        return -1;
    }
    if (type == SOCK_STREAM)
        setsockopt(fd, SOL_SOCKET, SO_REUSEADDR, &one, sizeof one);
    if (bind(fd, (struct sockaddr *)&e->address, e->len) != 0) {
        err_set(err, ST_IO, "%s: cannot be taken: %s%s", name, strerror(errno),
                errno == EADDRINUSE
                    ? "; another program, perhaps another ropewalkd, has it: "
                      "stop it or choose another port"
                : errno == EADDRNOTAVAIL
                    ? "; this machine has no such address: correct it in the "
                      "rig file"
                : errno == EACCES
                    ? "; ports below 1024 need a privilege: choose another"
                    : "");
        close(fd);
        return -1;
    }
    e->len = sizeof e->address;
    getsockname(fd, (struct sockaddr *)&e->address, &e->len);
    return fd;
}

static const struct sockaddr_in *v4(const struct endpoint *e)
{
    return (const struct sockaddr_in *)(const void *)&e->address;
}

static const struct sockaddr_in6 *v6(const struct endpoint *e)
{
    return (const struct sockaddr_in6 *)(const void *)&e->address;
}

int endpoint_port(const struct endpoint *e)
{
    return ntohs(e->address.ss_family == AF_INET6 ? v6(e)->sin6_port
                                                  : v4(e)->sin_port);
}

bool endpoint_is_loopback(const struct endpoint *e)
{
    if (e->address.ss_family == AF_INET6)
        return IN6_IS_ADDR_LOOPBACK(&v6(e)->sin6_addr);
    return ntohl(v4(e)->sin_addr.s_addr) >> 24 == 127;
}

void endpoint_print(const struct endpoint *e, char *out, size_t size)
{
    char host[INET6_ADDRSTRLEN] = "?";
    bool is_v6 = e->address.ss_family == AF_INET6;
    const void *address = is_v6 ? (const void *)&v6(e)->sin6_addr
                                : (const void *)&v4(e)->sin_addr;
    inet_ntop(e->address.ss_family, address, host, sizeof host);
    snprintf(out, size, is_v6 ? "[%s]:%d" : "%s:%d", host, endpoint_port(e));
}

void endpoint_print_sender(const struct sender *from, char *out, size_t size)
{
    char host[INET6_ADDRSTRLEN] = "?";
    bool is_v6 = from->family == 6;
    inet_ntop(is_v6 ? AF_INET6 : AF_INET, from->address, host, sizeof host);
    snprintf(out, size, is_v6 ? "[%s]:%d" : "%s:%d", host, from->port);
}

struct sender endpoint_sender(const struct sockaddr_storage *address)
{
    struct sender s = {.family = 4};
    if (address->ss_family == AF_INET6) {
        const struct sockaddr_in6 *a = (const void *)address;
        s.family = 6;
        memcpy(s.address, &a->sin6_addr, 16);
        s.port = ntohs(a->sin6_port);
    } else {
        const struct sockaddr_in *a = (const void *)address;
        memcpy(s.address, &a->sin_addr, 4);
        s.port = ntohs(a->sin_port);
    }
    return s;
}
