/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/ingest.h"

#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "daemon/log.h"
#include "daemon/pages.h"

#define SECOND_NS 1000000000

/* An empty socket says that time has come to the reading, less this: a stamp
 * of another processor may lie a little back. */
#define EMPTY_MARGIN_NS 5000000

enum { LOOK_MS = 10, REFUSALS = 48 };

struct ingest {
    const struct settings *settings;
    struct hub *hub;
    struct recorder *recorder;
    struct run *run;
    void *memory;
    struct receive *receive;
    struct sender own; /* our address, for the capture           */
    uv_timer_t timer;
    struct line line;
    int64_t advanced_ns; /* line that time is known to have reached */
    int64_t recorded_ns; /* line of the last record                */
    int64_t told_ns;     /* monotonic, of the last look at drops   */
    uint64_t n_dropped;
    bool wants[2]; /* does anybody want this stream now?      */
    struct log_site drops, full;
    struct refusals { /* one site a reason                               */
        const char *why;
        struct log_site site;
    } refusals[REFUSALS];
};

/* --- what comes in
 * -------------------------------------------------------------- */

static void see_who_listens(struct ingest *in)
{
    in->wants[STREAM_LIVE] = hub_wants(in->hub, STREAM_LIVE);
    in->wants[STREAM_SETTLED] = hub_wants(in->hub, STREAM_SETTLED);
}

/* Reasons are constants: their address tells them apart.  The last place
 * takes all that find none of their own. */
static struct log_site *site_of(struct ingest *in, const char *why)
{
    struct refusals *r = in->refusals;
    int i = 0;
    while (i < REFUSALS - 1 && r[i].why && r[i].why != why)
        i++;
    r[i].why = why;
    return &r[i].site;
}

/* A refused datagram's sender and first bytes, fit for a log. */
static void log_refusal(struct ingest *in, const char *why,
                        const struct sender *from, const uint8_t *bytes,
                        size_t len)
{
    char name[80];
    char head[61];
    size_t n = len < sizeof head - 1 ? len : sizeof head - 1;
    for (size_t i = 0; i < n; i++)
        head[i] = bytes[i] >= 0x20 && bytes[i] < 0x7f ? (char)bytes[i] : '.';
    head[n] = 0;
    endpoint_print_sender(from, name, sizeof name);
    log_often(site_of(in, why), "refused: %s; from %s, its first bytes: %s",
              why, name, head);
}

static void on_datagram(void *ctx, struct line_reading now, int64_t stamp_ns,
                        const struct sender *from, const uint8_t *bytes,
                        size_t len)
{
    struct ingest *in = ctx;
    int64_t a_ns = run_arrival(in->run, line_arrival(&in->line, now, stamp_ns));
    if (in->recorder &&
        !recorder_put(in->recorder, a_ns, from, &in->own, bytes, len))
        log_often(&in->full, "the capture lags behind: records left out");
    in->recorded_ns = in->advanced_ns = a_ns;
    see_who_listens(in);
    run_feed(in->run, a_ns, from, bytes, len);
    const char *why = run_last_refusal(in->run);
    if (why)
        log_refusal(in, why, from, bytes, len);
}

static void on_empty(void *ctx, struct line_reading now)
{
    struct ingest *in = ctx;
    int64_t reached_ns = line_now(&in->line, now) - EMPTY_MARGIN_NS;
    if (reached_ns <= in->advanced_ns)
        return;
    in->advanced_ns = reached_ns;
    see_who_listens(in);
    run_advance(in->run, reached_ns);
    if (in->recorder && reached_ns - in->recorded_ns >= SECOND_NS) {
        recorder_control(in->recorder, CONTROL_TIME, reached_ns, 0, "");
        in->recorded_ns = reached_ns;
    }
}

static void say(void *ctx, const struct message *m)
{
    struct ingest *in = ctx;
    hub_say(in->hub, m);
}

/* --- what only the host knows
 * ------------------------------------------------------ */

static void look_at_drops(struct ingest *in)
{
    struct receive_counts c = receive_counts(in->receive);
    uint64_t n = c.n_dropped - in->n_dropped;
    if (n == 0)
        return;
    in->n_dropped = c.n_dropped;
    log_often(&in->drops,
              "%" PRIu64 " datagrams dropped by the kernel: receive.buffer is "
              "full; raise it, or the system's rmem_max",
              n);
    hub_host(in->hub, "drops", "dropped by the kernel: receive.buffer is full",
             n);
    if (in->recorder)
        recorder_control(in->recorder, CONTROL_DROPS, in->advanced_ns, n,
                         "receive buffer full");
}

