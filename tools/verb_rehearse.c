/* rehearse: the run before the run, from a script with known truth. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/rehearsal.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>
#include <sys/socket.h>

#include "core/wire/pcap.h"
#include "tools/address.h"
#include "tools/create.h"
#include "tools/instant.h"

/* Where a rehearsal on disk begins unless --begin says otherwise:
 * 2026-01-01T00:00:00Z. */
#define BEGIN_NS 1767225600000000000

enum {
    LEAD_NS = 20000000, /* the first datagram is still to come           */
    FROM_PORT = 49152   /* of the sender in a capture                    */
};

struct job {
    const struct call *call;
    const char *path; /* of the rehearsal                             */
    struct settings *rig;
    struct scene *scene;
    struct scene *other; /* the same once more, for the table of truth   */
    struct scene_table table;
    FILE *truth;
    int64_t begin_ns;
    uint64_t n_datagrams, n_bytes;
    struct scene_network network; /* its counts, when it is over          */
    uint64_t n_silent;
};

/* --- truth beside the datagrams ------------------------------------------- */

/* "run.pcap" and "truth" to "run.truth.csv"; NULL without memory. */
static char *beside(const char *path, const char *what)
{
    const char *slash = strrchr(path, '/'), *dot = strrchr(path, '.');
    size_t len = strlen(path), size = len + strlen(what) + 8;
    if (dot != NULL && (slash == NULL || dot > slash + 1) && dot != path)
        len = (size_t)(dot - path);
    char *out = malloc(size);
    if (out != NULL)
        snprintf(out, size, "%.*s.%s.csv", (int)len, path, what);
    return out;
}

static FILE *create(const struct job *job, const char *path)
{
    const char *const input[] = {call_arg(job->call, 0), job->path};
    if (path != NULL)
        return create_file(job->call, path, input, 2);
    call_say(job->call, "out of memory");
    return NULL;
}

static bool close_file(const struct job *job, FILE *file, const char *what)
{
    bool is_bad = ferror(file) != 0;
    if (fclose(file) == 0 && !is_bad)
        return true;
    call_say(job->call, "%s: %s", what, strerror(errno));
    return false;
}

static int write_faults(struct job *job, const char *out)
{
    char *path = beside(out, "faults");
    FILE *to = create(job, path);
    bool is_ok = to != NULL;
    if (is_ok) {
        scene_table_faults(job->scene, job->begin_ns, to);
        is_ok = close_file(job, to, path);
    }
    free(path);
    return is_ok ? EXIT_FINE : EXIT_PROBLEM;
}

/* --truth FILE, or beside the capture. */
static int open_truth(struct job *job, const char *out)
{
    const char *path = call_option(job->call, "truth");
    if (path == NULL && out == NULL)
        return EXIT_FINE;
    int code =
        rehearsal_load(job->call, &job->rig->rig, job->path, &job->other);
    if (code != EXIT_FINE)
        return code;
    char *name = path == NULL ? beside(out, "truth") : NULL;
    job->truth = create(job, path == NULL ? name : path);
    free(name);
    if (job->truth == NULL)
        return EXIT_NOT_THERE;
    scene_table_init(&job->table, job->other, job->begin_ns, job->truth);
    return EXIT_FINE;
}

static void truth_until(struct job *job, int64_t t_ns)
{
    if (job->truth == NULL)
        return;
    if (t_ns > job->scene->lasts_ns)
        t_ns = job->scene->lasts_ns;
    scene_table_write(&job->table, t_ns);
}

/* --- to a capture --------------------------------------------------------- */

static struct sender loopback(int port)
{
    return (struct sender){
        .family = 4, .address = {127, 0, 0, 1}, .port = (uint16_t)port};
}

/* The port of receive.udp, or the usual one where the rig leaves it open. */
static int udp_port(const struct job *job)
{
    int port = address_port(job->rig->udp);
    return port > 0 ? port : address_port(ADDRESS_UDP);
}

static void write_record(FILE *to, const struct scene_datagram *d, int port)
{
    uint8_t head[PCAP_RECORD_HEAD_MAX];
    struct sender from = loopback(FROM_PORT), here = loopback(port);
    size_t len = pcap_write_record_head(head, d->arrives_ns, &from, &here,
                                        (const uint8_t *)d->bytes, d->len);
    fwrite(head, len, 1, to);
    fwrite(d->bytes, d->len, 1, to);
}

