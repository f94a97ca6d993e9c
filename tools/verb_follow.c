/* follow: subscribes to the daemon and prints what it says. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <poll.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <time.h>
#include <unistd.h>

#include "core/wire/decode.h"
#include "core/wire/writer.h"
#include "tools/address.h"
#include "tools/board.h"

enum {
    FOLLOW_LINE_MAX = 1 << 20,
    FOLLOW_REQUEST_MAX = 4096,
    FOLLOW_DRAW_EVERY_MS = 100,
    FOLLOW_FIRST_WAIT_MS = 2000, /* the daemon may still be starting      */
    FOLLOW_PAUSE_MS = 200,
    FOLLOW_PAUSE_MAX_MS = 3200
};

struct job {
    const struct call *call;
    const char *at;
    char request[FOLLOW_REQUEST_MAX];
    size_t request_len;
    uint64_t n_wanted, n_estimates; /* n_wanted 0: for ever                */
    int64_t end_ms;                 /* INT64_MAX: for ever                 */
    struct board *board;            /* NULL: lines                         */
    bool in_style;
    int64_t drawn_ms;
    char *line; /* FOLLOW_LINE_MAX bytes               */
    size_t len;
    bool is_skipping; /* inside a line that is too long      */
    uint64_t n_too_long;
};

static int64_t monotonic_ms(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * 1000 + now.tv_nsec / 1000000;
}

static bool is_over(const struct job *job)
{
    return (job->n_wanted > 0 && job->n_estimates >= job->n_wanted) ||
           monotonic_ms() >= job->end_ms;
}

static void take_line(struct job *job)
{
    static const char estimate[] = "{\"type\":\"estimate\"";
    if (job->len >= sizeof estimate - 1 &&
        memcmp(job->line, estimate, sizeof estimate - 1) == 0)
        job->n_estimates++;
    if (job->board == NULL) {
        fwrite(job->line, job->len, 1, stdout);
        fputc('\n', stdout);
        return;
    }
    job->line[job->len] = '\0';
    board_take(job->board, job->line);
}

static void take_bytes(struct job *job, const char *bytes, size_t len)
{
    for (size_t i = 0; i < len && !is_over(job); i++) {
        if (bytes[i] == '\n') {
            if (!job->is_skipping)
                take_line(job);
            job->is_skipping = false;
            job->len = 0;
        } else if (job->len + 1 < FOLLOW_LINE_MAX) {
            job->line[job->len++] = bytes[i];
        } else if (!job->is_skipping) {
            job->is_skipping = true;
            job->n_too_long++;
        }
    }
    if (job->board == NULL)
        fflush(stdout);
}

static void draw(struct job *job)
{
    int64_t now = monotonic_ms();
    if (job->board == NULL || now - job->drawn_ms < FOLLOW_DRAW_EVERY_MS)
        return;
    board_draw(job->board, stdout, job->in_style);
    job->drawn_ms = now;
}

/* Reads until the connection ends or enough was heard. */
static void read_connection(struct job *job, int fd)
{
    char buf[65536];
    job->len = 0;
    job->is_skipping = false;
    while (!is_over(job) && !ferror(stdout)) {
        int64_t left = job->end_ms - monotonic_ms();
        struct pollfd wait = {fd, POLLIN, 0};
        poll(&wait, 1,
             left < FOLLOW_DRAW_EVERY_MS ? (int)(left < 0 ? 0 : left)
                                         : FOLLOW_DRAW_EVERY_MS);
        ssize_t got = recv(fd, buf, sizeof buf, MSG_DONTWAIT);
        if (got == 0 || (got < 0 && errno != EAGAIN && errno != EINTR))
            return;
        if (got > 0)
            take_bytes(job, buf, (size_t)got);
        draw(job);
    }
}

static void pause_ms(const struct job *job, int ms)
{
    int64_t left = job->end_ms - monotonic_ms();
    poll(NULL, 0, left < ms ? (int)(left < 0 ? 0 : left) : ms);
}

/* A connection, or -1 when it was never there for FOLLOW_FIRST_WAIT_MS or the
 * time is over.  After a first success it tries for ever. */
static int reach(struct job *job, bool is_first, struct err *err)
{
    int64_t give_up = monotonic_ms() + FOLLOW_FIRST_WAIT_MS;
    int wait = FOLLOW_PAUSE_MS;
    for (;;) {
        int fd = address_connect(job->at, SOCK_STREAM, err);
        if (fd >= 0 || err->code == ST_SCHEMA)
            return fd;
        if ((is_first && monotonic_ms() >= give_up) ||
            monotonic_ms() >= job->end_ms)
            return -1;
        pause_ms(job, wait);
        wait = wait * 2 > FOLLOW_PAUSE_MAX_MS ? FOLLOW_PAUSE_MAX_MS : wait * 2;
    }
}

static int follow(struct job *job)
{
    struct err err;
    for (bool is_first = true;; is_first = false) {
        int fd = reach(job, is_first, &err);
        if (fd < 0 && err.code == ST_SCHEMA) {
            call_say(job->call, "%s", err.text);
            return EXIT_WRONG_USE;
        }
        if (fd < 0 && is_first) {
            call_say(job->call,
                     "%s; start ropewalkd, or name the place as "
                     "HOST:PORT",
                     err.text);
            return EXIT_NOT_THERE;
        }
        if (fd < 0)
            return EXIT_FINE;
        if (send(fd, job->request, job->request_len, MSG_NOSIGNAL) ==
            (ssize_t)job->request_len)
            read_connection(job, fd);
        close(fd);
        if (is_over(job))
            return EXIT_FINE;
        if (job->board != NULL) {
            board_close(job->board);
            board_draw(job->board, stdout, job->in_style);
        }
        if (ferror(stdout))
            return EXIT_PROBLEM;
        call_say(job->call, "%s: the connection ended; trying again", job->at);
        pause_ms(job, FOLLOW_PAUSE_MS);
    }
}

