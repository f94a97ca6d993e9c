/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/tcp.h"

#include <stdlib.h>
#include <string.h>

#include "daemon/log.h"

enum {
    QUEUE_MAX = 8192,
    GATHER_MAX = 64,
    QUEUE_BYTES_MAX = 4 * 1024 * 1024,
    SEND_BUFFER_NEWEST = 32 * 1024,
    WRITE_DEADLINE_MS = 10000,
    HEARTBEAT_MS = 1000,
    TEXT_MAX = 1024
};

/* The newest estimate of a track that was not sent yet. */
struct newest {
    struct shared *bytes;
    int64_t sent_ms;
};

struct client {
    uv_tcp_t tcp;
    uv_write_t write;
    struct tcp *owner;
    struct client *next;
    struct request request;
    bool has_asked, is_writing, is_closing;
    int64_t since_ms, wrote_ms, said_ms;
    char line[REQUEST_SIZE];
    size_t line_len;
    struct shared *queue[QUEUE_MAX]; /* ring                               */
    int first, n;
    size_t queue_bytes;
    int n_in_flight;
    uint64_t skipped;      /* not told yet                                 */
    uint64_t skipped_all;
    struct newest *newest[2]; /* by stream and track number                */
    int n_newest;
};

struct tcp {
    uv_loop_t *loop;
    uv_tcp_t listener;
    struct tcp_host host;
    struct client *clients;
    int n_clients, max_clients;
    int64_t now_ms;
    struct log_site site;
};

/* --- leaving ------------------------------------------------------------------ */

static void on_client_closed(uv_handle_t *handle)
{
    struct client *c = handle->data;
    for (; c->n > 0; c->n--) {
        shared_drop(c->queue[c->first]);
        c->first = (c->first + 1) % QUEUE_MAX;
    }
    for (int s = 0; s < 2; s++) {
        for (int i = 0; i < c->n_newest; i++)
            shared_drop(c->newest[s][i].bytes);
        free(c->newest[s]);
    }
    free(c);
}

static void leave(struct client *c)
{
    struct tcp *t = c->owner;
    if (c->is_closing)
        return;
    c->is_closing = true;
    struct client **at = &t->clients;
    while (*at != c)
        at = &(*at)->next;
    *at = c->next;
    t->n_clients--;
    uv_close((uv_handle_t *)&c->tcp, on_client_closed);
    t->host.interest(t->host.ctx);
}

/* --- sending ------------------------------------------------------------------- */

static void flush(struct client *c);

static void on_written(uv_write_t *write, int result)
{
    struct client *c = write->data;
    c->is_writing = false;
    for (; c->n_in_flight > 0; c->n_in_flight--) {
        c->queue_bytes -= c->queue[c->first]->len;
        shared_drop(c->queue[c->first]);
        c->first = (c->first + 1) % QUEUE_MAX;
        c->n--;
    }
    if (result != 0)
        leave(c);
    else
        flush(c);
}

static void flush(struct client *c)
{
    uv_buf_t bufs[GATHER_MAX];
    int n = c->n < GATHER_MAX ? c->n : GATHER_MAX;
    if (c->is_writing || c->is_closing || n == 0)
        return;
    for (int i = 0; i < n; i++) {
        struct shared *s = c->queue[(c->first + i) % QUEUE_MAX];
        bufs[i] = uv_buf_init(s->bytes, (unsigned)s->len);
    }
    c->n_in_flight = n;
    c->is_writing = true;
    c->wrote_ms = c->owner->now_ms;
    c->write.data = c;
    if (uv_write(&c->write, (uv_stream_t *)&c->tcp, bufs, (unsigned)n,
                 on_written) != 0) {
        c->is_writing = false;
        c->n_in_flight = 0;
        leave(c);
    }
}

/* Queues a reference; false when the queue is full. */
static bool push(struct client *c, struct shared *s)
{
    if (c->n == QUEUE_MAX || c->queue_bytes + s->len > QUEUE_BYTES_MAX)
        return false;
    s->n_users++;
    c->queue[(c->first + c->n++) % QUEUE_MAX] = s;
    c->queue_bytes += s->len;
    c->said_ms = c->owner->now_ms;
    return true;
}

/* A message of this subscriber alone. */
static void push_own(struct client *c, const char *bytes, size_t len)
{
    struct shared *s = len > 0 ? shared_new(bytes, len) : NULL;
    if (s && push(c, s))
        flush(c);
    shared_drop(s);
}

static void tell_skipped(struct client *c, int64_t line_ns)
{
    char line[TEXT_MAX];
    if (c->skipped == 0 || c->n > QUEUE_MAX / 2 ||
        c->queue_bytes > QUEUE_BYTES_MAX / 2)
        return;
    size_t len = wire_encode_host(line_ns, "skipped",
                                  "messages left out here: this subscriber "
                                  "reads too slowly",
                                  c->skipped, c->request.form, line,
                                  sizeof line);
    c->skipped = 0;
    push_own(c, line, len);
}

