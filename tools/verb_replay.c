/* replay: a capture through the engine again, byte for byte as it was live. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <string.h>
#include <unistd.h>

#include "core/wire/encode.h"
#include "daemon/capture.h"
#include "tools/address.h"
#include "tools/create.h"
#include "tools/output.h"
#include "tools/replay.h"

struct job {
    const struct call *call;
    struct replay replay;
    struct output output;
    int64_t progress_ns;
    uint64_t n_records;
};

/* --- what is said beside the data ---------------------------------------- */

static void say_file(struct job *job, const struct capture_tally *tally,
                     const char *path)
{
    if (tally->torn_bytes > 0)
        call_say(job->call,
                 "%s: %llu bytes are no whole record, as after a crash; every "
                 "whole record is replayed",
                 path, (unsigned long long)tally->torn_bytes);
    if (tally->n_skipped > 0)
        call_say(job->call,
                 "%s: %llu records are no whole UDP datagram and are left out",
                 path, (unsigned long long)tally->n_skipped);
}

static void say_result(const struct job *job)
{
    const struct replay *r = &job->replay;
    const struct call *call = job->call;
    char end[40];
    if (r->n_other_port > 0)
        call_say(call,
                 "%llu datagrams to other ports than %d are left out; "
                 "--port takes others",
                 (unsigned long long)r->n_other_port, r->port);
    if (r->n_starts > 1)
        call_say(call,
                 "the line begins %llu times; each begins with a new "
                 "state, the summary is of the last",
                 (unsigned long long)r->n_starts);
    if (r->n_other_rig > 0)
        call_say(call, "the capture was made with another rig file, kept "
                       "beside it as *.rig.json; these are the numbers of the "
                       "file named here");
    if (r->n_gaps > 0)
        call_say(call,
                 "the capture has %llu gaps: what it lacks was fused "
                 "live and is not here",
                 (unsigned long long)r->n_gaps);
    if (r->n_drops > 0)
        call_say(call, "%llu datagrams were lost before the daemon saw them",
                 (unsigned long long)r->n_drops);
    wire_print_time(r->line_ns, end);
    if (r->is_begun && !r->is_ours)
        call_say(call,
                 "a foreign capture: the line began at its first "
                 "datagram and ended at its last, %s, plus the horizon",
                 end);
    call_say(call, "%llu datagrams, %llu estimates written",
             (unsigned long long)r->n_fed,
             (unsigned long long)job->output.n_estimates);
}

/* --- replaying ----------------------------------------------------------- */

static int replay_capture(struct job *job, const char *path)
{
    struct capture *c;
    struct pcap_record record;
    struct err err;
    if (capture_open(&c, path, &err) != ST_OK) {
        call_say(job->call, "%s", err.text);
        return EXIT_NOT_THERE;
    }
    while (!job->output.has_failed && capture_next(c, &record)) {
        replay_take(&job->replay, &record);
        if (++job->n_records % 4096 == 0)
            call_progress(&job->progress_ns, "%llu records",
                          (unsigned long long)job->n_records);
    }
    say_file(job, capture_tally(c), path);
    capture_close(c);
    return EXIT_FINE;
}

static int replay_all(struct job *job)
{
    const struct call *call = job->call;
    int code = EXIT_FINE;
    output_description(&job->output, ROPEWALK_BUILD);
    for (int i = 1; code == EXIT_FINE && i < call_n_args(call); i++)
        code = replay_capture(job, call_arg(call, i));
    call_progress_end(&job->progress_ns);
    if (code != EXIT_FINE)
        return code;
    replay_end(&job->replay);
    output_summary(&job->output, job->replay.run);
    say_result(job);
    return EXIT_FINE;
}

static FILE *create(const struct call *call, const char *path)
{
    enum { INPUTS_MAX = 64 };
    const char *input[INPUTS_MAX];
    int n = 0;
    for (; n < call_n_args(call) && n < INPUTS_MAX; n++)
        input[n] = call_arg(call, n);
    return create_file(call, path, input, n);
}

