/* demo: a daemon, a rehearsed rig and its estimates beside the truth, in one
 * command. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/demo_host.h"

#include <errno.h>
#include <poll.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <time.h>
#include <unistd.h>

#include "tools/address.h"
#include "tools/demo_view.h"
#include "tools/instant.h"
#include "tools/rehearsal.h"

enum {
    LINE_MAX_BYTES = 1 << 20,
    LEAD_NS = 200000000, /* until the rehearsal begins              */
    DRAW_EVERY_NS = 1000000000,
    LINGER_NS = 1300000000 /* beyond the horizon: the next counts     */
};

static const char request[] =
    "{\"stream\":\"live\",\"mode\":\"newest\",\"rate\":20}\n";

static volatile sig_atomic_t is_interrupted;

struct job {
    const struct call *call;
    struct demo_host host;
    struct settings *rig;
    struct scene *scene, *truth; /* the sender's, and the view's           */
    struct rehearsal_sender sender;
    struct demo_view view;
    int tcp, udp;
    int64_t seconds_ns; /* --seconds, 0: until the rehearsal's end       */
    int64_t end_ns;     /* monotonic: when to stop sending               */
    int64_t drawn_ns;
    bool is_terminal, has_ended; /* has_ended: the stream did              */
    char *line;
    size_t len;
};

static void on_signal(int number)
{
    (void)number;
    is_interrupted = 1;
}

static int64_t monotonic_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

/* --- the stream ----------------------------------------------------------- */

static void take_bytes(struct job *job, const char *bytes, size_t len)
{
    for (size_t i = 0; i < len; i++) {
        if (bytes[i] != '\n') {
            if (job->len + 1 < LINE_MAX_BYTES)
                job->line[job->len++] = bytes[i];
            continue;
        }
        job->line[job->len] = '\0';
        demo_view_take(&job->view, job->line);
        job->len = 0;
    }
}

/* Waits for the stream, `wait_ns` at most, and reads what is there. */
static void listen_for(struct job *job, int64_t wait_ns)
{
    static char buf[65536];
    struct pollfd stream = {job->tcp, POLLIN, 0};
    struct timespec wait = {wait_ns / 1000000000, wait_ns % 1000000000};
    if (ppoll(&stream, 1, &wait, NULL) <= 0)
        return;
    ssize_t got = recv(job->tcp, buf, sizeof buf, MSG_DONTWAIT);
    if (got > 0)
        take_bytes(job, buf, (size_t)got);
    else if (got == 0 || (errno != EAGAIN && errno != EINTR))
        job->has_ended = true;
}

static void draw_when_due(struct job *job)
{
    int64_t now = monotonic_ns();
    if (now - job->drawn_ns < DRAW_EVERY_NS)
        return;
    job->drawn_ns = now;
    demo_view_draw(&job->view);
}

/* --- the run -------------------------------------------------------------- */

/* Sends and listens until the rehearsal is over; false when the daemon died. */
static bool play(struct job *job)
{
    while (!job->sender.is_over && !is_interrupted &&
           monotonic_ns() < job->end_ns) {
        if (job->has_ended || !demo_host_lives(&job->host))
            return false;
        if (rehearsal_send_due(&job->sender) != ST_OK)
            return false;
        int64_t wait_ns = rehearsal_wait_ns(&job->sender);
        listen_for(job,
                   wait_ns < DRAW_EVERY_NS / 10 ? wait_ns : DRAW_EVERY_NS / 10);
        draw_when_due(job);
    }
    return true;
}

/* Until what was sent has settled and was counted. */
static bool linger(struct job *job)
{
    job->view.hides_events = true;
    int64_t until_ns = monotonic_ns() + job->rig->rig.horizon_ns + LINGER_NS;
    for (int64_t left; (left = until_ns - monotonic_ns()) > 0;) {
        if (job->has_ended || !demo_host_lives(&job->host))
            return false;
        listen_for(job, left < DRAW_EVERY_NS / 10 ? left : DRAW_EVERY_NS / 10);
        if (job->is_terminal)
            draw_when_due(job);
    }
    return true;
}

static int connect_port(const struct call *call, int port, int type)
{
    char address[SETTINGS_ADDRESS_SIZE];
    struct err err;
    snprintf(address, sizeof address, "127.0.0.1:%d", port);
    int fd = address_connect(address, type, &err);
    if (fd < 0)
        call_say(call, "%s", err.text);
    return fd;
}

static int connect_all(struct job *job)
{
    int64_t begin_ns = instant_now_ns() + LEAD_NS;
    job->udp = connect_port(job->call, job->host.udp_port, SOCK_DGRAM);
    job->tcp = connect_port(job->call, job->host.tcp_port, SOCK_STREAM);
    if (job->udp < 0 || job->tcp < 0)
        return EXIT_PROBLEM;
    if (send(job->tcp, request, sizeof request - 1, MSG_NOSIGNAL) < 0) {
        call_say(job->call, "the stream: %s", strerror(errno));
        return EXIT_PROBLEM;
    }
    job->end_ns = job->seconds_ns > 0
                      ? monotonic_ns() + LEAD_NS + job->seconds_ns
                      : INT64_MAX;
    if (demo_view_init(&job->view, job->truth, begin_ns, job->is_terminal) !=
            ST_OK ||
        rehearsal_sender_init(&job->sender, job->scene, job->udp, begin_ns) !=
            ST_OK) {
        call_say(job->call, "out of memory");
        return EXIT_PROBLEM;
    }
    return EXIT_FINE;
}