/* --- newest of each track -------------------------------------------------------- */

static bool make_room(struct client *c, int number)
{
    int n = c->n_newest > 0 ? c->n_newest : 16;
    while (n <= number)
        n *= 2;
    if (n == c->n_newest)
        return true;
    for (int s = 0; s < 2; s++) {
        struct newest *more = realloc(c->newest[s],
                                      (size_t)n * sizeof *more);
        if (!more)
            return false;
        memset(more + c->n_newest, 0,
               (size_t)(n - c->n_newest) * sizeof *more);
        c->newest[s] = more;
    }
    c->n_newest = n;
    return true;
}

static void keep_newest(struct client *c, int stream, int number,
                        struct shared *s)
{
    if (number < 0 || !make_room(c, number)) {
        c->skipped++;
        return;
    }
    struct newest *slot = &c->newest[stream][number];
    shared_drop(slot->bytes);
    s->n_users++;
    slot->bytes = s;
}

/* Moves what is due into the queue while the socket has room. */
static void send_newest(struct client *c)
{
    int64_t every_ms =
        c->request.rate_hz > 0 ? (int64_t)(1000 / c->request.rate_hz) : 0;
    if (c->is_writing)
        return;
    for (int s = 0; s < 2; s++) {
        for (int i = 0; i < c->n_newest; i++) {
            struct newest *slot = &c->newest[s][i];
            if (!slot->bytes || c->owner->now_ms - slot->sent_ms < every_ms)
                continue;
            if (!push(c, slot->bytes))
                return;
            shared_drop(slot->bytes);
            slot->bytes = NULL;
            slot->sent_ms = c->owner->now_ms;
        }
    }
}

/* --- what it asked for ------------------------------------------------------------ */

static void describe(struct client *c)
{
    struct shared *s =
        c->owner->host.description(c->owner->host.ctx, c->request.form);
    if (s && push(c, s))
        flush(c);
    shared_drop(s);
}

static void begin(struct client *c, const struct request *r)
{
    int size = SEND_BUFFER_NEWEST;
    c->request = *r;
    c->has_asked = true;
    if (!r->wants_every)
        uv_send_buffer_size((uv_handle_t *)&c->tcp, &size);
    describe(c);
    c->owner->host.interest(c->owner->host.ctx);
}

static void refuse(struct client *c, const char *text)
{
    char line[TEXT_MAX];
    size_t len = wire_encode_host(0, "request", text, 0, WIRE_JSON, line,
                                  sizeof line);
    uv_buf_t buf = uv_buf_init(line, (unsigned)len);
    uv_try_write((uv_stream_t *)&c->tcp, &buf, 1);
    leave(c);
}

static void on_line(struct client *c, size_t len)
{
    struct request r;
    struct err err;
    if (c->has_asked) /* it changes its mind: a new description answers */
        log_often(&c->owner->site, "a subscriber asked again");
    if (request_parse(&r, c->line, len, &err) != ST_OK)
        refuse(c, err.text);
    else
        begin(c, &r);
}

static void on_alloc(uv_handle_t *handle, size_t size, uv_buf_t *buf)
{
    struct client *c = handle->data;
    (void)size;
    *buf = uv_buf_init(c->line + c->line_len,
                       (unsigned)(REQUEST_SIZE - c->line_len));
}

static void on_read(uv_stream_t *stream, ssize_t n, const uv_buf_t *buf)
{
    struct client *c = stream->data;
    (void)buf;
    if (n == UV_EOF && c->has_asked) {
        uv_read_stop(stream); /* it only listens from now on */
        return;
    }
    if (n < 0) {
        if (n == UV_ENOBUFS)
            refuse(c, "request: longer than 4096 bytes");
        else if (n == UV_EOF)
            uv_read_stop(stream);
        else
            leave(c);
        return;
    }
    c->line_len += (size_t)n;
    char *end = memchr(c->line, '\n', c->line_len);
    if (!end)
        return;
    size_t used = (size_t)(end - c->line) + 1;
    on_line(c, used - 1);
    if (c->is_closing)
        return;
    memmove(c->line, end + 1, c->line_len - used);
    c->line_len -= used;
}

static void on_connection(uv_stream_t *listener, int result)
{
    struct tcp *t = listener->data;
    struct client *c = result == 0 ? calloc(1, sizeof *c) : NULL;
    if (!c) {
        log_often(&t->site, "a subscriber could not be taken: %s",
                  result == 0 ? "out of memory" : uv_strerror(result));
        return;
    }
    uv_tcp_init(t->loop, &c->tcp);
    c->tcp.data = c;
    c->owner = t;
    c->request = request_default();
    c->next = t->clients;
    t->clients = c;
    t->n_clients++;
    c->since_ms = c->said_ms = t->now_ms;
    if (uv_accept(listener, (uv_stream_t *)&c->tcp) != 0) {
        leave(c);
        return;
    }
    if (t->n_clients > t->max_clients) {
        refuse(c, "too many subscribers: see limits.subscribers");
        return;
    }
    uv_tcp_nodelay(&c->tcp, 1);
    uv_read_start((uv_stream_t *)&c->tcp, on_alloc, on_read);
    t->host.interest(t->host.ctx);
}

