/* import: a table of measurements becomes a capture that replays. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/decode.h"
#include "core/wire/encode.h"
#include "core/wire/pcap.h"
#include "core/wire/writer.h"
#include "tools/address.h"
#include "tools/create.h"
#include "tools/import.h"
#include "tools/instant.h"

enum {
    IMPORT_RENAMES_MAX = 32,
    IMPORT_REPORTS_MAX = 20, /* bad lines that are printed               */
    IMPORT_PAYLOAD_MAX = 1024
};

#define IMPORT_OLDEST_DATE_NS 473385600000000000  /* 1985-01-01 */
#define IMPORT_LATEST_NS      4294967295000000000 /* a pcap's 32-bit seconds */

static const char default_origin[] = "2001-09-09T01:46:40Z";

struct record {
    int64_t arrival_ns;
    size_t order, at, len; /* bytes in `bytes`, head and payload       */
};

struct job {
    const struct call *call;
    const char *in, *out;
    const struct settings *rig; /* NULL: take rows as they are            */
    struct text sensor;         /* --sensor, len 0 = by column              */
    int port;
    bool has_origin, origin_decided;
    int64_t origin_ns; /* added to every stamp                     */
    struct import_columns columns;
    struct record *record;
    size_t n, size;
    uint8_t *bytes;
    size_t used, bytes_size;
    uint64_t n_bad, n_left_out;
};

/* --- memory -------------------------------------------------------------- */

static bool grow(void **at, size_t *size, size_t need, size_t each)
{
    if (need <= *size)
        return true;
    size_t want = *size < 4096 ? 4096 : *size * 2;
    want = want < need ? need : want;
    void *bigger = realloc(*at, want * each);
    if (bigger == NULL)
        return false;
    *at = bigger;
    *size = want;
    return true;
}

static char *read_file(const struct call *call, const char *path, size_t *len)
{
    FILE *from = fopen(path, "rb");
    void *bytes = NULL;
    size_t size = 0, got;
    *len = 0;
    if (from == NULL) {
        call_say(call, "%s: %s", path, strerror(errno));
        return NULL;
    }
    do {
        if (!grow(&bytes, &size, *len + 65536, 1)) {
            call_say(call, "%s: out of memory", path);
            break;
        }
        got = fread((char *)bytes + *len, 1, 65536, from);
        *len += got;
    } while (got > 0);
    if (!feof(from)) {
        call_say(call, "%s: %s", path, strerror(errno));
        free(bytes);
        bytes = NULL;
    }
    fclose(from);
    return bytes;
}

/* --- rows ---------------------------------------------------------------- */

/* The first stamp tells whether stamps are dates or count from zero. */
static void decide_origin(struct job *job, int64_t first_ns)
{
    char text[40];
    job->origin_decided = true;
    if (first_ns >= IMPORT_OLDEST_DATE_NS) {
        job->origin_ns = 0;
        if (job->has_origin)
            call_say(job->call, "stamps are dates already; --origin is not "
                                "needed and left out");
        return;
    }
    wire_print_time(job->origin_ns, text);
    call_say(job->call, "stamps count from zero; zero is taken as %s%s", text,
             job->has_origin ? "" : " (--origin TIME says otherwise)");
}

/* Keeps what the rig reads: unknown sensors go, so do components that it does
 * not read.  False when the row is left out. */
static bool fit_to_rig(struct job *job, struct measurement *m)
{
    if (job->rig == NULL)
        return true;
    const struct rig *rig = &job->rig->rig;
    int i = rig_find_sensor(rig, m->sensor.at, (size_t)m->sensor.len);
    if (i < 0)
        return false;
    int n = rig->sensor[i].reads.m;
    m->n_z = m->n_z > n ? n : m->n_z;
    m->n_u = m->n_u > n ? n : m->n_u;
    return true;
}

