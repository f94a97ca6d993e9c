/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/line.h"

#include <time.h>

#define SECOND_NS  1000000000
#define OFF_MAX_NS 100000000
#define OFF_FOR_NS 2000000000

static int64_t read_clock(clockid_t id)
{
    struct timespec t;
    clock_gettime(id, &t);
    return (int64_t)t.tv_sec * SECOND_NS + t.tv_nsec;
}

struct line_reading line_read(void)
{
    return (struct line_reading){read_clock(CLOCK_REALTIME),
                                 read_clock(CLOCK_MONOTONIC)};
}

void line_start(struct line *l, struct line_reading now)
{
    *l = (struct line){now.real_ns, now.mono_ns, 0};
}

int64_t line_now(const struct line *l, struct line_reading now)
{
    return l->real0_ns + (now.mono_ns - l->mono0_ns);
}

int64_t line_arrival(const struct line *l, struct line_reading now,
                     int64_t stamp_ns)
{
    int64_t age_ns = now.real_ns - stamp_ns;
    if (age_ns < 0)
        age_ns = 0;
    if (age_ns > SECOND_NS)
        age_ns = SECOND_NS;
    return line_now(l, now) - age_ns;
}

bool line_is_stepped(struct line *l, struct line_reading now)
{
    int64_t off_ns = now.real_ns - line_now(l, now);
    if (off_ns <= OFF_MAX_NS && off_ns >= -OFF_MAX_NS) {
        l->off_since_ns = 0;
        return false;
    }
    if (l->off_since_ns == 0)
        l->off_since_ns = now.mono_ns;
    return now.mono_ns - l->off_since_ns > OFF_FOR_NS;
}
