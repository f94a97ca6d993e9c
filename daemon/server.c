/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/server.h"

#include <cjson/cJSON.h>
#include <errno.h>
#include <inttypes.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/timex.h>
#include <unistd.h>

#include "core/wire/encode.h"
#include "daemon/ingest.h"
#include "daemon/log.h"

struct server {
    const struct settings *settings;
    const struct server_options *options;
    uv_loop_t loop;
    uv_signal_t term, interrupt;
    bool is_stopping;
    struct line_reading begun;
    struct hub *hub;
    struct recorder *recorder;
    struct ingest *ingest;
    struct endpoint udp, tcp;
    int started;
};

/* --- components
 * -------------------------------------------------------------------- */

static status signals_start(struct server *s, struct err *err);
static void signals_close(struct server *s);

static bool is_clock_set(void)
{
    struct timex t = {0};
    return adjtimex(&t) != TIME_ERROR && !(t.status & STA_UNSYNC);
}

/* Waits for a synchronised clock where senders elsewhere stamp by theirs; a
 * signal ends the wait. */
static status clock_start(struct server *s, struct err *err)
{
    struct endpoint at;
    (void)err;
    if (endpoint_parse(&at, s->settings->udp, NULL) != ST_OK ||
        endpoint_is_loopback(&at) || is_clock_set())
        return ST_OK;
    int64_t until_ns = line_read().mono_ns + s->settings->clock_wait_ns;
    log_info("waiting up to %.0f s (clock.wait) for a synchronised clock; a "
             "signal ends the wait",
             (double)s->settings->clock_wait_ns * 1e-9);
    uv_ref((uv_handle_t *)&s->term); /* a loop without references looks at
                                        nothing */
    while (!s->is_stopping && !is_clock_set() &&
           line_read().mono_ns < until_ns) {
        uv_sleep(50);
        uv_run(&s->loop, UV_RUN_NOWAIT);
    }
    uv_unref((uv_handle_t *)&s->term);
    if (!s->is_stopping && !is_clock_set())
        log_warn("the host's clock is not synchronised: going on without; "
                 "stamps of other machines may not fit");
    return ST_OK;
}

static void clock_close(struct server *s)
{
    (void)s;
}

static status publish_start(struct server *s, struct err *err)
{
    return hub_start(&s->hub, s->settings, &s->tcp, err);
}

static void publish_close(struct server *s)
{
    hub_stop(s->hub);
    s->hub = NULL;
}

static void on_gap(void *ctx, const char *why, uint64_t n)
{
    struct server *s = ctx;
    hub_host(s->hub, "gap", why, n);
}

static status record_start(struct server *s, struct err *err)
{
    s->begun = line_read(); /* the arrival line begins here */
    if (!s->settings->folder[0])
        return ST_OK;
    return recorder_start(&s->recorder, s->settings, s->begun.real_ns,
                          (struct recorder_watch){on_gap, s}, err);
}

static void record_close(struct server *s)
{
    recorder_stop(s->recorder);
    s->recorder = NULL;
}

static status receive_begin(struct server *s, struct err *err)
{
    if (!s->settings->udp[0])
        return err_set(err, ST_SCHEMA,
                       "%s: no receive.udp; add for example \"receive\": "
                       "{\"udp\": \"127.0.0.1:8410\"}",
                       s->settings->path);
    return ingest_start(&s->ingest, &s->loop, s->settings, s->begun, s->hub,
                        s->recorder, &s->udp, err);
}

static void log_summary(struct server *s);

static void receive_end(struct server *s)
{
    ingest_finish(s->ingest);
    log_summary(s);
    ingest_close(s->ingest);
    uv_run(&s->loop, UV_RUN_DEFAULT);
    ingest_free(s->ingest);
    s->ingest = NULL;
}

/* Started top to bottom, closed bottom to top.  Receiving is last: no
 * datagram may arrive before everything that handles it is ready. */
static const struct component {
    status (*start)(struct server *s, struct err *err);
    void (*close)(struct server *s);
} components[] = {{signals_start, signals_close},
                  {clock_start, clock_close},
                  {publish_start, publish_close},
                  {record_start, record_close},
                  {receive_begin, receive_end}};

enum { N_COMPONENTS = sizeof components / sizeof *components };

static void close_components(struct server *s)
{
    while (s->started > 0)
        components[--s->started].close(s);
    uv_run(&s->loop, UV_RUN_DEFAULT);
    uv_loop_close(&s->loop);
}

static status start_components(struct server *s, struct err *err)
{
    for (s->started = 0; s->started < N_COMPONENTS && !s->is_stopping;
         s->started++) {
        status st = components[s->started].start(s, err);
        if (st != ST_OK)
            return st;
    }
    return ST_OK;
}

/* --- signals
 * ------------------------------------------------------------------------- */

static void on_signal(uv_signal_t *handle, int number)
{
    struct server *s = handle->data;
    s->is_stopping = true;
    log_info("signal %d: stopping; a second one ends at once", number);
    signal(number, SIG_DFL);
    uv_signal_stop(&s->term);
    uv_signal_stop(&s->interrupt);
    signal(SIGTERM, SIG_DFL);
    signal(SIGINT, SIG_DFL);
    uv_stop(&s->loop);
}

static status signals_start(struct server *s, struct err *err)
{
    (void)err;
    signal(SIGPIPE, SIG_IGN);
    uv_signal_init(&s->loop, &s->term);
    uv_signal_init(&s->loop, &s->interrupt);
    s->term.data = s->interrupt.data = s;
    uv_signal_start(&s->term, on_signal, SIGTERM);
    uv_signal_start(&s->interrupt, on_signal, SIGINT);
    uv_unref((uv_handle_t *)&s->term);
    uv_unref((uv_handle_t *)&s->interrupt);
    return ST_OK;
}

