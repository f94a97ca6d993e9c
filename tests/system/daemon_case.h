/* daemon_case.h - a daemon under test with its sockets, for the programs that
 * talk to it. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_SYSTEM_DAEMON_CASE_H
#define TESTS_SYSTEM_DAEMON_CASE_H

#include <errno.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <unistd.h>

#include "tests/suite.h"
#include "tests/support/process.h"

static char folder[64];
static struct daemon_ports d;
static int udp;

__attribute__((unused)) static void begin(void)
{
    folder_make(folder, sizeof folder);
    d = daemon_start("tests/data/rigs/one.json", folder);
    udp = connect_udp(d.udp);
}

__attribute__((unused)) static void end(void)
{
    if (d.pid > 0) {
        kill(d.pid, SIGKILL);
        process_wait(d.pid, 5);
    }
    close(udp);
    folder_remove(folder);
}

__attribute__((unused)) static void stop(void)
{
    kill(d.pid, SIGTERM);
    ck_assert_int_eq(process_wait(d.pid, 5), 0);
    d.pid = 0;
}

__attribute__((unused)) static void send_text(const char *text)
{
    ck_assert_int_eq(send(udp, text, strlen(text), 0), (int)strlen(text));
}

__attribute__((unused)) static void send_many(const char *text, int n)
{
    for (int i = 0; i < n; i++) {
        send_text(text);
        if (i % 20 == 0)
            usleep(500);
    }
}

/* What comes within the time, NUL-terminated, until `wanted` stands in it;
 * only the newest half MiB is kept. */
__attribute__((unused)) static char *read_until(int fd, const char *wanted,
                                                int ms)
{
    enum { HALF = 1 << 19 };
    static char text[2 * HALF];
    size_t n = 0;
    for (text[0] = 0; ms > 0 && !strstr(text, wanted);) {
        struct pollfd p = {fd, POLLIN, 0};
        if (n > HALF) {
            memmove(text, text + n - HALF, HALF + 1);
            n = HALF;
        }
        if (poll(&p, 1, 10) <= 0) {
            ms -= 10;
            continue;
        }
        ssize_t got = read(fd, text + n, sizeof text - 1 - n);
        if (got <= 0)
            break;
        n += (size_t)got;
        text[n] = 0;
    }
    ck_assert_msg(strstr(text, wanted) != NULL, "no %s in: %.2000s", wanted,
                  text);
    return text;
}

/* To the end of the stream, which must be an orderly one. */
__attribute__((unused)) static char *read_all(int fd)
{
    static char text[1 << 22];
    size_t n = 0;
    ssize_t got;
    while ((got = read(fd, text + n, sizeof text - 1 - n)) > 0)
        n += (size_t)got;
    text[n] = 0;
    ck_assert_msg(got == 0, "after %zu bytes: %s", n, strerror(errno));
    return text;
}

__attribute__((unused)) static int count(const char *text, const char *wanted)
{
    int n = 0;
    for (const char *at = text; (at = strstr(at, wanted)) != NULL; at++)
        n++;
    return n;
}

__attribute__((unused)) static int ask(const char *request)
{
    int fd = connect_tcp(d.tcp);
    dprintf(fd, "%s\n", request);
    read_until(fd, "{\"type\":\"description\"", 2000);
    return fd;
}

#endif
