/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/tcp.h"

#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>

#include "daemon/line.h"
#include "daemon/log.h"

enum {
    SEND_BUFFER_NEWEST = 32 * 1024,
    WRITE_DEADLINE_MS = 10000,
    HEARTBEAT_MS = 1000,
    LINGER_MS = 500, /* for who was refused to read why                */
    TEXT_MAX = 1024
};

struct tcp {
    uv_loop_t *loop;
    uv_tcp_t listener;
    struct tcp_host host;
    struct subscriber_ways ways;
    struct subscriber *subscribers;
    int n, max;
    struct log_site site;
};

static int64_t real_ns(void)
{
    return line_read().real_ns;
}

static void enter(struct subscriber *s, enum subscriber_stage stage)
{
    s->stage = stage;
    s->since_ms = s->ways->now_ms;
}

static void tell_interest(struct tcp *t)
{
    t->host.interest(t->host.ctx);
}

/* --- leaving
 * ------------------------------------------------------------------ */

static void on_closed(uv_handle_t *handle)
{
    struct subscriber *s = handle->data;
    subscriber_fini(s);
    free(s);
}

static void leave(struct subscriber *s)
{
    struct tcp *t = s->owner;
    if (s->stage == SUBSCRIBER_CLOSING)
        return;
    enter(s, SUBSCRIBER_CLOSING);
    struct subscriber **at = &t->subscribers;
    while (*at != s)
        at = &(*at)->next;
    *at = s->next;
    t->n--;
    uv_close((uv_handle_t *)&s->tcp, on_closed);
    tell_interest(t);
}

/* One line that says why, then the end.  What it still sends is read and
 * thrown away: a close over unread bytes would take the line back. */
static void refuse(struct subscriber *s, const char *text)
{
    char line[TEXT_MAX];
    uv_os_fd_t fd;
    size_t len = wire_encode_host(real_ns(), "request", text, 0, WIRE_JSON,
                                  line, sizeof line);
    s->request.form = WIRE_JSON;
    subscriber_push_own(s, line, len);
    if (s->stage == SUBSCRIBER_CLOSING)
        return;
    enter(s, SUBSCRIBER_REFUSED);
    s->line_len = 0;
    if (!s->is_writing && uv_fileno((uv_handle_t *)&s->tcp, &fd) == 0)
        shutdown(fd, SHUT_WR);
    tell_interest((struct tcp *)s->owner);
}

/* --- what it asks for
 * ------------------------------------------------------------ */

static void begin(struct subscriber *s, const struct request *r)
{
    struct tcp *t = s->owner;
    int size = SEND_BUFFER_NEWEST;
    s->request = *r;
    enter(s, SUBSCRIBER_LISTENING);
    if (!r->wants_every)
        uv_send_buffer_size((uv_handle_t *)&s->tcp, &size);
    tell_interest(t);
    struct shared *d = t->host.description(t->host.ctx, r->form);
    if (d)
        subscriber_offer(s, d);
    shared_drop(d);
    subscriber_flush(s);
}

static void on_line(struct subscriber *s, const char *line, size_t len)
{
    struct request r;
    struct err err;
    if (len > 0 && line[len - 1] == '\r')
        len--;
    if (request_parse(&r, line, len, &err) != ST_OK)
        refuse(s, err.text);
    else
        begin(s, &r);
}

/* A new request in place of the old one is answered like the first. */
static void take_lines(struct subscriber *s)
{
    char *end;
    while (s->stage <= SUBSCRIBER_LISTENING &&
           (end = memchr(s->line, '\n', s->line_len)) != NULL) {
        size_t used = (size_t)(end - s->line) + 1;
        on_line(s, s->line, used - 1);
        if (s->stage > SUBSCRIBER_LISTENING)
            return;
        memmove(s->line, end + 1, s->line_len - used);
        s->line_len -= used;
    }
}

static void on_alloc(uv_handle_t *handle, size_t size, uv_buf_t *buf)
{
    struct subscriber *s = handle->data;
    (void)size;
    *buf = uv_buf_init(s->line + s->line_len,
                       (unsigned)(REQUEST_SIZE - s->line_len));
}

/* It sends no more; it may well go on listening. */
static void on_end_of_input(struct subscriber *s)
{
    if (s->stage == SUBSCRIBER_REFUSED) {
        leave(s);
        return;
    }
    uv_read_stop((uv_stream_t *)&s->tcp);
    if (s->line_len > 0)
        on_line(s, s->line, s->line_len);
}

static void on_read(uv_stream_t *stream, ssize_t n, const uv_buf_t *buf)
{
    struct subscriber *s = stream->data;
    (void)buf;
    if (n == UV_EOF) {
        on_end_of_input(s);
    } else if (n == UV_ENOBUFS) {
        refuse(s, "request: longer than 4096 bytes");
    } else if (n < 0) {
        leave(s);
    } else if (s->stage <= SUBSCRIBER_LISTENING) {
        s->line_len += (size_t)n;
        take_lines(s);
    }
}

static void on_connection(uv_stream_t *listener, int result)
{
    struct tcp *t = listener->data;
    struct subscriber *s = result == 0 ? calloc(1, sizeof *s) : NULL;
    if (!s) {
        log_often(&t->site, "a subscriber could not be taken: %s",
                  result == 0 ? "out of memory" : uv_strerror(result));
        return;
    }
    uv_tcp_init(t->loop, &s->tcp);
    s->tcp.data = s;
    s->owner = t;
    s->ways = &t->ways;
    s->request = request_default();
    s->next = t->subscribers;
    t->subscribers = s;
    t->n++;
    t->ways.now_ms = line_read().mono_ns / 1000000;
    s->said_ms = t->ways.now_ms;
    enter(s, SUBSCRIBER_NEW);
    if (uv_accept(listener, (uv_stream_t *)&s->tcp) != 0 || t->n > 2 * t->max) {
        leave(s);
        return;
    }
    uv_tcp_nodelay(&s->tcp, 1);
    uv_read_start((uv_stream_t *)&s->tcp, on_alloc, on_read);
    if (t->n > t->max) {
        log_often(&t->site,
                  "a subscriber was refused: limits.subscribers is "
                  "%d",
                  t->max);
        refuse(s, "too many subscribers: raise limits.subscribers");
        return;
    }
    tell_interest(t);
}