/* Opens the output and drives everything; `port` 0 takes every port. */
static int replay_to(struct job *job, const struct rig *rig, int port,
                     enum output_streams streams)
{
    const struct call *call = job->call;
    const char *path = call_option(call, "out");
    FILE *to = path == NULL ? stdout : create(call, path);
    if (to == NULL)
        return EXIT_NOT_THERE;
    int code = EXIT_PROBLEM;
    status ready = output_init(&job->output, rig, to, streams);
    if (ready == ST_OK)
        ready = replay_init(&job->replay, rig, port, output_sink(&job->output));
    job->replay.port_is_given = call_option(call, "port") != NULL;
    if (ready == ST_OK)
        code = replay_all(job);
    else
        call_say(call, "%s", status_text(ready));
    if (output_fini(&job->output) != ST_OK) {
        call_say(call, "%s: %s", path == NULL ? "standard output" : path,
                 strerror(job->output.reason));
        code = EXIT_PROBLEM;
    }
    replay_fini(&job->replay);
    if (to != stdout && fclose(to) != 0) {
        call_say(call, "%s: %s", path, strerror(errno));
        code = EXIT_PROBLEM;
    }
    return code;
}

/* --- the verb ------------------------------------------------------------ */

static int run(const struct call *call)
{
    const char *word = call_option(call, "stream");
    enum output_streams streams = OUTPUT_BOTH;
    bool bad = false;
    double port = call_number(call, "port", 0, &bad);
    if (bad || !(port >= 0 && port <= 65535)) {
        call_say(call, "--port: outside 0 .. 65535; 0 takes every port");
        return EXIT_WRONG_USE;
    }
    if (word != NULL && !output_parse_streams(word, &streams)) {
        call_say(call, "--stream: '%s' is none of live, settled, both, none",
                 word);
        return EXIT_WRONG_USE;
    }
    for (int i = 1; i < call_n_args(call); i++)
        if (access(call_arg(call, i), R_OK) != 0) {
            call_say(call, "%s: %s", call_arg(call, i), strerror(errno));
            return EXIT_NOT_THERE;
        }
    struct settings *s = call_rig(call, 0);
    if (s == NULL)
        return call_rig_exit(call_arg(call, 0));
    struct job job = {.call = call};
    int code = replay_to(
        &job, &s->rig,
        call_option(call, "port") != NULL ? (int)port : address_port(s->udp),
        streams);
    settings_free(s);
    return code;
}

static const struct option_row options[] = {
    {"stream", "WHICH",
     "whose estimates are written: live, settled, both (the "
     "default) or none",
     false},
    {"out", "FILE", "writes there instead of to standard output", false},
    {"port", "N",
     "takes datagrams to this port; 0 takes every port; default: all of a "
     "capture of ours, of others those to the rig's receive.udp",
     false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_replay = {
    .name = "replay",
    .summary = "lays a capture through the engine again",
    .arguments = "RIG.json CAPTURE...",
    .min_args = 2,
    .max_args = -1,
    .text =
        "Writes what the daemon would have said, as JSON lines: a description "
        "first, then estimates of the chosen streams, events and counts, and "
        "a summary as the last line. The settled stream of a capture of ours "
        "is the one of the live run, byte for byte. With --stream none, "
        "estimates and counts are left out.\n\n"
        "A capture is a file, or a folder whose files are taken in order. "
        "Captures of other programs are taken too: the line then begins at "
        "the first datagram and ends at the last one plus the horizon.\n\n"
        "It exits with 0 whenever it reached the end, however many "
        "measurements were refused; the summary counts them.",
    .examples =
        "ropewalk replay rig.json captures --stream settled\n"
        "ropewalk replay rig.json day.pcap --stream none   # only the summary\n"
        "ropewalk replay rig.json day.pcap --set sensors.laser.u=\"3 mm\" "
        "--out b.jsonl",
    .takes_rig = true,
    .options = options,
    .run = run,
};