static void look_at_clock(struct ingest *in)
{
    struct line_reading now = line_read();
    if (!line_is_stepped(&in->line, now))
        return;
    char text[160];
    snprintf(text, sizeof text,
             "the host's clock was stepped by %.3f s: the arrival line begins "
             "anew, tracks restart",
             (double)(now.real_ns - line_now(&in->line, now)) * 1e-9);
    log_warn("%s", text);
    hub_host(in->hub, "clock", text, 0);
    if (in->recorder) {
        recorder_control(in->recorder, CONTROL_TIME, in->advanced_ns, 0, "");
        recorder_control(in->recorder, CONTROL_REANCHOR, now.real_ns, 0, text);
    }
    line_start(&in->line, now);
    run_reanchor(in->run, now.real_ns);
    in->advanced_ns = in->recorded_ns = now.real_ns;
}

static void on_timer(uv_timer_t *timer)
{
    struct ingest *in = timer->data;
    receive_look(in->receive);
    int64_t mono_ns = line_read().mono_ns;
    if (mono_ns - in->told_ns < SECOND_NS / 2)
        return;
    in->told_ns = mono_ns;
    for (int i = 0; i < REFUSALS && in->refusals[i].why; i++)
        log_flush(&in->refusals[i].site, in->refusals[i].why);
    look_at_drops(in);
    look_at_clock(in);
}

/* --- life
 * ----------------------------------------------------------------------------
 */

static status build_run(struct ingest *in, struct err *err)
{
    const struct rig *rig = &in->settings->rig;
    size_t bytes = run_bytes(rig);
    in->memory = pages_new(bytes);
    if (!in->memory)
        return err_set(err, ST_NOMEM,
                       "%zu bytes for the run are not to be had; lower limits "
                       "or rates",
                       bytes);
    /* Touched now: the first measurements shall not wait for pages. */
    memset(in->memory, 0, bytes);
    in->run = run_init(in->memory, bytes, rig,
                       (struct message_sink){say, in, in->wants});
    return ST_OK;
}

status ingest_start(struct ingest **out, uv_loop_t *loop,
                    const struct settings *s, struct line_reading now,
                    struct hub *hub, struct recorder *recorder,
                    struct endpoint *at, struct err *err)
{
    struct ingest *in = calloc(1, sizeof *in);
    *out = NULL;
    if (!in)
        return err_set(err, ST_NOMEM, "out of memory");
    in->settings = s;
    in->hub = hub;
    in->recorder = recorder;
    see_who_listens(in);
    line_start(&in->line, now);
    in->advanced_ns = in->recorded_ns = now.real_ns;
    status st = build_run(in, err);
    if (st == ST_OK)
        st = endpoint_parse(at, s->udp, err);
    if (st == ST_OK)
        st = receive_start(&in->receive, loop, at, s->udp_buffer_bytes,
                           (struct receive_taker){on_datagram, on_empty, in},
                           err);
    if (st != ST_OK) {
        free(in->memory);
        free(in);
        return st;
    }
    in->own = endpoint_sender(&at->address);
    run_start(in->run, now.real_ns);
    uv_timer_init(loop, &in->timer);
    in->timer.data = in;
    uv_timer_start(&in->timer, on_timer, LOOK_MS, LOOK_MS);
    *out = in;
    return ST_OK;
}

/* Fusion has ended, so this one may wait a little for room in the ring. */
static void record_stop(struct ingest *in, int64_t end_ns)
{
    for (int i = 0; in->recorder && i < 200; i++) {
        if (recorder_control(in->recorder, CONTROL_STOP, end_ns, 0, ""))
            return;
        uv_sleep(1);
    }
}

void ingest_finish(struct ingest *in)
{
    uv_timer_stop(&in->timer);
    receive_drain(in->receive);
    look_at_drops(in);
    int64_t end_ns = run_arrival(in->run, line_now(&in->line, line_read()));
    record_stop(in, end_ns);
    see_who_listens(in);
    run_stop(in->run, end_ns);
}

struct run *ingest_run(struct ingest *in)
{
    return in->run;
}

struct receive *ingest_receive(struct ingest *in)
{
    return in->receive;
}

void ingest_close(struct ingest *in)
{
    uv_close((uv_handle_t *)&in->timer, NULL);
    receive_close(in->receive);
}

void ingest_free(struct ingest *in)
{
    free(in->memory);
    free(in);
}
