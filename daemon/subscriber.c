/* The queue of one subscriber. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/subscriber.h"

#include <stdlib.h>
#include <string.h>

enum { GATHER_MAX = 256, TEXT_MAX = 1024 };

/* --- queue
 * -------------------------------------------------------------------- */

static void pop(struct subscriber *s)
{
    struct shared *first = s->queue[s->first];
    s->queue_bytes -= first->len;
    s->first = (s->first + 1) % SUBSCRIBER_QUEUE_MAX;
    s->n--;
    shared_drop(first);
}

void subscriber_fini(struct subscriber *s)
{
    while (s->n > 0)
        pop(s);
    for (int i = 0; i < 2; i++) {
        for (int k = 0; k < s->n_newest; k++)
            shared_drop(s->newest[i][k].bytes);
        free(s->newest[i]);
    }
}

bool subscriber_push(struct subscriber *s, struct shared *bytes)
{
    if (s->n == SUBSCRIBER_QUEUE_MAX ||
        s->queue_bytes + bytes->len > SUBSCRIBER_QUEUE_BYTES_MAX)
        return false;
    bytes->n_users++;
    s->queue[(s->first + s->n++) % SUBSCRIBER_QUEUE_MAX] = bytes;
    s->queue_bytes += bytes->len;
    s->said_ms = s->ways->now_ms;
    return true;
}

void subscriber_offer(struct subscriber *s, struct shared *bytes)
{
    if (s->skipped > 0 || !subscriber_push(s, bytes))
        s->skipped++;
}

void subscriber_push_own(struct subscriber *s, const char *bytes, size_t len)
{
    struct shared *own = len > 0 ? shared_new(s->ways->pool, bytes, len) : NULL;
    if (own && subscriber_push(s, own))
        subscriber_flush(s);
    shared_drop(own);
}

/* --- sending
 * ------------------------------------------------------------------- */

static int gather(struct subscriber *s, uv_buf_t bufs[GATHER_MAX])
{
    int n = s->n < GATHER_MAX ? s->n : GATHER_MAX;
    for (int i = 0; i < n; i++) {
        struct shared *b = s->queue[(s->first + i) % SUBSCRIBER_QUEUE_MAX];
        size_t skip = i == 0 ? s->sent : 0;
        bufs[i] = uv_buf_init(b->bytes + skip, (unsigned)(b->len - skip));
    }
    return n;
}

static void take_sent(struct subscriber *s, size_t bytes)
{
    s->sent += bytes;
    while (s->n > 0 && s->sent >= s->queue[s->first]->len) {
        s->sent -= s->queue[s->first]->len;
        pop(s);
    }
}

static void on_written(uv_write_t *write, int result)
{
    struct subscriber *s = write->data;
    s->is_writing = false;
    for (; s->n_in_flight > 0; s->n_in_flight--)
        pop(s);
    s->sent = 0;
    if (result != 0)
        s->ways->leave(s);
    else
        subscriber_flush(s);
}

/* The socket is full: the loop says when these have gone. */
static void write_later(struct subscriber *s)
{
    uv_buf_t bufs[GATHER_MAX];
    int n = gather(s, bufs);
    s->n_in_flight = n;
    s->is_writing = true;
    s->wrote_ms = s->ways->now_ms;
    s->write.data = s;
    if (uv_write(&s->write, (uv_stream_t *)&s->tcp, bufs, (unsigned)n,
                 on_written) != 0) {
        s->is_writing = false;
        s->n_in_flight = 0;
        s->ways->leave(s);
    }
}

void subscriber_flush(struct subscriber *s)
{
    uv_buf_t bufs[GATHER_MAX];
    while (s->n > 0 && !s->is_writing && s->stage != SUBSCRIBER_CLOSING) {
        int n = gather(s, bufs);
        int rc = uv_try_write((uv_stream_t *)&s->tcp, bufs, (unsigned)n);
        if (rc >= 0)
            take_sent(s, (size_t)rc);
        else if (rc == UV_EAGAIN)
            write_later(s);
        else
            s->ways->leave(s);
    }
}

void subscriber_tell_skipped(struct subscriber *s, int64_t real_ns)
{
    char line[TEXT_MAX];
    if (s->skipped == 0 || s->n > SUBSCRIBER_QUEUE_MAX / 2 ||
        s->queue_bytes > SUBSCRIBER_QUEUE_BYTES_MAX / 2)
        return;
    size_t len =
        wire_encode_host(real_ns, "skipped",
                         "messages left out here: this subscriber "
                         "reads too slowly",
                         s->skipped, s->request.form, line, sizeof line);
    s->skipped_all += s->skipped;
    s->skipped = 0;
    subscriber_push_own(s, line, len);
}

/* --- newest of each track
 * --------------------------------------------------------- */

static bool make_room(struct subscriber *s, int number)
{
    int n = s->n_newest > 0 ? s->n_newest : 16;
    while (n <= number)
        n *= 2;
    if (n == s->n_newest)
        return true;
    for (int i = 0; i < 2; i++) {
        struct newest *more = realloc(s->newest[i], (size_t)n * sizeof *more);
        if (!more)
            return false;
        memset(more + s->n_newest, 0, (size_t)(n - s->n_newest) * sizeof *more);
        s->newest[i] = more;
    }
    s->n_newest = n;
    return true;
}

void subscriber_keep_newest(struct subscriber *s, int stream, int number,
                            struct shared *bytes)
{
    if (number < 0 || !make_room(s, number)) {
        subscriber_offer(s, bytes); /* more tracks than places: as they come */
        return;
    }
    struct newest *slot = &s->newest[stream][number];
    shared_drop(slot->bytes);
    bytes->n_users++;
    slot->bytes = bytes;
}

/* Keeps to the beat of the rate, so that the loop's coarse ticks do not make
 * it slower; after a pause the beat begins anew. */
static int64_t next_turn(int64_t sent_ms, int64_t now_ms, int64_t every_ms)
{
    return now_ms - sent_ms < 2 * every_ms ? sent_ms + every_ms : now_ms;
}

void subscriber_send_newest(struct subscriber *s, bool is_last)
{
    int64_t every_ms =
        s->request.rate_hz > 0 ? (int64_t)(1000 / s->request.rate_hz) : 0;
    if (s->is_writing && !is_last)
        return;
    for (int i = 0; i < 2; i++) {
        for (int k = 0; k < s->n_newest; k++) {
            struct newest *slot = &s->newest[i][k];
            bool is_due =
                is_last || s->ways->now_ms - slot->sent_ms >= every_ms;
            if (!slot->bytes || !is_due)
                continue;
            if (!subscriber_push(s, slot->bytes))
                return;
            shared_drop(slot->bytes);
            slot->bytes = NULL;
            slot->sent_ms = next_turn(slot->sent_ms, s->ways->now_ms, every_ms);
        }
    }
}