static status add_record(struct job *job, struct import_row *row,
                         struct err *err)
{
    static const struct sender from = {4, {127, 0, 0, 1}, 49152};
    struct sender to = {4, {127, 0, 0, 1}, (uint16_t)job->port};
    char payload[IMPORT_PAYLOAD_MAX];
    size_t len = import_encode(&row->m, payload, sizeof payload);
    if (!grow((void **)&job->record, &job->size, job->n + 1,
              sizeof *job->record) ||
        !grow((void **)&job->bytes, &job->bytes_size,
              job->used + PCAP_RECORD_HEAD_MAX + len, 1))
        return err_set(err, ST_NOMEM, "out of memory");
    uint8_t *at = job->bytes + job->used;
    size_t head = pcap_write_record_head(at, row->arrival_ns, &from, &to,
                                         (uint8_t *)payload, len);
    memcpy(at + head, payload, len);
    job->record[job->n] =
        (struct record){row->arrival_ns, job->n, job->used, head + len};
    job->used += head + len;
    job->n++;
    return ST_OK;
}

static status take_row(struct job *job, const struct csv_line *line,
                       struct err *err)
{
    struct import_row row;
    status code = import_parse(&job->columns, line, &row, err);
    if (code != ST_OK)
        return code;
    if (row.m.sensor.len == 0)
        row.m.sensor = job->sensor;
    if (row.m.sensor.len == 0)
        return err_set(err, ST_PARSE, "no sensor; fill that field");
    if (!job->origin_decided)
        decide_origin(job, row.m.has_t ? row.m.t_ns : row.arrival_ns);
    if (__builtin_add_overflow(row.m.t_ns, job->origin_ns, &row.m.t_ns) ||
        __builtin_add_overflow(row.arrival_ns, job->origin_ns,
                               &row.arrival_ns) ||
        row.arrival_ns < 0 || row.arrival_ns > IMPORT_LATEST_NS)
        return err_set(err, ST_PARSE,
                       "arrival outside 1970 .. 2106; check "
                       "the column's unit");
    if (!fit_to_rig(job, &row.m)) {
        job->n_left_out++;
        return ST_OK;
    }
    return add_record(job, &row, err);
}

static void report_line(struct job *job, int line, const struct err *err)
{
    job->n_bad++;
    if (job->n_bad <= IMPORT_REPORTS_MAX)
        fprintf(stderr, "%s:%d: %s\n", job->in, line, err->text);
    if (job->n_bad == IMPORT_REPORTS_MAX + 1)
        fprintf(stderr, "%s: further bad lines are counted only\n", job->in);
}

static int take_rows(struct job *job, struct csv *csv)
{
    struct csv_line line;
    int64_t last_ns = 0;
    while (csv_next(csv, &line)) {
        struct err err;
        status code = take_row(job, &line, &err);
        if (code == ST_NOMEM) {
            call_say(job->call, "%s", err.text);
            return EXIT_PROBLEM;
        }
        if (code != ST_OK)
            report_line(job, line.number, &err);
        if (line.number % 8192 == 0)
            call_progress(&last_ns, "line %d", line.number);
    }
    call_progress_end(&last_ns);
    bool skips = call_option(job->call, "skip-bad") != NULL;
    if (job->n_bad > 0 && !skips) {
        call_say(job->call,
                 "%llu bad lines, nothing written; mend them, or "
                 "leave them out with --skip-bad",
                 (unsigned long long)job->n_bad);
        return EXIT_PROBLEM;
    }
    if (job->n == 0) {
        call_say(job->call, "%s: no measurement in it", job->in);
        return EXIT_PROBLEM;
    }
    return EXIT_FINE;
}

