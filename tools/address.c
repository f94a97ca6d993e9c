/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/address.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "daemon/endpoint.h"

int address_port(const char *address)
{
    const char *colon = strrchr(address, ':');
    char *end = NULL;
    long port = colon == NULL ? 0 : strtol(colon + 1, &end, 10);
    if (colon == NULL || end == colon + 1 || *end != '\0')
        return 0;
    return port > 0 && port < 65536 ? (int)port : 0;
}

int address_connect(const char *address, int type, struct err *err)
{
    struct endpoint to;
    if (endpoint_parse(&to, address, err) != ST_OK)
        return -1;
    int fd = socket(to.address.ss_family, type | SOCK_CLOEXEC, 0);
    if (fd >= 0 && connect(fd, (struct sockaddr *)&to.address, to.len) == 0)
        return fd;
    err_set(err, ST_IO, "%s: %s", address, strerror(errno));
    if (fd >= 0)
        close(fd);
    return -1;
}
