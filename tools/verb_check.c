/* check: is a rig file right, and what does it mean? */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <stdlib.h>
#include <string.h>

#include "core/run/run.h"
#include "core/wire/pcap.h"
#include "core/wire/writer.h"
#include "tools/check.h"
#include "tools/rig_text.h"

enum { CHECK_JSON_SIZE = 1 << 20 };

/* --- what follows from the rig ------------------------------------------- */

static double disk_bytes_per_s(const struct rig *rig)
{
    return rig_rate_hz(rig) * PCAP_RECORD_USUAL;
}

static bool is_loopback(const char *address)
{
    return strncmp(address, "127.", 4) == 0 ||
           strncmp(address, "[::1]", 5) == 0;
}

/* Everything that is allowed and yet worth a second look. */
static void each_note(const struct settings *s,
                      void (*note)(void *ctx, const char *text), void *ctx)
{
    const struct rig *rig = &s->rig;
    char text[512];
    for (int i = 0; i < rig->n_sensors; i++) {
        const struct rig_sensor *sensor = &rig->sensor[i];
        if (sensor->stamp == RIG_STAMP_ARRIVAL) {
            snprintf(text, sizeof text,
                     "%s: stamped on arrival, so the order "
                     "of arrival counts, and a duplicate without seq cannot "
                     "be told",
                     sensor->name);
            note(ctx, text);
        }
        if (sensor->silent_after_ns > 0 &&
            (double)sensor->silent_after_ns * sensor->rate_hz < 2e9) {
            snprintf(text, sizeof text,
                     "%s: silent_after is below two of its "
                     "periods; one lost datagram makes it silent",
                     sensor->name);
            note(ctx, text);
        }
        if (!sensor->has_gate) {
            snprintf(text, sizeof text,
                     "%s: no gate, so a false reading goes "
                     "straight into the estimate",
                     sensor->name);
            note(ctx, text);
        }
    }
    for (int i = 0; i < rig->n_kinds; i++)
        if (!rig->kind[i].has_good) {
            snprintf(text, sizeof text,
                     "%s: no good.u, so it is good as soon "
                     "as every state is determined",
                     rig->kind[i].id);
            note(ctx, text);
        }
    if (!is_loopback(s->udp) && s->udp[0] != '\0' && rig->n_senders == 0)
        note(ctx, "receive.udp is open to the network and receive.senders is "
                  "empty: everyone may send");
}

/* --- text ---------------------------------------------------------------- */

static void print_kind(const struct rig *rig, int index)
{
    const struct rig_kind *kind = &rig->kind[index];
    char unit[RIG_UNIT_SIZE + 16], words[RIG_TEXT_SIZE], text[32];
    printf("\ntrack %s%s, %d state%s\n", kind->id, kind->is_prefix ? "*" : "",
           kind->n, kind->n == 1 ? "" : "s");
    for (int i = 0; i < kind->n_blocks; i++) {
        const struct block *b = &kind->block[i];
        printf("  %s: %s", kind->state[b->at].name, rig_text_model(b->model));
        rig_text_q_unit(b->model, kind->state[b->at].unit, unit, sizeof unit);
        rig_text_unmodelled(kind, b, words, sizeof words);
        if (unit[0] != '\0')
            printf(", q = %g %s: like %s", b->q, unit, words);
        putchar('\n');
        for (int k = b->at; k < b->at + b->n; k++) {
            const struct rig_state *state = &kind->state[k];
            printf("    %-16s %-8s", state->name, state->unit);
            if (state->has_prior)
                printf(" starts at %g, u %g;", state->prior_mean,
                       state->prior_u);
            else
                printf(" starts from data;");
            if (state->good_u > 0)
                printf(" good below u %g;", state->good_u);
            if (state->lost_u > 0)
                printf(" lost above u %g;", state->lost_u);
            putchar('\n');
        }
    }
    rig_text_time(kind->recover_for_ns, text, sizeof text);
    printf("  recovery: widened after %d refused in a row for %s; a false "
           "burst of most\n  sensors is withstood up to %.3g s; fewer are set "
           "aside and never followed\n",
           kind->recover_refused, text, rig_text_burst_s(rig, index));
}

