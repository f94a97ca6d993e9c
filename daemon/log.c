/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/log.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static void line(int priority, const char *word, const char *fmt, va_list args)
{
    char text[1024], stamp[40] = "";
    struct timespec now;
    struct tm utc;
    vsnprintf(text, sizeof text, fmt, args);
    if (getenv("JOURNAL_STREAM")) {
        fprintf(stderr, "<%d>%s\n", priority, text);
        return;
    }
    clock_gettime(CLOCK_REALTIME, &now);
    gmtime_r(&now.tv_sec, &utc);
    strftime(stamp, sizeof stamp, "%Y-%m-%dT%H:%M:%S", &utc);
    fprintf(stderr, "%s.%03ldZ %s %s\n", stamp, now.tv_nsec / 1000000, word,
            text);
}

void log_info(const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    line(6, "info", fmt, args);
    va_end(args);
}

void log_warn(const char *fmt, ...)
{
    va_list args;
    va_start(args, fmt);
    line(4, "warn", fmt, args);
    va_end(args);
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
    line(4, "warn", fmt, args);
    va_end(args);
    if (site->n_left_out > 0)
        log_warn("the same %llu times more",
                 (unsigned long long)site->n_left_out);
    site->n_left_out = 0;
}