/* --- for the hub -------------------------------------------------------------------- */

status tcp_start(struct tcp **out, uv_loop_t *loop, struct endpoint *at,
                 int max_subscribers, struct tcp_host host, struct err *err)
{
    struct tcp *t = calloc(1, sizeof *t);
    *out = NULL;
    if (!t)
        return err_set(err, ST_NOMEM, "out of memory");
    int fd = endpoint_bind(at, SOCK_STREAM, err);
    if (fd < 0) {
        free(t);
        return ST_IO;
    }
    t->loop = loop;
    t->host = host;
    t->max_clients = max_subscribers;
    uv_tcp_init(loop, &t->listener);
    t->listener.data = t;
    int rc = uv_tcp_open(&t->listener, fd);
    if (rc == 0)
        rc = uv_listen((uv_stream_t *)&t->listener, 128, on_connection);
    if (rc != 0)
        return err_set(err, ST_IO, "serve.tcp: cannot listen: %s",
                       uv_strerror(rc));
    *out = t;
    return ST_OK;
}

static bool wants(const struct client *c, int stream, const char *track)
{
    if (!c->has_asked)
        return false;
    if (stream >= 0 && !c->request.wants[stream])
        return false;
    return track[0] == 0 || request_wants_track(&c->request, track);
}

bool tcp_wants(const struct tcp *t, enum wire_form form, int stream,
               const char *track)
{
    for (const struct client *c = t->clients; c; c = c->next)
        if (c->request.form == form && wants(c, stream, track))
            return true;
    return false;
}

unsigned tcp_interest(const struct tcp *t)
{
    unsigned bits = 0;
    for (const struct client *c = t->clients; c; c = c->next)
        for (int s = 0; s < 2; s++)
            bits |= !c->has_asked || c->request.wants[s] ? 1u << s : 0;
    return bits;
}

int tcp_n_subscribers(const struct tcp *t)
{
    return t->n_clients;
}

void tcp_offer(struct tcp *t, const struct tcp_offer *offer, int64_t now_ms)
{
    t->now_ms = now_ms;
    for (struct client *c = t->clients, *next; c; c = next) {
        struct shared *s = offer->bytes[c->request.form];
        next = c->next;
        if (!s || !wants(c, offer->stream, offer->track))
            continue;
        if (offer->stream >= 0 && !c->request.wants_every)
            keep_newest(c, offer->stream, offer->number, s);
        else if (c->skipped > 0 || !push(c, s))
            c->skipped++;
    }
}

void tcp_skipped(struct tcp *t, uint64_t n)
{
    for (struct client *c = t->clients; c; c = c->next)
        c->skipped += n;
}

static void tick(struct client *c, int64_t line_ns)
{
    struct tcp *t = c->owner;
    char line[TEXT_MAX];
    if (!c->has_asked && t->now_ms - c->since_ms >= REQUEST_WAIT_MS) {
        struct request r = request_default();
        begin(c, &r);
    }
    if (c->is_writing && t->now_ms - c->wrote_ms > WRITE_DEADLINE_MS) {
        log_often(&t->site, "a subscriber took nothing for 10 s: closed");
        leave(c);
        return;
    }
    if (!c->has_asked)
        return;
    if (!c->request.wants_every)
        send_newest(c);
    tell_skipped(c, line_ns);
    if (t->now_ms - c->said_ms >= HEARTBEAT_MS) {
        size_t len = wire_encode_heartbeat(line_ns, c->skipped_all,
                                           c->request.form, line, sizeof line);
        push_own(c, line, len);
    }
    flush(c);
}

void tcp_tick(struct tcp *t, int64_t now_ms, int64_t line_ns)
{
    t->now_ms = now_ms;
    for (struct client *c = t->clients, *next; c; c = next) {
        next = c->next;
        tick(c, line_ns);
    }
}

bool tcp_is_drained(const struct tcp *t)
{
    for (const struct client *c = t->clients; c; c = c->next)
        if (c->n > 0 && c->has_asked)
            return false;
    return true;
}

void tcp_bye(struct tcp *t, const char *reason)
{
    char line[TEXT_MAX];
    for (struct client *c = t->clients, *next; c; c = next) {
        next = c->next;
        if (!c->request.wants_every)
            send_newest(c);
        size_t len = wire_encode_bye(reason, c->request.form, line,
                                     sizeof line);
        push_own(c, line, len);
    }
}

static void on_listener_closed(uv_handle_t *handle)
{
    free(handle->data);
}

void tcp_close(struct tcp *t)
{
    while (t->clients)
        leave(t->clients);
    uv_close((uv_handle_t *)&t->listener, on_listener_closed);
}
