/* The request line of a subscriber. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cjson/cJSON.h>
#include <string.h>

#include "daemon/subscriber.h"

struct request request_default(void)
{
    struct request r = {.form = WIRE_JSON, .wants_every = true};
    r.wants[STREAM_LIVE] = true;
    return r;
}

bool request_wants_track(const struct request *r, const char *track)
{
    for (int i = 0; i < r->n_tracks; i++) {
        size_t n = strlen(r->track[i]);
        bool is_prefix = n > 0 && r->track[i][n - 1] == '*';
        if (is_prefix ? strncmp(track, r->track[i], n - 1) == 0
                      : strcmp(track, r->track[i]) == 0)
            return true;
    }
    return r->n_tracks == 0;
}

static status wrong(struct err *err, const char *key, const char *remedy)
{
    return err_set(err, ST_SCHEMA, "request: %s: %s", key, remedy);
}

static status take_tracks(struct request *r, const cJSON *list, struct err *err)
{
    const cJSON *item;
    if (!cJSON_IsArray(list))
        return wrong(err, "tracks", "give a list of ids");
    cJSON_ArrayForEach(item, list)
    {
        const char *id = cJSON_GetStringValue(item);
        size_t n = id ? strlen(id) : 0;
        if (n == 0 || n >= RIG_ID_SIZE)
            return wrong(err, "tracks",
                         "an id is a text of at most 63 "
                         "characters");
        if (r->n_tracks == REQUEST_TRACKS_MAX)
            return wrong(err, "tracks", "at most 32 ids; use a prefix*");
        memcpy(r->track[r->n_tracks++], id, n + 1);
    }
    return ST_OK;
}

static status take_stream(struct request *r, const char *word, struct err *err)
{
    bool is_both = strcmp(word, "both") == 0;
    r->wants[STREAM_LIVE] = is_both || strcmp(word, "live") == 0;
    r->wants[STREAM_SETTLED] = is_both || strcmp(word, "settled") == 0;
    if (!r->wants[STREAM_LIVE] && !r->wants[STREAM_SETTLED])
        return wrong(err, "stream", "one of live, settled, both");
    return ST_OK;
}

static status take_mode(struct request *r, const char *word, struct err *err)
{
    r->wants_every = strcmp(word, "every") == 0;
    if (!r->wants_every && strcmp(word, "newest") != 0)
        return wrong(err, "mode", "one of newest, every");
    return ST_OK;
}

static status take_form(struct request *r, const char *word, struct err *err)
{
    r->form = strcmp(word, "msgpack") == 0 ? WIRE_MSGPACK : WIRE_JSON;
    if (r->form == WIRE_JSON && strcmp(word, "json") != 0)
        return wrong(err, "form", "one of json, msgpack");
    return ST_OK;
}

static status take(struct request *r, const cJSON *item, struct err *err)
{
    const char *key = item->string, *word = cJSON_GetStringValue(item);
    if (strcmp(key, "tracks") == 0)
        return take_tracks(r, item, err);
    if (strcmp(key, "rate") == 0) {
        if (!cJSON_IsNumber(item) ||
            !(item->valuedouble > 0 && item->valuedouble <= 1e6))
            return wrong(err, "rate",
                         "estimates per second and track, above 0");
        r->rate_hz = item->valuedouble;
        return ST_OK;
    }
    if (!word)
        word = "";
    if (strcmp(key, "stream") == 0)
        return take_stream(r, word, err);
    if (strcmp(key, "mode") == 0)
        return take_mode(r, word, err);
    if (strcmp(key, "form") == 0)
        return take_form(r, word, err);
    return wrong(err, key,
                 "no such key; tracks, stream, rate, mode and form are known");
}

/* The parser stops behind the object and takes what follows for granted. */
static bool is_blank(const char *at, const char *end)
{
    while (at < end && strchr(" \t\r", *at) != NULL && *at)
        at++;
    return at == end;
}

status request_parse(struct request *r, const char *line, size_t len,
                     struct err *err)
{
    const char *end = line;
    cJSON *root = cJSON_ParseWithLengthOpts(line, len, &end, false);
    status st = ST_OK;
    *r = request_default();
    if (!cJSON_IsObject(root) || !is_blank(end, line + len)) {
        st = err_set(err, ST_PARSE, "request: not one JSON object in one line");
        goto out;
    }
    const cJSON *item;
    cJSON_ArrayForEach(item, root)
    {
        st = take(r, item, err);
        if (st != ST_OK)
            goto out;
    }
    if (r->rate_hz > 0) /* a rate thins out, whatever the mode */
        r->wants_every = false;
out:
    cJSON_Delete(root);
    return st;
}