static int take_heading(struct job *job, struct csv *csv)
{
    struct import_rename rename[IMPORT_RENAMES_MAX];
    const char *text;
    int n = 0;
    while ((text = call_option_at(job->call, "map", n)) != NULL) {
        const char *equals = strchr(text, '=');
        if (equals == NULL || n >= IMPORT_RENAMES_MAX) {
            call_say(job->call, "--map %s: write NEW=OLD, %d times at most",
                     text, IMPORT_RENAMES_MAX);
            return EXIT_WRONG_USE;
        }
        rename[n++] =
            (struct import_rename){{text, (int)(equals - text)},
                                   {equals + 1, (int)strlen(equals + 1)}};
    }
    struct csv_line line;
    struct err err;
    if (!csv_next(csv, &line)) {
        call_say(job->call, "%s: empty; the first line names the columns",
                 job->in);
        return EXIT_PROBLEM;
    }
    if (import_heading(&job->columns, &line, rename, n, job->sensor.len > 0,
                       &err) != ST_OK) {
        fprintf(stderr, "%s:%d: %s\n", job->in, line.number, err.text);
        return EXIT_PROBLEM;
    }
    if (job->columns.n_ignored > 0)
        call_say(job->call, "%d columns with other names are left out",
                 job->columns.n_ignored);
    return EXIT_FINE;
}

/* --- the file ------------------------------------------------------------ */

static int by_arrival(const void *a, const void *b)
{
    const struct record *x = a, *y = b;
    if (x->arrival_ns != y->arrival_ns)
        return x->arrival_ns < y->arrival_ns ? -1 : 1;
    return x->order < y->order ? -1 : x->order > y->order;
}

static int write_capture(struct job *job)
{
    uint8_t head[PCAP_FILE_HEAD_SIZE];
    const char *const input[] = {call_arg(job->call, 0),
                                 call_option(job->call, "rig")};
    FILE *to = create_file(job->call, job->out, input, 2);
    if (to == NULL)
        return EXIT_NOT_THERE;
    qsort(job->record, job->n, sizeof *job->record, by_arrival);
    pcap_write_file_head(head);
    bool ok = fwrite(head, sizeof head, 1, to) == 1;
    for (size_t i = 0; ok && i < job->n; i++)
        ok = fwrite(job->bytes + job->record[i].at, job->record[i].len, 1,
                    to) == 1;
    int reason = errno;
    if (fclose(to) != 0 && ok) {
        reason = errno;
        ok = false;
    }
    if (ok)
        return EXIT_FINE;
    call_say(job->call, "%s: %s; the half-written file is removed", job->out,
             strerror(reason));
    remove(job->out);
    return EXIT_PROBLEM;
}

static void say_result(const struct job *job)
{
    char first[40], last[40], line[512];
    int64_t first_ns = job->record[0].arrival_ns;
    int64_t last_ns = job->record[job->n - 1].arrival_ns;
    wire_print_time(first_ns, first);
    wire_print_time(last_ns, last);
    call_say(job->call, "%s: %zu measurements, %s to %s", job->out, job->n,
             first, last);
    if (job->n_left_out > 0)
        call_say(job->call,
                 "%llu rows of sensors that the rig does not have "
                 "are left out",
                 (unsigned long long)job->n_left_out);
    if (job->n_bad > 0)
        call_say(job->call, "%llu bad lines are left out",
                 (unsigned long long)job->n_bad);
    if (call_option(job->call, "json") == NULL)
        return;
    struct writer w;
    writer_init(&w, WIRE_JSON, line, sizeof line);
    writer_open_map(&w);
    writer_key(&w, "measurements");
    writer_count(&w, job->n);
    writer_key(&w, "left_out");
    writer_count(&w, job->n_left_out);
    writer_key(&w, "bad_lines");
    writer_count(&w, job->n_bad);
    writer_key(&w, "first");
    writer_time(&w, first_ns);
    writer_key(&w, "last");
    writer_time(&w, last_ns);
    writer_close(&w);
    fwrite(line, writer_finish(&w), 1, stdout);
}

/* --- the verb ------------------------------------------------------------ */