static status play_to(struct job *job, struct scene_play *play, FILE *to)
{
    struct scene_datagram d;
    bool is_over = false;
    int64_t said_ns = 0;
    status st = ST_OK;
    while (st == ST_OK && !is_over) {
        st = scene_play_next(play, &d, &is_over);
        if (st != ST_OK || is_over)
            break;
        write_record(to, &d, udp_port(job));
        job->n_datagrams++;
        job->n_bytes += d.len;
        truth_until(job, d.arrives_ns - job->begin_ns);
        call_progress(&said_ns, "%.0f of %.0f s",
                      (double)(d.arrives_ns - job->begin_ns) * 1e-9,
                      (double)job->scene->lasts_ns * 1e-9);
    }
    call_progress_end(&said_ns);
    return st;
}

static int to_capture(struct job *job, const char *out)
{
    uint8_t head[PCAP_FILE_HEAD_SIZE];
    struct scene_play play;
    FILE *to = create(job, out);
    if (to == NULL)
        return EXIT_NOT_THERE;
    pcap_write_file_head(head);
    fwrite(head, sizeof head, 1, to);
    status st = scene_play_init(&play, job->scene, job->begin_ns);
    if (st == ST_OK)
        st = play_to(job, &play, to);
    job->network = play.network;
    job->n_silent = play.n_silent;
    scene_play_fini(&play);
    if (st != ST_OK)
        call_say(job->call, "%s", status_text(st));
    bool is_ok = close_file(job, to, out);
    return is_ok && st == ST_OK ? write_faults(job, out) : EXIT_PROBLEM;
}

/* --- to a socket, in time ------------------------------------------------- */

static void sleep_ns(int64_t ns)
{
    struct timespec pause = {ns / 1000000000, ns % 1000000000};
    clock_nanosleep(CLOCK_MONOTONIC, 0, &pause, NULL);
}

static status send_all(struct job *job, struct rehearsal_sender *r)
{
    int64_t said_ns = 0;
    status st = ST_OK;
    while (st == ST_OK && !r->is_over) {
        sleep_ns(rehearsal_wait_ns(r));
        st = rehearsal_send_due(r);
        truth_until(job, r->next.arrives_ns - job->begin_ns);
        call_progress(&said_ns, "%.0f of %.0f s, %llu datagrams",
                      (double)(instant_now_ns() - job->begin_ns) * 1e-9,
                      (double)job->scene->lasts_ns * 1e-9,
                      (unsigned long long)r->n_sent);
    }
    call_progress_end(&said_ns);
    return st;
}

static int to_socket(struct job *job, const char *to)
{
    struct rehearsal_sender r;
    struct err err;
    int fd = address_connect(to, SOCK_DGRAM, &err);
    if (fd < 0) {
        call_say(job->call, "%s", err.text);
        return err.code == ST_ARG ? EXIT_WRONG_USE : EXIT_NOT_THERE;
    }
    status st = rehearsal_sender_init(&r, job->scene, fd, job->begin_ns);
    if (st == ST_OK)
        st = send_all(job, &r);
    job->n_datagrams = r.n_sent;
    job->n_bytes = r.n_bytes;
    job->network = r.play.network;
    job->n_silent = r.play.n_silent;
    rehearsal_sender_fini(&r);
    close(fd);
    if (st != ST_OK)
        call_say(job->call, "%s", status_text(st));
    if (r.n_refused > 0)
        call_say(job->call,
                 "%s: nobody listens there; %llu were refused; "
                 "start ropewalkd first",
                 to, (unsigned long long)r.n_refused);
    if (r.behind_ns > 100000000)
        call_say(job->call,
                 "this computer was busy: a datagram left %.0f ms "
                 "after its time",
                 (double)r.behind_ns * 1e-6);
    if (st != ST_OK)
        return EXIT_PROBLEM;
    return r.n_refused > 0 ? EXIT_NOT_THERE : EXIT_FINE;
}

/* --- the verb ------------------------------------------------------------- */

static void tell(const struct job *job)
{
    const struct scene_network *n = &job->network;
    const unsigned long long count[] = {
        n->n_sent,     n->n_lost, n->n_doubled,    n->n_reordered,
        job->n_silent, n->n_full, job->n_datagrams};
    if (call_option(job->call, "json") != NULL)
        printf("{\"seed\":%llu,\"lasts\":%g,\"samples\":%llu,\"lost\":%llu,"
               "\"duplicates\":%llu,\"reordered\":%llu,\"silent\":%llu,"
               "\"overflow\":%llu,\"datagrams\":%llu,\"bytes\":%llu}\n",
               (unsigned long long)job->scene->seed,
               (double)job->scene->lasts_ns * 1e-9, count[0], count[1],
               count[2], count[3], count[4], count[5], count[6],
               (unsigned long long)job->n_bytes);
    else
        call_say(job->call,
                 "seed %llu, %g s: %llu samples, %llu lost, %llu "
                 "doubled, %llu out of order, %llu silenced; %llu datagrams",
                 (unsigned long long)job->scene->seed,
                 (double)job->scene->lasts_ns * 1e-9, count[0], count[1],
                 count[2], count[3], count[4], count[6]);
    if (n->n_full > 0)
        call_say(job->call,
                 "%llu datagrams were dropped: more than %d were "
                 "on the way; shorten the delays",
                 count[5], SCENE_POSTS_MAX);
}