/* --- the verb ------------------------------------------------------------ */

/* "a,b" as an array of names. */
static void write_tracks(struct writer *w, const char *list)
{
    char name[RIG_ID_SIZE];
    writer_key(w, "tracks");
    writer_open_array(w);
    while (*list != '\0') {
        size_t len = strcspn(list, ",");
        snprintf(name, sizeof name, "%.*s", (int)len, list);
        writer_text(w, name);
        list += len + (list[len] == ',');
    }
    writer_close(w);
}

static bool write_request(struct job *job)
{
    const struct call *call = job->call;
    const char *stream = call_option(call, "stream");
    const char *tracks = call_option(call, "tracks");
    bool bad = false;
    double rate = call_number(call, "rate", 0, &bad);
    if (bad)
        return false;
    if (stream != NULL && strcmp(stream, "live") != 0 &&
        strcmp(stream, "settled") != 0 && strcmp(stream, "both") != 0) {
        call_say(call, "--stream: '%s' is none of live, settled, both", stream);
        return false;
    }
    struct writer w;
    writer_init(&w, WIRE_JSON, job->request, sizeof job->request);
    writer_open_map(&w);
    if (tracks != NULL)
        write_tracks(&w, tracks);
    writer_key(&w, "stream");
    writer_text(&w, stream == NULL ? "live" : stream);
    if (call_option(call, "rate") != NULL) {
        writer_key(&w, "rate");
        writer_number(&w, rate);
    }
    writer_key(&w, "mode");
    writer_text(&w, call_option(call, "newest") != NULL || job->board != NULL
                        ? "newest"
                        : "every");
    writer_close(&w);
    job->request_len = writer_finish(&w);
    if (job->request_len == 0)
        call_say(call, "--tracks: longer than %d bytes", FOLLOW_REQUEST_MAX);
    return job->request_len > 0;
}

static bool take_options(struct job *job)
{
    const struct call *call = job->call;
    bool bad = false;
    double count = call_number(call, "count", 0, &bad);
    double seconds = call_number(call, "seconds", 0, &bad);
    if (bad)
        return false;
    if (count < 0 || count > 1e15 || seconds < 0 || seconds > 1e9) {
        call_say(call, "--count, --seconds: need a number above 0");
        return false;
    }
    job->n_wanted = (uint64_t)count;
    job->end_ms =
        seconds > 0 ? monotonic_ms() + (int64_t)(seconds * 1000) : INT64_MAX;
    job->in_style = call_may_colour(stdout);
    if (job->in_style && call_option(call, "json") == NULL)
        job->board = board_new();
    return write_request(job);
}

static bool is_address(const char *text)
{
    return address_port(text) != 0;
}

static int run(const struct call *call)
{
    struct settings *rig = NULL;
    struct job job = {.call = call, .at = call_arg(call, 0)};
    if (job.at == NULL) {
        job.at = ADDRESS_TCP;
    } else if (!is_address(job.at)) {
        rig = call_rig(call, 0);
        if (rig == NULL)
            return call_rig_exit(job.at);
        job.at = rig->tcp;
        if (job.at[0] == '\0') {
            call_say(call, "%s: serves no TCP; add serve.tcp to it", rig->path);
            settings_free(rig);
            return EXIT_NOT_THERE;
        }
    }
    job.line = malloc(FOLLOW_LINE_MAX);
    int code = EXIT_WRONG_USE;
    if (job.line != NULL && take_options(&job))
        code = follow(&job);
    if (job.n_too_long > 0)
        call_say(call, "%llu lines beyond %d bytes were left out",
                 (unsigned long long)job.n_too_long, FOLLOW_LINE_MAX);
    board_free(job.board);
    free(job.line);
    settings_free(rig);
    return code;
}

static const struct option_row options[] = {
    {"tracks", "LIST", "only these tracks, as in --tracks carriage,raft-1",
     false},
    {"stream", "WHICH", "live (the default), settled or both", false},
    {"rate", "N", "at most so many estimates a second and track", false},
    {"newest", NULL,
     "skips to the newest when this side is slow, instead of "
     "every one",
     false},
    {"count", "N", "ends after so many estimates", false},
    {"seconds", "S", "ends after so many seconds", false},
    {"json", NULL, "lines even on a terminal", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_follow = {
    .name = "follow",
    .summary = "subscribes to the daemon's estimates",
    .arguments = "[RIG.json | HOST:PORT]",
    .min_args = 0,
    .max_args = 1,
    .text =
        "Prints what the daemon says as JSON lines: a description first, then "
        "estimates, events and counts. On a terminal it shows a small table "
        "instead, with U at k = 2.\n\n"
        "The place is the rig's serve.tcp, or HOST:PORT, or 127.0.0.1:8411. "
        "When the connection ends it tries again until --count or --seconds "
        "is reached; when it was never there it gives up after two seconds.",
    .examples =
        "ropewalk follow                           # a table, on a terminal\n"
        "ropewalk follow rig.json --json > log     # lines\n"
        "ropewalk follow 127.0.0.1:8411 --stream settled --count 100",
    .options = options,
    .run = run,
};
