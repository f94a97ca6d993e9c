/* send: one measurement from the command line, or many from lines. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <poll.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <unistd.h>

#include "core/wire/decode.h"
#include "core/wire/writer.h"
#include "tools/address.h"
#include "tools/instant.h"

enum {
    SEND_DATAGRAM_MAX = 60000, /* below what UDP carries                  */
    SEND_ELEMENT_MAX = 2048
};

struct job {
    const struct call *call;
    struct settings *rig; /* NULL without --rig                      */
    const char *to;
    int fd;
    struct text sensor, track;
    bool has_stamp, stamp_is_now;
    int64_t t_ns;
    int n_u;
    double u[READS_MAX];
    int batch, n_in_batch; /* elements in `datagram`                  */
    char datagram[SEND_DATAGRAM_MAX];
    size_t len;
    uint64_t n_sent, n_refused;
    struct wire_decoder decoder;
};

static const char *sensor_name(const void *ctx, int i)
{
    const struct rig *rig = ctx;
    return i < rig->n_sensors ? rig->sensor[i].name : NULL;
}

/* "1.25" or "1,2,3" to at most READS_MAX values; -1 when it is neither. */
static int parse_values(const char *text, double *value)
{
    int n = 0;
    for (;;) {
        size_t len = strcspn(text, ",");
        if (n == READS_MAX || !wire_parse_number(text, len, &value[n]))
            return -1;
        n++;
        if (text[len] == '\0')
            return n;
        text += len + 1;
    }
}

/* --- sending ------------------------------------------------------------- */

/* A port where nobody listens answers with an error on the next call. */
static bool was_refused(int fd)
{
    int error = 0;
    socklen_t size = sizeof error;
    struct pollfd answer = {fd, 0, 0};
    poll(&answer, 1, 20);
    return getsockopt(fd, SOL_SOCKET, SO_ERROR, &error, &size) == 0 &&
           error == ECONNREFUSED;
}

static int send_now(struct job *job, const char *bytes, size_t len)
{
    fprintf(stderr, "%.*s\n", (int)len, bytes);
    ssize_t sent = send(job->fd, bytes, len, 0);
    if (sent < 0 && errno == ECONNREFUSED)
        sent = send(job->fd, bytes, len, 0); /* of the one before */
    if (sent == (ssize_t)len) {
        job->n_sent++;
        return EXIT_FINE;
    }
    call_say(job->call, "%s: %s", job->to, strerror(errno));
    return EXIT_NOT_THERE;
}

/* Sends what the batch holds. */
static int flush_batch(struct job *job)
{
    if (job->n_in_batch == 0)
        return EXIT_FINE;
    bool is_array = job->batch > 1;
    if (is_array)
        job->datagram[job->len++] = ']';
    int code = send_now(job, job->datagram, job->len);
    job->n_in_batch = 0;
    job->len = 0;
    return code;
}

/* Adds one JSON object to the batch. */
static int add_element(struct job *job, const char *bytes, size_t len)
{
    int code = EXIT_FINE;
    if (job->len + len + 2 > SEND_DATAGRAM_MAX)
        code = flush_batch(job);
    if (job->batch > 1)
        job->datagram[job->len++] = job->n_in_batch == 0 ? '[' : ',';
    memcpy(job->datagram + job->len, bytes, len);
    job->len += len;
    job->n_in_batch++;
    if (code == EXIT_FINE && job->n_in_batch >= job->batch)
        code = flush_batch(job);
    return code;
}

static size_t write_element(const struct job *job, const double *z, int n,
                            char *buf, size_t size)
{
    char name[RIG_ID_SIZE];
    struct writer w;
    writer_init(&w, WIRE_JSON, buf, size);
    writer_open_map(&w);
    writer_key(&w, "sensor");
    snprintf(name, sizeof name, "%.*s", job->sensor.len, job->sensor.at);
    writer_text(&w, name);
    if (job->track.len > 0) {
        writer_key(&w, "track");
        snprintf(name, sizeof name, "%.*s", job->track.len, job->track.at);
        writer_text(&w, name);
    }
    if (job->has_stamp) {
        writer_key(&w, "t");
        writer_time(&w, job->stamp_is_now ? instant_now_ns() : job->t_ns);
    }
    const double *values[2] = {z, job->u};
    int counts[2] = {n, job->n_u};
    for (int k = 0; k < 2 && counts[k] > 0; k++) {
        writer_key(&w, k == 0 ? "z" : "u");
        if (counts[k] > 1)
            writer_open_array(&w);
        for (int i = 0; i < counts[k]; i++)
            writer_number(&w, values[k][i]);
        if (counts[k] > 1)
            writer_close(&w);
    }
    writer_close(&w);
    size_t len = writer_finish(&w);
    return len == 0 ? 0 : len - 1; /* without the newline */
}

