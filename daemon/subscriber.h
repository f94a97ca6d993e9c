/* subscriber.h - one TCP subscriber: what it asked for and its queue. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_SUBSCRIBER_H
#define DAEMON_SUBSCRIBER_H

#include <uv.h>

#include "config/load.h"
#include "core/wire/encode.h"

enum {
    REQUEST_SIZE = 4096,
    REQUEST_TRACKS_MAX = 32,
    REQUEST_WAIT_MS = 200
};

/* What a request line asked for. */
struct request {
    int n_tracks;          /* 0: all                                        */
    char track[REQUEST_TRACKS_MAX][RIG_ID_SIZE];
    bool wants[2];         /* by stream                                     */
    bool wants_every;      /* every message, not the newest per track       */
    double rate_hz;        /* newest: at most so often per track, 0 = any   */
    enum wire_form form;
};

/* Every live estimate as JSON lines: for whoever asks for nothing. */
struct request request_default(void);

/* One line of JSON; on ST_SCHEMA *err says what is wrong with it. */
status request_parse(struct request *r, const char *line, size_t len,
                     struct err *err) MUST_USE;

bool request_wants_track(const struct request *r, const char *track);

/* Encoded bytes, shared by all who get them. */
struct shared {
    int n_users;
    size_t len;
    char bytes[];
};

struct shared *shared_new(const char *bytes, size_t len);
void shared_drop(struct shared *s);

#endif
