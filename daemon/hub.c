/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/hub.h"

#include <pthread.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <string.h>

#include "daemon/host.h"
#include "daemon/line.h"
#include "daemon/ring.h"
#include "daemon/tcp.h"

enum {
    RING_BYTES = 32 * 1024 * 1024,
    BURST = 1024, /* messages before the loop looks at sockets      */
    TICK_MS = 10,
    STOP_MS = 700 /* for the last deliveries                        */
};

struct hub {
    const struct settings *settings;
    struct ring ring;
    _Atomic unsigned interest; /* bits of tcp_interest                   */
    _Atomic bool is_asleep;    /* the hub has to be woken                */
    _Atomic bool is_stopping;
    _Atomic uint64_t n_refused; /* messages that found the ring full      */

    struct host host;

    pthread_t thread;
    uv_loop_t loop;
    uv_async_t wake;
    uv_timer_t timer;
    uv_prepare_t prepare;
    struct tcp *tcp;
    struct pool pool;
    char *buffer;
    size_t buffer_size;
    int64_t stop_ms; /* when to stop at the latest             */
    bool has_said_bye;
    char (*track)[RIG_ID_SIZE]; /* ids seen, in order; number = place in
                                   `number`                               */
    int *number;
    int n_tracks;
};

/* --- ingest's side
 * ------------------------------------------------------------- */

static void wake(struct hub *h)
{
    if (atomic_exchange(&h->is_asleep, false))
        uv_async_send(&h->wake);
}

bool hub_wants(struct hub *h, enum stream stream)
{
    return atomic_load_explicit(&h->interest, memory_order_acquire) >> stream &
           1;
}

void hub_say(struct hub *h, const struct message *m)
{
    unsigned interest =
        atomic_load_explicit(&h->interest, memory_order_acquire);
    if (interest == 0)
        return;
    if (m->type == MESSAGE_ESTIMATE) {
        int stream = ((const struct estimate *)(const void *)m)->stream;
        if (!(interest >> stream & 1))
            return;
    }
    void *at = ring_reserve(&h->ring, m->bytes);
    if (!at) {
        atomic_fetch_add(&h->n_refused, 1);
        return;
    }
    memcpy(at, m, m->bytes);
    ring_commit(&h->ring, m->bytes);
    /* Store, then load: without the fence the hub could fall asleep between
     * the two and lie there until its next tick. */
    atomic_thread_fence(memory_order_seq_cst);
    if (atomic_load_explicit(&h->is_asleep, memory_order_relaxed))
        wake(h);
}

void hub_host(struct hub *h, const char *what, const char *text, uint64_t n)
{
    host_say(&h->host, what, text, n);
    uv_async_send(&h->wake);
}

/* --- the hub's own side
 * ---------------------------------------------------------- */

static int64_t now_ms(void)
{
    return line_read().mono_ns / 1000000;
}

/* A small number for each id, -1 when there are too many. */
static int number_of(struct hub *h, const char *id)
{
    int low = 0, high = h->n_tracks;
    while (low < high) {
        int middle = (low + high) / 2;
        int order = strcmp(id, h->track[middle]);
        if (order == 0)
            return h->number[middle];
        if (order < 0)
            high = middle;
        else
            low = middle + 1;
    }
    if (h->n_tracks == TCP_TRACKS_MAX)
        return -1;
    size_t n = (size_t)(h->n_tracks - low);
    memmove(h->track + low + 1, h->track + low, n * sizeof *h->track);
    memmove(h->number + low + 1, h->number + low, n * sizeof *h->number);
    memcpy(h->track[low], id, RIG_ID_SIZE);
    h->number[low] = h->n_tracks;
    return h->n_tracks++;
}

static void offer(struct hub *h, struct tcp_offer *o)
{
    if (o->bytes[WIRE_JSON] || o->bytes[WIRE_MSGPACK])
        tcp_offer(h->tcp, o);
    shared_drop(o->bytes[WIRE_JSON]);
    shared_drop(o->bytes[WIRE_MSGPACK]);
}

static void publish(struct hub *h, const struct message *m)
{
    struct tcp_offer o = {.track = m->track, .number = -1, .stream = -1};
    if (m->type == MESSAGE_ESTIMATE) {
        const struct estimate *e = (const void *)m;
        o.stream = e->stream;
        o.number = number_of(h, m->track);
    }
    for (int form = 0; form < 2; form++) {
        if (!tcp_wants(h->tcp, (enum wire_form)form, o.stream, m->track))
            continue;
        size_t len = wire_encode(&h->settings->rig, m, (enum wire_form)form,
                                 h->buffer, h->buffer_size);
        if (len > 0)
            o.bytes[form] = shared_new(&h->pool, h->buffer, len);
    }
    offer(h, &o);
}

static void publish_host(struct hub *h)
{
    struct host_message list[HOST_MAX + 1];
    int n = host_take(&h->host, list);
    for (int i = 0; i < n && h->tcp; i++) {
        struct tcp_offer o = {.track = "", .number = -1, .stream = -1};
        for (int form = 0; form < 2; form++) {
            if (!tcp_wants(h->tcp, (enum wire_form)form, -1, ""))
                continue;
            size_t len = wire_encode_host(
                list[i].t_ns, list[i].what, list[i].text, list[i].n,
                (enum wire_form)form, h->buffer, h->buffer_size);
            if (len > 0)
                o.bytes[form] = shared_new(&h->pool, h->buffer, len);
        }
        offer(h, &o);
    }
}