static int take_options(struct job *job, struct settings **rig)
{
    const struct call *call = job->call;
    const char *origin = call_option(call, "origin");
    const char *sensor = call_option(call, "sensor");
    const char *path = call_option(call, "rig");
    bool bad = false;
    double port = call_number(call, "port", 0, &bad);
    if (bad)
        return EXIT_WRONG_USE;
    job->has_origin = origin != NULL;
    origin = origin == NULL ? default_origin : origin;
    if (!instant_parse(origin, strlen(origin), &job->origin_ns)) {
        call_say(call, "--origin: '%s' is no time; write %s", origin,
                 default_origin);
        return EXIT_WRONG_USE;
    }
    if (sensor != NULL && !wire_is_id(sensor, strlen(sensor))) {
        call_say(call,
                 "--sensor: '%s' is no name; use letters, digits and "
                 "_.:- only",
                 sensor);
        return EXIT_WRONG_USE;
    }
    if (sensor != NULL)
        job->sensor = (struct text){sensor, (int)strlen(sensor)};
    if (path != NULL && (*rig = call_rig_path(call, path)) == NULL)
        return call_rig_exit(path);
    job->rig = *rig;
    job->port = job->rig == NULL ? 0 : address_port(job->rig->udp);
    job->port = job->port == 0 ? address_port(ADDRESS_UDP) : job->port;
    if (call_option(call, "port") != NULL)
        job->port = port >= 1 && port <= 65535 ? (int)port : 0;
    if (job->port == 0)
        call_say(call, "--port: outside 1 .. 65535");
    return job->port == 0 ? EXIT_WRONG_USE : EXIT_FINE;
}

static int run(const struct call *call)
{
    struct job job = {
        .call = call, .in = call_arg(call, 0), .out = call_arg(call, 1)};
    struct settings *rig = NULL;
    char *text = NULL;
    size_t len;
    int code = take_options(&job, &rig);
    if (code == EXIT_FINE && (text = read_file(call, job.in, &len)) == NULL)
        code = EXIT_NOT_THERE;
    struct csv csv;
    if (code == EXIT_FINE) {
        csv_init(&csv, text, len);
        code = take_heading(&job, &csv);
    }
    if (code == EXIT_FINE)
        code = take_rows(&job, &csv);
    if (code == EXIT_FINE)
        code = write_capture(&job);
    if (code == EXIT_FINE)
        say_result(&job);
    free(job.record);
    free(job.bytes);
    free(text);
    settings_free(rig);
    return code;
}

static const struct option_row options[] = {
    {"origin", "TIME",
     "what zero means, for stamps that count from zero; "
     "default 2001-09-09T01:46:40Z",
     false},
    {"sensor", "NAME", "the sensor of rows that name none", false},
    {"map", "NEW=OLD", "takes column OLD as NEW, as in --map z0=height", true},
    {"rig", "RIG.json",
     "keeps only the sensors and components that this rig "
     "reads, and takes its port",
     false},
    {"port", "N", "the port that the datagrams went to; default 8410", false},
    {"skip-bad", NULL, "leaves bad lines out instead of giving up", false},
    {"json", NULL, "one JSON object about the result on standard output",
     false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_import = {
    .name = "import",
    .summary = "turns a table (CSV) into a capture that replays",
    .arguments = "TABLE.csv CAPTURE.pcap",
    .min_args = 2,
    .max_args = 2,
    .text =
        "Reads a table whose first line names its columns: time_ns or t (the "
        "sensor's stamp: whole nanoseconds, or seconds since 1970 or a date "
        "like 2026-03-01T10:00:00Z), arrival_ns or arrival, sensor, track, "
        "seq, z0 .. z7, u0 .. u7. Either a stamp or an arrival is needed, and "
        "a sensor, and z0.\n\n"
        "An empty arrival is taken as the stamp. Empty readings at the end of "
        "a row mean fewer components, an empty one before others no reading "
        "of that component. Other columns are left out, and that is said.\n\n"
        "Where the first stamp lies before 1985, stamps count from zero: "
        "--origin says which time that is.",
    .examples =
        "ropewalk import day.csv day.pcap              # then replay it\n"
        "ropewalk import --rig rig.json day.csv day.pcap # only what it reads\n"
        "ropewalk import --map t=time --map z0=height --sensor gauge a.csv "
        "a.pcap",
    .options = options,
    .run = run,
};