static void tell_next_steps(const struct job *job)
{
    const struct demo_host *h = &job->host;
    const char *tool = program_invocation_name; /* as it is found from here */
    printf("\nLeft in %s: the rig file, its rehearsal, the daemon's log%s.\n"
           "Next:\n  %s check %s\n",
           h->folder, h->capture[0] == '\0' ? "" : " and the capture", tool,
           h->rig);
    if (h->capture[0] != '\0')
        printf("  %s replay %s %s/*.pcap --stream settled\n", tool, h->rig,
               h->capture);
    printf("  %sd %s --set receive.udp=%s --set serve.tcp=%s &\n"
           "  %s follow %s &\n  %s rehearse %s --to %s\n",
           tool, h->rig, ADDRESS_UDP, ADDRESS_TCP, tool, ADDRESS_TCP, tool,
           h->rig, ADDRESS_UDP);
}

static int show(struct job *job)
{
    int code = connect_all(job);
    if (code != EXIT_FINE)
        return code;
    bool is_alive = play(job) && linger(job);
    if (is_alive)
        demo_view_draw(&job->view);
    bool is_clean = demo_host_stop(&job->host);
    putchar('\n');
    demo_view_ledger(&job->view);
    tell_next_steps(job);
    if (!is_alive || !is_clean) {
        call_say(job->call, "the daemon ended badly; its log is %s",
                 job->host.log);
        return EXIT_PROBLEM;
    }
    if (job->view.n_estimates == 0) {
        call_say(job->call, "no estimate came; the daemon's log is %s",
                 job->host.log);
        return EXIT_PROBLEM;
    }
    return EXIT_FINE;
}

/* --- the verb ------------------------------------------------------------- */

static int prepare(struct job *job)
{
    const struct call *call = job->call;
    const char *rig = call_option(call, "rig");
    int code =
        demo_host_prepare(call, &job->host, rig == NULL ? "carriage" : rig,
                          call_option(call, "folder"));
    if (code != EXIT_FINE)
        return code;
    job->rig = call_rig_path(call, job->host.rig);
    if (job->rig == NULL)
        return EXIT_BAD_SETTINGS;
    code =
        rehearsal_load(call, &job->rig->rig, job->host.rehearsal, &job->scene);
    if (code == EXIT_FINE)
        code = rehearsal_load(call, &job->rig->rig, job->host.rehearsal,
                              &job->truth);
    return code;
}

static int run(const struct call *call)
{
    struct job job = {.call = call, .tcp = -1, .udp = -1};
    struct sigaction action = {.sa_handler = on_signal};
    bool bad = false;
    job.seconds_ns = call_time_ns(call, "seconds", 0, &bad);
    if (bad)
        return EXIT_WRONG_USE;
    if (job.seconds_ns < 0 ||
        (job.seconds_ns == 0 && call_option(call, "seconds") != NULL)) {
        call_say(call, "--seconds: needs a time above 0 s");
        return EXIT_WRONG_USE;
    }
    job.line = malloc(LINE_MAX_BYTES);
    job.is_terminal = call_may_colour(stdout);
    sigaction(SIGINT, &action, NULL);
    sigaction(SIGTERM, &action, NULL);
    int code = job.line == NULL ? EXIT_PROBLEM : prepare(&job);
    if (code == EXIT_FINE)
        code = demo_host_start(call, &job.host);
    if (code == EXIT_FINE) {
        call_say(call,
                 "%s, in %s; +- is U (k = 2), off is the true error; Ctrl-C "
                 "ends it",
                 job.rig->rig.name, job.host.folder);
        code = show(&job);
    }
    demo_host_stop(&job.host);
    if (job.sender.play.scene != NULL)
        rehearsal_sender_fini(&job.sender);
    demo_view_fini(&job.view);
    if (job.udp >= 0)
        close(job.udp);
    if (job.tcp >= 0)
        close(job.tcp);
    scene_free(job.scene);
    scene_free(job.truth);
    settings_free(job.rig);
    free(job.line);
    return code;
}

static const struct option_row options[] = {
    {"seconds", "N", "ends after so long; default is the rehearsal's length",
     false},
    {"rig", "NAME",
     "carriage (the default), rafts, or a rig file with its rehearsal "
     "beside it",
     false},
    {"folder", "DIR", "a new folder for all that it makes", false},
    {"seed", "N", "another seed than the rehearsal's", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_demo = {
    .name = "demo",
    .summary = "shows a rehearsed rig, its daemon and the truth at once",
    .arguments = "",
    .min_args = 0,
    .max_args = 0,
    .text =
        "Makes a folder, starts a daemon of its own there on ports that the "
        "system chooses, plays a rehearsal to it, and shows once a second "
        "what the daemon says beside what is true: every state with its "
        "U (k = 2) and its error, the verdict with its reasons, and what came "
        "late. It stops the daemon at the end and leaves the capture behind, "
        "with the commands to go on with.",
    .examples = "ropewalk demo                # the carriage, 70 s\n"
                "ropewalk demo --seconds 10   # a short look\n"
                "ropewalk demo --rig rafts    # three bodies, two towers",
    .options = options,
    .run = run,
};
