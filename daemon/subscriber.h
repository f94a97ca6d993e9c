/* subscriber.h - one TCP subscriber: what it asked for and its queue.
 *
 * The queue is bounded.  With mode `every` a message that finds it full is
 * skipped, and so is everything after it until the subscriber was told in its
 * stream how many: what it has is whole up to that line.  With mode `newest`
 * the newest estimate of each track waits beside the queue.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_SUBSCRIBER_H
#define DAEMON_SUBSCRIBER_H

#include <uv.h>

#include "config/load.h"
#include "core/wire/encode.h"
#include "daemon/shared.h"

enum {
    REQUEST_SIZE = 4096,
    REQUEST_TRACKS_MAX = 32,
    REQUEST_WAIT_MS = 200,
    SUBSCRIBER_QUEUE_MAX = 8192,
    SUBSCRIBER_QUEUE_BYTES_MAX = 4 * 1024 * 1024
};

/* What a request line asked for. */
struct request {
    int n_tracks; /* 0: all                                        */
    char track[REQUEST_TRACKS_MAX][RIG_ID_SIZE];
    bool wants[2];    /* by stream                                     */
    bool wants_every; /* every message, not the newest per track       */
    double rate_hz;   /* newest: at most so often per track, 0 = any   */
    enum wire_form form;
};

/* Every live estimate as JSON lines: for whoever asks for nothing. */
struct request request_default(void);

/* One line of JSON; on ST_SCHEMA or ST_PARSE *err says what is wrong. */
status request_parse(struct request *r, const char *line, size_t len,
                     struct err *err) MUST_USE;

bool request_wants_track(const struct request *r, const char *track);

/* The newest estimate of a track that was not sent yet. */
struct newest {
    struct shared *bytes;
    int64_t sent_ms;
};

struct subscriber;

/* What all subscribers share. */
struct subscriber_ways {
    int64_t now_ms; /* monotonic                                    */
    struct pool *pool;
    void (*leave)(struct subscriber *s); /* its connection is broken       */
};

enum subscriber_stage {
    SUBSCRIBER_NEW, /* may still ask                                */
    SUBSCRIBER_LISTENING,
    SUBSCRIBER_REFUSED, /* was told why; its end is awaited             */
    SUBSCRIBER_CLOSING
};

struct subscriber {
    uv_tcp_t tcp;
    uv_write_t write;
    const struct subscriber_ways *ways;
    void *owner;
    struct subscriber *next;
    struct request request;
    enum subscriber_stage stage;
    bool is_writing;
    int64_t since_ms; /* of this stage                                */
    int64_t wrote_ms, said_ms;
    char line[REQUEST_SIZE];
    size_t line_len;
    struct shared *queue[SUBSCRIBER_QUEUE_MAX]; /* ring                    */
    int first, n;
    int n_in_flight;
    size_t sent; /* bytes of the first that are sent already     */
    size_t queue_bytes;
    uint64_t skipped; /* not told yet                                 */
    uint64_t skipped_all;
    struct newest *newest[2]; /* by stream and track number                */
    int n_newest;
};

/* Drops what it holds; the handle must be closed. */
void subscriber_fini(struct subscriber *s);

/* Queues a reference; false when the queue is full. */
bool subscriber_push(struct subscriber *s, struct shared *bytes);

/* One message of the stream: kept, or counted as skipped. */
void subscriber_offer(struct subscriber *s, struct shared *bytes);

/* A message for this subscriber alone. */
void subscriber_push_own(struct subscriber *s, const char *bytes, size_t len);

/* Sends as much as the socket takes now, the rest when it has room. */
void subscriber_flush(struct subscriber *s);

/* Tells how many were skipped, once half of the queue is free. */
void subscriber_tell_skipped(struct subscriber *s, int64_t real_ns);

/* Mode `newest`: keeps it in the place of an older one of that track. */
void subscriber_keep_newest(struct subscriber *s, int stream, int number,
                            struct shared *bytes);

/* Moves what is due into the queue while the socket has room; at the end
 * (is_last) whatever is left. */
void subscriber_send_newest(struct subscriber *s, bool is_last);

#endif
