/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/output.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/encode.h"

enum { OUTPUT_SIZE = 256 * 1024 };

bool output_parse_streams(const char *word, enum output_streams *streams)
{
    static const struct {
        const char *word;
        enum output_streams streams;
    } words[] = {{"live", OUTPUT_LIVE},
                 {"settled", OUTPUT_SETTLED},
                 {"both", OUTPUT_BOTH},
                 {"none", OUTPUT_NONE}};
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++)
        if (strcmp(word, words[i].word) == 0) {
            *streams = words[i].streams;
            return true;
        }
    return false;
}

status output_init(struct output *o, const struct rig *rig, FILE *to,
                   enum output_streams streams)
{
    size_t least = wire_message_bound(rig);
    *o = (struct output){.rig = rig, .to = to, .streams = streams};
    o->size = least > OUTPUT_SIZE ? least : OUTPUT_SIZE;
    o->buf = malloc(o->size);
    return o->buf == NULL ? ST_NOMEM : ST_OK;
}

static void flush(struct output *o)
{
    if (!o->has_failed && o->used > 0 &&
        fwrite(o->buf, o->used, 1, o->to) != 1) {
        o->has_failed = true;
        o->reason = errno;
    }
    o->used = 0;
}

status output_fini(struct output *o)
{
    flush(o);
    if (!o->has_failed && fflush(o->to) != 0) {
        o->has_failed = true;
        o->reason = errno;
    }
    free(o->buf);
    o->buf = NULL;
    return o->has_failed ? ST_IO : ST_OK;
}

static bool is_wanted(const struct output *o, const struct message *m)
{
    switch ((enum message_type)m->type) {
    case MESSAGE_ESTIMATE:
        return o->streams >> ((const struct estimate *)m)->stream & 1;
    case MESSAGE_EVENT:
        return true;
    case MESSAGE_COUNTS:
        return o->streams != OUTPUT_NONE;
    }
    return false;
}

static void say(void *ctx, const struct message *m)
{
    struct output *o = ctx;
    if (o->has_failed || !is_wanted(o, m))
        return;
    o->n_estimates += m->type == MESSAGE_ESTIMATE;
    size_t len =
        wire_encode(o->rig, m, WIRE_JSON, o->buf + o->used, o->size - o->used);
    if (len == 0) {
        flush(o);
        len = wire_encode(o->rig, m, WIRE_JSON, o->buf, o->size);
    }
    o->used += len;
}

struct message_sink output_sink(struct output *o)
{
    o->wants[STREAM_LIVE] = o->streams & OUTPUT_LIVE;
    o->wants[STREAM_SETTLED] = o->streams & OUTPUT_SETTLED;
    return (struct message_sink){say, o, o->wants};
}

void output_description(struct output *o, const char *build)
{
    flush(o);
    o->used =
        wire_encode_description(o->rig, build, WIRE_JSON, o->buf, o->size);
}

void output_summary(struct output *o, struct run *run)
{
    struct track_summary track;
    flush(o);
    o->used = wire_summary_begin(o->rig, run_counts(run), o->buf, o->size);
    for (int i = 0; run_track_summary(run, i, &track); i++) {
        flush(o);
        o->used = wire_summary_track(o->rig, &track, i == 0, o->buf, o->size);
    }
    flush(o);
    o->used = wire_summary_end(o->buf, o->size);
}