/* --- for the hub
 * -------------------------------------------------------------------- */

static void on_listener_closed(uv_handle_t *handle)
{
    free(handle->data);
}

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
    t->ways = (struct subscriber_ways){0, host.pool, leave};
    t->max = max_subscribers;
    uv_tcp_init(loop, &t->listener);
    t->listener.data = t;
    int rc = uv_tcp_open(&t->listener, fd);
    if (rc == 0)
        rc = uv_listen((uv_stream_t *)&t->listener, 128, on_connection);
    if (rc != 0) {
        uv_close((uv_handle_t *)&t->listener, on_listener_closed);
        return err_set(err, ST_IO, "serve.tcp: cannot listen: %s",
                       uv_strerror(rc));
    }
    *out = t;
    return ST_OK;
}

static bool wants(const struct subscriber *s, int stream, const char *track)
{
    if (s->stage != SUBSCRIBER_LISTENING)
        return false;
    if (stream >= 0 && !s->request.wants[stream])
        return false;
    return track[0] == 0 || request_wants_track(&s->request, track);
}

bool tcp_wants(const struct tcp *t, enum wire_form form, int stream,
               const char *track)
{
    for (const struct subscriber *s = t->subscribers; s; s = s->next)
        if (s->request.form == form && wants(s, stream, track))
            return true;
    return false;
}

unsigned tcp_interest(const struct tcp *t)
{
    unsigned bits = 0;
    for (const struct subscriber *s = t->subscribers; s; s = s->next)
        if (s->stage == SUBSCRIBER_NEW)
            bits |= TCP_ANYTHING | 3u;
        else if (s->stage == SUBSCRIBER_LISTENING)
            bits |= TCP_ANYTHING | (s->request.wants[0] ? 1u : 0u) |
                    (s->request.wants[1] ? 2u : 0u);
    return bits;
}

void tcp_offer(struct tcp *t, const struct tcp_offer *offer)
{
    for (struct subscriber *s = t->subscribers; s; s = s->next) {
        struct shared *bytes = offer->bytes[s->request.form];
        if (!bytes || !wants(s, offer->stream, offer->track))
            continue;
        if (offer->stream >= 0 && !s->request.wants_every)
            subscriber_keep_newest(s, offer->stream, offer->number, bytes);
        else
            subscriber_offer(s, bytes);
    }
}

void tcp_skipped(struct tcp *t, uint64_t n)
{
    for (struct subscriber *s = t->subscribers; s; s = s->next)
        if (s->stage == SUBSCRIBER_LISTENING)
            s->skipped += n;
}

void tcp_flush(struct tcp *t)
{
    for (struct subscriber *s = t->subscribers, *next; s; s = next) {
        next = s->next;
        subscriber_flush(s);
    }
}

static void listening_tick(struct subscriber *s)
{
    char line[TEXT_MAX];
    if (!s->request.wants_every)
        subscriber_send_newest(s, false);
    subscriber_tell_skipped(s, real_ns());
    if (s->ways->now_ms - s->said_ms >= HEARTBEAT_MS) {
        size_t len = wire_encode_heartbeat(real_ns(), s->skipped_all,
                                           s->request.form, line, sizeof line);
        subscriber_push_own(s, line, len);
    }
    subscriber_flush(s);
}

static void tick(struct subscriber *s)
{
    struct tcp *t = s->owner;
    int64_t waited_ms = s->ways->now_ms - s->since_ms;
    if (s->is_writing && s->ways->now_ms - s->wrote_ms > WRITE_DEADLINE_MS) {
        log_often(&t->site, "a subscriber took nothing for 10 s: closed");
        leave(s);
        return;
    }
    switch (s->stage) {
    case SUBSCRIBER_NEW:
        if (waited_ms >= REQUEST_WAIT_MS) {
            struct request r = request_default();
            begin(s, &r);
        }
        break;
    case SUBSCRIBER_LISTENING:
        listening_tick(s);
        break;
    case SUBSCRIBER_REFUSED:
        if (waited_ms >= LINGER_MS)
            leave(s);
        break;
    case SUBSCRIBER_CLOSING:
        break;
    }
}

void tcp_tick(struct tcp *t, int64_t now_ms)
{
    t->ways.now_ms = now_ms;
    for (struct subscriber *s = t->subscribers, *next; s; s = next) {
        next = s->next;
        tick(s);
    }
}

bool tcp_is_drained(const struct tcp *t)
{
    for (const struct subscriber *s = t->subscribers; s; s = s->next)
        if (s->n > 0)
            return false;
    return true;
}

void tcp_bye(struct tcp *t, const char *reason)
{
    char line[TEXT_MAX];
    for (struct subscriber *s = t->subscribers, *next; s; s = next) {
        next = s->next;
        if (s->stage == SUBSCRIBER_REFUSED)
            continue;
        subscriber_send_newest(s, true);
        subscriber_tell_skipped(s, real_ns());
        size_t len =
            wire_encode_bye(reason, s->request.form, line, sizeof line);
        subscriber_push_own(s, line, len);
    }
}

void tcp_close(struct tcp *t)
{
    while (t->subscribers)
        leave(t->subscribers);
    uv_close((uv_handle_t *)&t->listener, on_listener_closed);
}