static void signals_close(struct server *s)
{
    uv_close((uv_handle_t *)&s->term, NULL);
    uv_close((uv_handle_t *)&s->interrupt, NULL);
}

/* --- what the operator is told
 * ---------------------------------------------------------- */

/* A span in the unit that people would say it in. */
static void print_span(double span_s, char *out, size_t size)
{
    static const struct {
        double s;
        const char *name;
    } units[] = {{86400, "days"}, {3600, "h"}, {60, "min"}, {1, "s"}};
    for (int i = 0; i < 4; i++)
        if (span_s >= 2 * units[i].s) {
            snprintf(out, size, "%.3g %s", span_s / units[i].s, units[i].name);
            return;
        }
    snprintf(out, size, "%.3g ms", span_s * 1e3);
}

static void tell_reach(const struct server *s)
{
    char udp[80], tcp[80], span[32];
    endpoint_print(&s->udp, udp, sizeof udp);
    endpoint_print(&s->tcp, tcp, sizeof tcp);
    log_info("receiving on udp %s: %s", udp,
             endpoint_is_loopback(&s->udp)
                 ? "only programs on this machine can send"
                 : "everybody on the network can send; receive.senders "
                   "narrows that");
    if (!s->settings->tcp[0])
        log_info("publishing nowhere: no serve.tcp");
    else if (endpoint_is_loopback(&s->tcp))
        log_info("publishing on tcp %s: only programs on this machine can "
                 "listen",
                 tcp);
    else
        log_warn("publishing on tcp %s: everybody on the network can listen",
                 tcp);
    int size = receive_buffer(ingest_receive(s->ingest));
    double rate_hz = rig_rate_hz(&s->settings->rig);
    print_span(size / 832.0 / rate_hz, span, sizeof span);
    log_info("socket buffer %d KiB: bridges %s of standstill at the declared "
             "%.0f datagrams/s%s",
             size / 1024, span, rate_hz,
             size < s->settings->udp_buffer_bytes
                 ? "; less than receive.buffer: raise net.core.rmem_max"
                 : "");
}

static void tell_capture(const struct server *s)
{
    if (!s->recorder) {
        log_warn("no capture: this run cannot be repeated");
        return;
    }
    double bytes_per_s = rig_rate_hz(&s->settings->rig) * PCAP_RECORD_USUAL;
    double lasts_s = recorder_lasts_s(s->settings, bytes_per_s);
    if (lasts_s < 0) {
        log_info("capture in %s: how long the disk lasts is not known",
                 recorder_folder(s->recorder));
        return;
    }
    char span[32];
    print_span(lasts_s, span, sizeof span);
    log_info("capture in %s: the disk lasts %s at the declared rates, down to "
             "capture.floor",
             recorder_folder(s->recorder), span);
}

static status write_ports(const struct server *s, struct err *err)
{
    const char *path = s->options->port_file;
    char part[SETTINGS_PATH_SIZE];
    if (!path)
        return ST_OK;
    snprintf(part, sizeof part, "%s.part", path);
    cJSON *ports = cJSON_CreateObject();
    cJSON_AddNumberToObject(ports, "udp", endpoint_port(&s->udp));
    cJSON_AddNumberToObject(ports, "tcp",
                            s->settings->tcp[0] ? endpoint_port(&s->tcp) : 0);
    cJSON_AddNumberToObject(ports, "pid", (double)getpid());
    cJSON_AddStringToObject(ports, "capture",
                            s->recorder ? recorder_folder(s->recorder) : "");
    char *text = cJSON_PrintUnformatted(ports);
    cJSON_Delete(ports);
    FILE *f = fopen(part, "w");
    bool is_good = f && text && fprintf(f, "%s\n", text) > 0;
    is_good = f && fclose(f) == 0 && is_good;
    cJSON_free(text);
    if (!is_good)
        return err_set(err, ST_IO, "--port-file %s: cannot be written: %s",
                       path, strerror(errno));
    if (rename(part, path) != 0)
        return err_set(err, ST_IO, "--port-file %s: cannot be written: %s",
                       path, strerror(errno));
    return ST_OK;
}

static void log_summary(struct server *s)
{
    const struct rig *rig = &s->settings->rig;
    struct run *run = ingest_run(s->ingest);
    size_t size = wire_message_bound(rig);
    char *text = malloc(size);
    struct track_summary track;
    if (!text)
        return;
    struct receive_counts c = receive_counts(ingest_receive(s->ingest));
    log_info("summary follows; dropped by the kernel %" PRIu64 ", cut %" PRIu64
             ", failed reads %" PRIu64,
             c.n_dropped, c.n_cut, c.n_errors);
    bool is_read =
        log_text(text, wire_summary_begin(rig, run_counts(run), text, size));
    for (int i = 0; is_read && run_track_summary(run, i, &track); i++)
        is_read =
            log_text(text, wire_summary_track(rig, &track, i == 0, text, size));
    if (is_read)
        log_text(text, wire_summary_end(text, size));
    free(text);
}

status server_run(const struct settings *settings,
                  const struct server_options *o, struct err *err)
{
    struct server s = {.settings = settings, .options = o};
    uv_loop_init(&s.loop);
    status st = start_components(&s, err);
    bool is_ready = st == ST_OK && !s.is_stopping;
    if (is_ready) {
        tell_reach(&s);
        tell_capture(&s);
        st = write_ports(&s, err);
    }
    if (is_ready && st == ST_OK) {
        hub_host(s.hub, "start", "the daemon began to receive", 0);
        uv_run(&s.loop, UV_RUN_DEFAULT);
        hub_host(s.hub, "stop", "the daemon stops receiving", 0);
    }
    close_components(&s);
    return st;
}
