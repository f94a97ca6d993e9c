/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/log.h"

#include <poll.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>
#include <unistd.h>

enum { TEXT_SIZE = 1024, LINE_SIZE = 3072 }; /* LINE_SIZE <= PIPE_BUF        */

/* Quoted: what came over a wire cannot end the line, begin a key or steer a
 * terminal. */
static size_t quote(char *out, size_t size, const char *text)
{
    size_t n = 0;
    out[n++] = '"';
    for (; *text && n + 6 < size; text++) {
        unsigned char c = (unsigned char)*text;
        if (c == '"' || c == '\\') {
            out[n++] = '\\';
            out[n++] = (char)c;
        } else if (c < 0x20 || c >= 0x7f) {
            n += (size_t)snprintf(out + n, size - n, "\\x%02x", c);
        } else {
            out[n++] = (char)c;
        }
    }
    out[n++] = '"';
    out[n] = 0;
    return n;
}

/* A reader of our stderr that stands still must not hold up the fusion: a
 * pipe that polls writable takes a whole line of this size at once. */
static bool put(const char *line, size_t len, int wait_ms)
{
    struct pollfd out = {STDERR_FILENO, POLLOUT, 0};
    if (poll(&out, 1, wait_ms) != 1 || !(out.revents & POLLOUT))
        return false;
    return write(STDERR_FILENO, line, len) == (ssize_t)len;
}

static bool say(int priority, const char *level, const char *fmt, va_list args)
    __attribute__((format(printf, 3, 0)));

static bool say(int priority, const char *level, const char *fmt, va_list args)
{
    char text[TEXT_SIZE], line[LINE_SIZE], stamp[40] = "";
    size_t n;
    vsnprintf(text, sizeof text, fmt, args);
    if (getenv("JOURNAL_STREAM")) {
        n = (size_t)snprintf(line, sizeof line, "<%d>level=%s msg=", priority,
                             level);
    } else {
        struct timespec now;
        struct tm utc;
        clock_gettime(CLOCK_REALTIME, &now);
        gmtime_r(&now.tv_sec, &utc);
        strftime(stamp, sizeof stamp, "%Y-%m-%dT%H:%M:%S", &utc);
        n = (size_t)snprintf(line, sizeof line,
                             "t=%s.%03ldZ level=%s msg=", stamp,
                             now.tv_nsec / 1000000, level);
    }
    n += quote(line + n, sizeof line - n - 1, text);
    line[n++] = '\n';
    return put(line, n, 0);
}

bool log_text(const char *text, size_t len)
{
    for (size_t at = 0; at < len; at += LINE_SIZE)
        if (!put(text + at, len - at < LINE_SIZE ? len - at : LINE_SIZE, 100))
            return false;
    return true;
}

void log_info(const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    say(6, "info", fmt, args);
    va_end(args);
}

void log_warn(const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    say(4, "warn", fmt, args);
    va_end(args);
}

void log_flush(struct log_site *site, const char *what)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    if (site->n_left_out == 0 || now.tv_sec <= site->last_s + 1)
        return;
    log_warn("left out since the last line like this: %llu; %s",
             (unsigned long long)site->n_left_out, what);
    site->n_left_out = 0;
    site->last_s = now.tv_sec;
}

void log_often(struct log_site *site, const char *fmt, ...)
{
    struct timespec now;
    va_list args;
    clock_gettime(CLOCK_MONOTONIC, &now);
    if (now.tv_sec == site->last_s && site->last_s != 0) {
        site->n_left_out++;
        return;
    }
    site->last_s = now.tv_sec;
    va_start(args, fmt);
    bool is_said = say(4, "warn", fmt, args);
    va_end(args);
    if (!is_said)
        site->n_left_out++;
    else if (site->n_left_out > 0) {
        log_warn("left out since the last line like this: %llu",
                 (unsigned long long)site->n_left_out);
        site->n_left_out = 0;
    }
}
