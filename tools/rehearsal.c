/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/rehearsal.h"

#include <errno.h>
#include <string.h>
#include <sys/socket.h>
#include <time.h>

#include "tools/instant.h"

bool rehearsal_path(const char *rig_path, char *out, size_t size)
{
    static const char end[] = ".json";
    size_t len = strlen(rig_path), cut = sizeof end - 1;
    if (len >= cut && strcmp(rig_path + len - cut, end) == 0)
        len -= cut;
    int n = snprintf(out, size, "%.*s.rehearsal.json", (int)len, rig_path);
    return n > 0 && (size_t)n < size;
}

int rehearsal_load(const struct call *call, const struct rig *rig,
                   const char *path, struct scene **s)
{
    struct problems problems;
    bool bad = false;
    *s = NULL;
    double seed = call_number(call, "seed", -1, &bad);
    int64_t lasts_ns = call_time_ns(call, "lasts", 0, &bad);
    if (bad)
        return EXIT_WRONG_USE;
    bool has_seed = call_option(call, "seed") != NULL;
    if (has_seed && !(seed >= 0 && seed <= 9007199254740992.0 &&
                      seed == (double)(uint64_t)seed)) {
        call_say(call, "--seed: %g is no whole number of 0 .. 2^53", seed);
        return EXIT_WRONG_USE;
    }
    if (lasts_ns < 0 || (call_option(call, "lasts") != NULL && lasts_ns == 0)) {
        call_say(call, "--lasts: needs a time above 0 s");
        return EXIT_WRONG_USE;
    }
    const char *left_out[RIG_SENSORS_MAX + 1] = {NULL};
    for (int i = 0; i < RIG_SENSORS_MAX; i++)
        left_out[i] = call_option_at(call, "without", i);
    const struct scene_source source = {rig, path, left_out};
    problems_init(&problems);
    status st = scene_load(s, &source, &problems);
    if (st != ST_OK)
        fputs(problems.text == NULL ? "out of memory\n" : problems.text,
              stderr);
    problems_fini(&problems);
    if (st != ST_OK)
        return st == ST_IO ? EXIT_NOT_THERE : EXIT_BAD_SETTINGS;
    if (lasts_ns > 0)
        (*s)->lasts_ns = lasts_ns;
    if (has_seed && scene_reseed(*s, (uint64_t)seed) != ST_OK) {
        call_say(call, "out of memory");
        scene_free(*s);
        *s = NULL;
        return EXIT_PROBLEM;
    }
    return EXIT_FINE;
}

/* --- sending in time ------------------------------------------------------ */

static int64_t monotonic_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

status rehearsal_sender_init(struct rehearsal_sender *r, struct scene *s,
                             int fd, int64_t begin_ns)
{
    *r = (struct rehearsal_sender){.fd = fd};
    r->offset_ns = instant_now_ns() - monotonic_ns();
    status st = scene_play_init(&r->play, s, begin_ns);
    if (st == ST_OK)
        st = scene_play_next(&r->play, &r->next, &r->is_over);
    return st;
}

void rehearsal_sender_fini(struct rehearsal_sender *r)
{
    scene_play_fini(&r->play);
}

int64_t rehearsal_wait_ns(const struct rehearsal_sender *r)
{
    int64_t wait_ns = r->next.arrives_ns - r->offset_ns - monotonic_ns();
    return wait_ns > 0 ? wait_ns : 0;
}

/* A port where nobody listens refuses on the call after; that datagram is
 * counted and tried once more. */
static void send_one(struct rehearsal_sender *r)
{
    ssize_t sent = send(r->fd, r->next.bytes, r->next.len, 0);
    if (sent < 0 && errno == ECONNREFUSED) {
        r->n_refused++;
        sent = send(r->fd, r->next.bytes, r->next.len, 0);
    }
    if (sent == (ssize_t)r->next.len) {
        r->n_sent++;
        r->n_bytes += r->next.len;
    }
}

status rehearsal_send_due(struct rehearsal_sender *r)
{
    status st = ST_OK;
    int64_t now_ns = monotonic_ns() + r->offset_ns;
    while (st == ST_OK && !r->is_over && r->next.arrives_ns <= now_ns) {
        if (now_ns - r->next.arrives_ns > r->behind_ns)
            r->behind_ns = now_ns - r->next.arrives_ns;
        send_one(r);
        st = scene_play_next(&r->play, &r->next, &r->is_over);
    }
    return st;
}