static void print_sensor(const struct rig *rig, const struct rig_sensor *sensor)
{
    static const char *const stamps[] = {
        "its stamp if it has one, else arrival", "its stamp", "arrival"};
    const struct rig_kind *kind = &rig->kind[sensor->kind];
    char words[RIG_TEXT_SIZE], silent[32], delay[32];
    printf("\nsensor %s of track %s%s, %g Hz\n", sensor->name, kind->id,
           kind->is_prefix ? "*" : "", sensor->rate_hz);
    for (int i = 0; i < sensor->reads.m; i++) {
        rig_text_reads(kind, &sensor->reads, i, words, sizeof words);
        printf("  reads %s in %s, u %g %s\n", words, sensor->unit[i],
               rig_text_u(sensor, i), sensor->unit[i]);
    }
    rig_text_time(sensor->silent_after_ns, silent, sizeof silent);
    rig_text_time(sensor->delay_ns, delay, sizeof delay);
    if (sensor->has_gate)
        printf("  gate %g: refused above NIS %.4g\n", sensor->gate_p,
               sensor->gate[sensor->reads.m]);
    printf("  silent after %s; time is %s%s%s; %d pending at most\n", silent,
           stamps[sensor->stamp], sensor->delay_ns != 0 ? ", minus " : "",
           sensor->delay_ns != 0 ? delay : "", rig_pending_quota(rig, sensor));
}

static void print_note(void *ctx, const char *text)
{
    (void)ctx;
    printf("  note: %s\n", text);
}

static void print_load(const struct settings *s)
{
    const struct rig *rig = &s->rig;
    char memory[32], disk[32];
    double cost_s = check_cost_s(rig);
    rig_text_bytes((double)run_bytes(rig), memory, sizeof memory);
    rig_text_bytes(disk_bytes_per_s(rig) * 3600, disk, sizeof disk);
    printf("\nmemory %s for the estimate; capture about %s an hour\n", memory,
           disk);
    printf("load %g measurements/s", rig_rate_hz(rig));
    if (cost_s > 0)
        printf(", about %.2g us each for the estimate on this machine, %.2g %% "
               "of a core",
               cost_s * 1e6, 100 * cost_s * rig_rate_hz(rig));
    for (int i = 0; i < rig->n_kinds; i++)
        if (rig->kind[i].is_prefix) {
            printf("; with as many tracks as limits.tracks has room for");
            break;
        }
    printf("\nlimits: %d tracks, %d ids a sender, %g repeated steps a sensor "
           "and second\n",
           rig->max_tracks, rig->max_ids_per_sender, rig->max_steps);
}

static const char *or_none(const char *text)
{
    return text[0] == '\0' ? "none" : text;
}

static void print_text(const struct settings *s)
{
    const struct rig *rig = &s->rig;
    char hold[32], horizon[32], ahead[32];
    rig_text_time(rig->hold_ns, hold, sizeof hold);
    rig_text_time(rig->horizon_ns, horizon, sizeof horizon);
    rig_text_time(rig->ahead_ns, ahead, sizeof ahead);
    printf("%s: valid, \"%s\"\n", s->path, rig->name);
    printf("receives %s, serves %s, captures into %s\n", or_none(s->udp),
           or_none(s->tcp), or_none(s->folder));
    printf("order: hold %s, horizon %s, ahead %s\n", hold, horizon, ahead);
    for (int i = 0; i < rig->n_kinds; i++)
        print_kind(rig, i);
    for (int i = 0; i < rig->n_sensors; i++)
        print_sensor(rig, &rig->sensor[i]);
    print_load(s);
    each_note(s, print_note, NULL);
}

/* --- JSON ---------------------------------------------------------------- */

static void write_pair(struct writer *w, const char *key, const char *text)
{
    writer_key(w, key);
    writer_text(w, text);
}

static void write_value(struct writer *w, const char *key, double x)
{
    writer_key(w, key);
    writer_number(w, x);
}

static void write_block(struct writer *w, const struct rig_kind *kind,
                        const struct block *b)
{
    char unit[RIG_UNIT_SIZE + 16], words[RIG_TEXT_SIZE];
    rig_text_q_unit(b->model, kind->state[b->at].unit, unit, sizeof unit);
    rig_text_unmodelled(kind, b, words, sizeof words);
    writer_open_map(w);
    write_pair(w, "model", rig_text_model(b->model));
    write_value(w, "q", b->q);
    write_pair(w, "q_unit", unit);
    write_pair(w, "like", words);
    writer_key(w, "states");
    writer_open_array(w);
    for (int k = b->at; k < b->at + b->n; k++) {
        writer_open_map(w);
        write_pair(w, "name", kind->state[k].name);
        write_pair(w, "unit", kind->state[k].unit);
        writer_close(w);
    }
    writer_close(w);
    writer_close(w);
}

static void write_kind(struct writer *w, const struct rig *rig, int index)
{
    const struct rig_kind *kind = &rig->kind[index];
    writer_open_map(w);
    write_pair(w, "id", kind->id);
    writer_key(w, "is_prefix");
    writer_bool(w, kind->is_prefix);
    write_value(w, "burst_withstood_s", rig_text_burst_s(rig, index));
    writer_key(w, "blocks");
    writer_open_array(w);
    for (int i = 0; i < kind->n_blocks; i++)
        write_block(w, kind, &kind->block[i]);
    writer_close(w);
    writer_close(w);
}

