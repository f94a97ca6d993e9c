/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/address.h"

#include <errno.h>
#include <netdb.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <unistd.h>

int address_port(const char *address)
{
    const char *colon = strrchr(address, ':');
    char *end = NULL;
    long port = colon == NULL ? 0 : strtol(colon + 1, &end, 10);
    if (colon == NULL || end == colon + 1 || *end != '\0')
        return 0;
    return port > 0 && port < 65536 ? (int)port : 0;
}

/* Host part without brackets into `host`; false when it does not fit. */
static bool split_host(const char *address, char *host, size_t size)
{
    size_t len = (size_t)(strrchr(address, ':') - address);
    if (len >= 2 && address[0] == '[' && address[len - 1] == ']') {
        address++;
        len -= 2;
    }
    if (len == 0 || len >= size)
        return false;
    memcpy(host, address, len);
    host[len] = '\0';
    return true;
}

int address_connect(const char *address, int type, struct err *err)
{
    char host[256];
    if (address_port(address) == 0 || !split_host(address, host, sizeof host)) {
        err_set(err, ST_ARG,
                "%s: not an address; write HOST:PORT, as in 127.0.0.1:8410",
                address);
        return -1;
    }
    struct addrinfo want = {.ai_socktype = type}, *list = NULL;
    int rc = getaddrinfo(host, strrchr(address, ':') + 1, &want, &list);
    if (rc != 0) {
        err_set(err, ST_IO, "%s: %s", address, gai_strerror(rc));
        return -1;
    }
    int fd = -1, reason = 0;
    for (struct addrinfo *a = list; a != NULL && fd < 0; a = a->ai_next) {
        fd = socket(a->ai_family, a->ai_socktype | SOCK_CLOEXEC, 0);
        if (fd >= 0 && connect(fd, a->ai_addr, a->ai_addrlen) != 0) {
            reason = errno;
            close(fd);
            fd = -1;
        } else if (fd < 0) {
            reason = errno;
        }
    }
    freeaddrinfo(list);
    if (fd < 0)
        err_set(err, ST_IO, "%s: %s", address, strerror(reason));
    return fd;
}