/* Takes a burst from the ring; true when more is waiting. */
static bool drain(struct hub *h)
{
    size_t len;
    const void *m = NULL;
    for (int i = 0; i < BURST; i++) {
        m = ring_front(&h->ring, &len);
        if (!m)
            break;
        if (h->tcp)
            publish(h, m);
        ring_pop(&h->ring);
    }
    uint64_t n = atomic_exchange(&h->n_refused, 0);
    if (n > 0 && h->tcp)
        tcp_skipped(h->tcp, n);
    /* A backlog goes out burst by burst, or it would not fit the queues. */
    if (m && h->tcp)
        tcp_flush(h->tcp);
    return m != NULL;
}

static void on_wake(uv_async_t *async)
{
    struct hub *h = async->data;
    publish_host(h);
    drain(h);
    if (h->tcp)
        tcp_tick(h->tcp, now_ms());
}

/* Before the loop sleeps: leave the flag up, then look once more, so that a
 * message said in between is not left lying. */
static void on_prepare(uv_prepare_t *prepare)
{
    struct hub *h = prepare->data;
    size_t len;
    if (drain(h)) {
        uv_async_send(&h->wake);
        return;
    }
    atomic_store(&h->is_asleep, true);
    if (ring_front(&h->ring, &len))
        wake(h);
}

static void close_all(struct hub *h)
{
    uv_close((uv_handle_t *)&h->wake, NULL);
    uv_close((uv_handle_t *)&h->timer, NULL);
    uv_close((uv_handle_t *)&h->prepare, NULL);
    if (h->tcp)
        tcp_close(h->tcp);
    h->tcp = NULL;
}

static void on_timer(uv_timer_t *timer)
{
    struct hub *h = timer->data;
    size_t len;
    publish_host(h);
    drain(h);
    if (h->tcp)
        tcp_tick(h->tcp, now_ms());
    if (!atomic_load(&h->is_stopping))
        return;
    if (h->stop_ms == 0)
        h->stop_ms = now_ms() + STOP_MS;
    bool is_late = now_ms() >= h->stop_ms;
    if (ring_front(&h->ring, &len) && !is_late)
        return;
    if (h->tcp && !h->has_said_bye) {
        tcp_bye(h->tcp, "the daemon stops");
        h->has_said_bye = true;
    }
    if (!h->tcp || tcp_is_drained(h->tcp) || is_late)
        close_all(h);
}

static void *run_loop(void *arg)
{
    struct hub *h = arg;
    uv_run(&h->loop, UV_RUN_DEFAULT);
    return NULL;
}

/* --- for its connections
 * ----------------------------------------------------------- */

static struct shared *description(void *ctx, enum wire_form form)
{
    struct hub *h = ctx;
    size_t len = wire_encode_description(&h->settings->rig, ROPEWALK_BUILD,
                                         form, h->buffer, h->buffer_size);
    return len > 0 ? shared_new(&h->pool, h->buffer, len) : NULL;
}

static void interest(void *ctx)
{
    struct hub *h = ctx;
    if (!h->tcp)
        return;
    atomic_store_explicit(&h->interest, tcp_interest(h->tcp),
                          memory_order_release);
}

/* --- life
 * ----------------------------------------------------------------------------
 */

static status set_up(struct hub *h, struct endpoint *at, struct err *err)
{
    struct tcp_host host = {description, interest, &h->pool, h};
    const struct settings *s = h->settings;
    h->buffer_size = wire_message_bound(&s->rig);
    h->buffer = malloc(h->buffer_size);
    h->track = malloc(TCP_TRACKS_MAX * sizeof *h->track);
    h->number = malloc(TCP_TRACKS_MAX * sizeof *h->number);
    if (!h->buffer || !h->track || !h->number ||
        ring_init(&h->ring, RING_BYTES) != ST_OK)
        return err_set(err, ST_NOMEM, "no memory for publishing");
    if (s->tcp[0]) {
        status st = endpoint_parse(at, s->tcp, err);
        if (st == ST_OK)
            st =
                tcp_start(&h->tcp, &h->loop, at, s->max_subscribers, host, err);
        if (st != ST_OK)
            return st;
    }
    if (pthread_create(&h->thread, NULL, run_loop, h) != 0)
        return err_set(err, ST_IO, "no thread for publishing");
    return ST_OK;
}

static void fini(struct hub *h)
{
    uv_run(&h->loop, UV_RUN_DEFAULT); /* what is closing closes */
    uv_loop_close(&h->loop);
    host_fini(&h->host);
    ring_fini(&h->ring);
    pool_fini(&h->pool);
    free(h->buffer);
    free(h->track);
    free(h->number);
    free(h);
}

status hub_start(struct hub **out, const struct settings *s,
                 struct endpoint *at, struct err *err)
{
    struct hub *h = calloc(1, sizeof *h);
    *out = NULL;
    if (!h)
        return err_set(err, ST_NOMEM, "out of memory");
    h->settings = s;
    host_init(&h->host);
    uv_loop_init(&h->loop);
    uv_async_init(&h->loop, &h->wake, on_wake);
    uv_timer_init(&h->loop, &h->timer);
    uv_prepare_init(&h->loop, &h->prepare);
    h->wake.data = h->timer.data = h->prepare.data = h;
    uv_timer_start(&h->timer, on_timer, TICK_MS, TICK_MS);
    uv_prepare_start(&h->prepare, on_prepare);
    status st = set_up(h, at, err);
    if (st != ST_OK) {
        close_all(h);
        fini(h);
        return st;
    }
    *out = h;
    return ST_OK;
}

void hub_stop(struct hub *h)
{
    if (!h)
        return;
    atomic_store(&h->is_stopping, true);
    pthread_join(h->thread, NULL);
    fini(h);
}