static void write_sensor(struct writer *w, const struct rig *rig,
                         const struct rig_sensor *sensor)
{
    const struct rig_kind *kind = &rig->kind[sensor->kind];
    char words[RIG_TEXT_SIZE];
    writer_open_map(w);
    write_pair(w, "name", sensor->name);
    write_pair(w, "track", kind->id);
    write_value(w, "rate_hz", sensor->rate_hz);
    write_value(w, "silent_after_s", (double)sensor->silent_after_ns * 1e-9);
    writer_key(w, "pending_at_most");
    writer_count(w, (uint64_t)rig_pending_quota(rig, sensor));
    writer_key(w, "reads");
    writer_open_array(w);
    for (int i = 0; i < sensor->reads.m; i++) {
        rig_text_reads(kind, &sensor->reads, i, words, sizeof words);
        writer_open_map(w);
        write_pair(w, "what", words);
        write_pair(w, "unit", sensor->unit[i]);
        write_value(w, "u", rig_text_u(sensor, i));
        writer_close(w);
    }
    writer_close(w);
    writer_close(w);
}

static void write_note(void *ctx, const char *text)
{
    writer_text(ctx, text);
}

static size_t write_json(const struct settings *s, char *buf, size_t size)
{
    const struct rig *rig = &s->rig;
    struct writer w;
    writer_init(&w, WIRE_JSON, buf, size);
    writer_open_map(&w);
    writer_key(&w, "valid");
    writer_bool(&w, true);
    write_pair(&w, "file", s->path);
    write_pair(&w, "rig", rig->name);
    write_pair(&w, "hash", rig->file_hash);
    write_pair(&w, "udp", s->udp);
    write_pair(&w, "tcp", s->tcp);
    write_pair(&w, "captures", s->folder);
    write_value(&w, "hold_s", (double)rig->hold_ns * 1e-9);
    write_value(&w, "horizon_s", (double)rig->horizon_ns * 1e-9);
    write_value(&w, "ahead_s", (double)rig->ahead_ns * 1e-9);
    writer_key(&w, "memory_bytes");
    writer_count(&w, run_bytes(rig));
    write_value(&w, "disk_bytes_per_s", disk_bytes_per_s(rig));
    write_value(&w, "measurements_per_s", rig_rate_hz(rig));
    writer_key(&w, "max_tracks");
    writer_count(&w, (uint64_t)rig->max_tracks);
    writer_key(&w, "tracks");
    writer_open_array(&w);
    for (int i = 0; i < rig->n_kinds; i++)
        write_kind(&w, rig, i);
    writer_close(&w);
    writer_key(&w, "sensors");
    writer_open_array(&w);
    for (int i = 0; i < rig->n_sensors; i++)
        write_sensor(&w, rig, &rig->sensor[i]);
    writer_close(&w);
    writer_key(&w, "notes");
    writer_open_array(&w);
    each_note(s, write_note, &w);
    writer_close(&w);
    writer_close(&w);
    return writer_finish(&w);
}

/* --- the verb ------------------------------------------------------------ */

static int run(const struct call *call)
{
    struct settings *s = call_rig(call, 0);
    if (s == NULL)
        return call_rig_exit(call_arg(call, 0));
    int code = EXIT_FINE;
    if (call_option(call, "json") == NULL) {
        print_text(s);
    } else {
        char *buf = malloc(CHECK_JSON_SIZE);
        size_t len = buf == NULL ? 0 : write_json(s, buf, CHECK_JSON_SIZE);
        fwrite(buf, len, 1, stdout);
        code = len == 0 ? EXIT_PROBLEM : EXIT_FINE;
        free(buf);
    }
    settings_free(s);
    return code;
}

static const struct option_row options[] = {
    {"json", NULL, "one JSON object instead of text", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_check = {
    .name = "check",
    .summary = "is a rig file right, and what does it mean?",
    .arguments = "RIG.json",
    .min_args = 1,
    .max_args = 1,
    .text =
        "Reads a rig file and reports everything that is wrong with it at "
        "once, each with its place and a remedy, and exits with 78. A valid "
        "one is shown as it was understood: addresses, tracks with their "
        "states, units and process noise (as q and as the unmodelled motion "
        "that it stands for), sensors with u in their own unit, limits, "
        "memory, load, and how long a burst of false readings is withstood.",
    .examples =
        "ropewalk check rig.json                       # what is in it\n"
        "ropewalk check rig.json --set order.hold=20ms # with one change\n"
        "ropewalk check rig.json --json                # for scripts",
    .takes_rig = true,
    .options = options,
    .run = run,
};