/* Numbers for the sensor of the command line. */
static int send_numbers(struct job *job, const double *z, int n)
{
    char buf[SEND_ELEMENT_MAX];
    size_t len = write_element(job, z, n, buf, sizeof buf);
    return add_element(job, buf, len);
}

/* --- lines --------------------------------------------------------------- */

static void refuse_line(struct job *job, int number, const char *reason)
{
    fprintf(stderr, "standard input:%d: %s\n", number, reason);
    job->n_refused++;
}

static int take_line(struct job *job, const char *line, size_t len, int number)
{
    double z[READS_MAX];
    if (line[0] == '{' || line[0] == '[') {
        enum datagram_outcome outcome =
            wire_decode(&job->decoder, (const uint8_t *)line, len);
        if (outcome != DATAGRAM_DECODED || job->decoder.n_bad > 0) {
            refuse_line(job, number, job->decoder.reason);
            return EXIT_FINE;
        }
        if (line[0] == '{' && len < SEND_DATAGRAM_MAX - 2)
            return add_element(job, line, len);
        int code = flush_batch(job);
        return code == EXIT_FINE ? send_now(job, line, len) : code;
    }
    int n = parse_values(line, z);
    if (n < 0)
        refuse_line(job, number, "neither a number nor a JSON object");
    else if (job->sensor.len == 0)
        refuse_line(job, number,
                    "a bare number needs a sensor; write "
                    "ropewalk send SENSOR");
    else
        return send_numbers(job, z, n);
    return EXIT_FINE;
}

static int take_lines(struct job *job)
{
    char *line = NULL;
    size_t size = 0;
    int code = EXIT_FINE;
    for (int number = 1; code == EXIT_FINE; number++) {
        ssize_t got = getline(&line, &size, stdin);
        if (got < 0)
            break;
        size_t len = (size_t)got;
        while (len > 0 && strchr("\r\n \t", line[len - 1]) != NULL)
            line[--len] = '\0';
        if (len > 0)
            code = take_line(job, line, len, number);
    }
    free(line);
    return code == EXIT_FINE ? flush_batch(job) : code;
}

/* --- the verb ------------------------------------------------------------ */

static bool take_stamp(struct job *job)
{
    const char *text = call_option(job->call, "t");
    job->has_stamp = text == NULL || strcmp(text, "none") != 0;
    job->stamp_is_now = text == NULL || strcmp(text, "now") == 0;
    if (!job->has_stamp || job->stamp_is_now ||
        instant_parse(text, strlen(text), &job->t_ns))
        return true;
    call_say(job->call,
             "--t: '%s' is no time; write now, none, seconds since "
             "1970 or 2026-03-01T10:00:00Z",
             text);
    return false;
}

static bool take_options(struct job *job)
{
    const struct call *call = job->call;
    const char *u = call_option(call, "u"), *track = call_option(call, "track");
    bool bad = false;
    double batch = call_number(call, "batch", 1, &bad);
    if (bad || !take_stamp(job))
        return false;
    if (!(batch >= 1 && batch <= WIRE_ELEMENTS_MAX)) {
        call_say(call, "--batch: outside 1 .. %d", WIRE_ELEMENTS_MAX);
        return false;
    }
    job->batch = (int)batch;
    job->n_u = u == NULL ? 0 : parse_values(u, job->u);
    if (job->n_u < 0) {
        call_say(call,
                 "--u: '%s' is no number; write 0.002, or 0.002,0.01 "
                 "for two components",
                 u);
        return false;
    }
    if (track != NULL)
        job->track = (struct text){track, (int)strlen(track)};
    if (track != NULL && !wire_is_id(track, strlen(track))) {
        call_say(call,
                 "--track: '%s' is no name; use letters, digits and "
                 "_.:- only",
                 track);
        return false;
    }
    return true;
}

static bool take_sensor(struct job *job)
{
    const char *name = call_arg(job->call, 0);
    if (name == NULL)
        return true;
    job->sensor = (struct text){name, (int)strlen(name)};
    if (!wire_is_id(name, strlen(name))) {
        call_say(job->call,
                 "'%s' is no sensor's name; use letters, digits and "
                 "_.:- only",
                 name);
        return false;
    }
    if (job->rig == NULL ||
        rig_find_sensor(&job->rig->rig, name, strlen(name)) >= 0)
        return true;
    const char *near = call_nearest(name, sensor_name, &job->rig->rig);
    call_say(job->call, "%s: no such sensor in %s%s%s", name, job->rig->path,
             near == NULL ? "" : "; did you mean ", near == NULL ? "" : near);
    return false;
}

