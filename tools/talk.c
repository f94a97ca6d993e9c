/* What the tool says beside its data: on stderr, and dressed only for people.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

void call_say(const struct call *call, const char *fmt, ...)
{
    va_list list;
    va_start(list, fmt);
    fprintf(stderr, "ropewalk %s: ", call->verb->name);
    vfprintf(stderr, fmt, list);
    fputc('\n', stderr);
    va_end(list);
}

bool call_may_colour(FILE *to)
{
    const char *no = getenv("NO_COLOR"), *term = getenv("TERM");
    if (no != NULL && no[0] != '\0')
        return false;
    if (term == NULL || strcmp(term, "dumb") == 0)
        return false;
    return isatty(fileno(to)) == 1;
}

static int64_t monotonic_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

void call_progress(int64_t *last_ns, const char *fmt, ...)
{
    if (isatty(STDERR_FILENO) != 1)
        return;
    int64_t now = monotonic_ns();
    if (now - *last_ns < 500000000)
        return;
    *last_ns = now;
    va_list list;
    va_start(list, fmt);
    fputc('\r', stderr);
    vfprintf(stderr, fmt, list);
    fputs("   ", stderr);
    fflush(stderr);
    va_end(list);
}

void call_progress_end(const int64_t *last_ns)
{
    if (*last_ns != 0)
        fprintf(stderr, "\r%70s\r", "");
}