static int rehearse(struct job *job, const char *out, const char *to)
{
    const char *begin = call_option(job->call, "begin");
    job->begin_ns = out != NULL ? BEGIN_NS : instant_now_ns() + LEAD_NS;
    if (begin != NULL && out == NULL) {
        call_say(job->call, "--begin: a rehearsal to a socket begins now; "
                            "give --begin with --out");
        return EXIT_WRONG_USE;
    }
    if (begin != NULL && !instant_parse(begin, strlen(begin), &job->begin_ns)) {
        call_say(job->call,
                 "--begin: '%s' is no time; write it like "
                 "2026-03-01T10:00:00Z",
                 begin);
        return EXIT_WRONG_USE;
    }
    int code = open_truth(job, out);
    if (code == EXIT_FINE)
        code = out != NULL ? to_capture(job, out) : to_socket(job, to);
    if (job->truth != NULL) {
        if (code == EXIT_FINE)
            truth_until(job, job->scene->lasts_ns);
        if (!close_file(job, job->truth, "the table of truth") &&
            code == EXIT_FINE)
            code = EXIT_PROBLEM;
    }
    return code;
}

static int run(const struct call *call)
{
    char path[SETTINGS_PATH_SIZE];
    const char *rig_path = call_arg(call, 0), *out = call_option(call, "out");
    const char *to = call_option(call, "to");
    struct job job = {.call = call, .path = call_arg(call, 1)};
    if (out != NULL && to != NULL) {
        call_say(call, "--out, --to: give one of them");
        return EXIT_WRONG_USE;
    }
    if (job.path == NULL && !rehearsal_path(rig_path, path, sizeof path)) {
        call_say(call, "%s: the name is too long", rig_path);
        return EXIT_WRONG_USE;
    }
    job.path = job.path == NULL ? path : job.path;
    job.rig = call_rig(call, 0);
    if (job.rig == NULL)
        return call_rig_exit(rig_path);
    int code = rehearsal_load(call, &job.rig->rig, job.path, &job.scene);
    if (code == EXIT_FINE)
        code = rehearse(&job, out, to != NULL ? to : job.rig->udp);
    if (job.n_datagrams > 0)
        tell(&job);
    scene_free(job.scene);
    scene_free(job.other);
    settings_free(job.rig);
    return code;
}

static const struct option_row options[] = {
    {"seed", "N", "another seed than the file's; same seed, same bytes", false},
    {"lasts", "T", "another length than the file's", false},
    {"to", "HOST:PORT",
     "sends there in real time; default is the rig's receive.udp", false},
    {"out", "CAPTURE.pcap",
     "writes a capture instead, as fast as it goes, with CAPTURE.truth.csv "
     "and CAPTURE.faults.csv beside it",
     false},
    {"truth", "FILE", "writes the true states there, every 10 ms, as CSV",
     false},
    {"begin", "TIME",
     "when a rehearsal in a capture begins; default 2026-01-01T00:00:00Z",
     false},
    {"json", NULL, "the counts at the end as JSON on standard output", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_rehearse = {
    .name = "rehearse",
    .summary = "plays a scripted run whose truth is known",
    .arguments = "RIG.json [REHEARSAL.json]",
    .min_args = 1,
    .max_args = 2,
    .text =
        "Moves the rig by a script, lets its sensors read that with their "
        "noise, and sends what they say through a network that is late, "
        "loses, doubles and reorders: to the daemon in real time, or into a "
        "capture. What the estimate should be is known then.\n\n"
        "The rehearsal stands beside the rig file as RIG.rehearsal.json, or "
        "is named.",
    .examples =
        "ropewalk rehearse rig.json                       # to the daemon\n"
        "ropewalk rehearse rig.json --out run.pcap        # and run.truth.csv\n"
        "ropewalk rehearse rig.json --out b.pcap --seed 8 # another day",
    .takes_rig = true,
    .options = options,
    .run = run,
};