/* Values on the command line, or lines. */
static int send_all(struct job *job)
{
    double z[READS_MAX];
    int n = call_n_args(job->call) - 1;
    if (n < 1)
        return take_lines(job);
    if (n == 1)
        n = parse_values(call_arg(job->call, 1), z);
    else
        for (int i = 0; i < n; i++)
            if (!wire_parse_number(call_arg(job->call, i + 1),
                                   strlen(call_arg(job->call, i + 1)), &z[i])) {
                n = -1;
                break;
            }
    if (n < 0) {
        call_say(job->call, "a reading is no number; write 1.25");
        return EXIT_WRONG_USE;
    }
    int code = send_numbers(job, z, n);
    return code == EXIT_FINE ? flush_batch(job) : code;
}

static int run_job(struct job *job)
{
    const char *path = call_option(job->call, "rig");
    if (path != NULL && (job->rig = call_rig_path(job->call, path)) == NULL)
        return call_rig_exit(path);
    if (!take_options(job) || !take_sensor(job))
        return EXIT_WRONG_USE;
    struct err err;
    job->to = call_option(job->call, "to");
    if (job->to == NULL)
        job->to = job->rig == NULL ? ADDRESS_UDP : job->rig->udp;
    if (job->to[0] == '\0') {
        call_say(job->call,
                 "%s: receives nothing; add receive.udp to it, or "
                 "give --to HOST:PORT",
                 path);
        return EXIT_NOT_THERE;
    }
    job->fd = address_connect(job->to, SOCK_DGRAM, &err);
    if (job->fd < 0) {
        call_say(job->call, "%s", err.text);
        return err.code == ST_SCHEMA ? EXIT_WRONG_USE : EXIT_NOT_THERE;
    }
    int code = send_all(job);
    if (code == EXIT_FINE && was_refused(job->fd)) {
        call_say(job->call,
                 "%s: nobody listens there; start ropewalkd, or "
                 "name the place with --to HOST:PORT",
                 job->to);
        code = EXIT_NOT_THERE;
    }
    close(job->fd);
    if (code == EXIT_FINE && job->n_refused > 0) {
        call_say(job->call, "%llu lines were not sent",
                 (unsigned long long)job->n_refused);
        code = EXIT_PROBLEM;
    }
    return code;
}

static int run(const struct call *call)
{
    struct job *job = calloc(1, sizeof *job);
    if (job == NULL) {
        call_say(call, "out of memory");
        return EXIT_PROBLEM;
    }
    job->call = call;
    int code = run_job(job);
    settings_free(job->rig);
    free(job);
    return code;
}

static const struct option_row options[] = {
    {"t", "TIME",
     "the stamp: now (the default), none, seconds since 1970, or "
     "2026-03-01T10:00:00Z",
     false},
    {"u", "NUMBER", "its standard uncertainty, where the rig allows it", false},
    {"track", "ID", "which track, where the sensor serves several", false},
    {"to", "HOST:PORT",
     "where to; default is the rig's receive.udp, or "
     "127.0.0.1:8410",
     false},
    {"rig", "RIG.json",
     "takes the address from this rig and checks the "
     "sensor's name",
     false},
    {"batch", "N", "puts N lines into one datagram; default 1", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_send = {
    .name = "send",
    .summary = "sends one measurement, or many from lines",
    .arguments = "[SENSOR [READING]...]",
    .min_args = 0,
    .max_args = 1 + READS_MAX,
    .text =
        "Sends a measurement to the daemon as a JSON datagram and shows on "
        "standard error what was sent. Without a reading it takes lines from "
        "standard input: bare numbers (several components with commas between "
        "them) for the sensor named, or whole JSON objects, which are checked "
        "before they leave.\n\n"
        "The unit is the one that the rig file declares for the sensor.",
    .examples = "ropewalk send laser 1.25                 # stamped now\n"
                "ropewalk send laser 1.25 --t 2026-03-01T10:00:00Z\n"
                "ropewalk send laser < readings.txt       # one number a line\n"
                "ropewalk send --batch 50 < objects.jsonl # whole JSON objects",
    .options = options,
    .run = run,
};
