/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/support/drive.h"

#include <check.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/encode.h"

/* The power of two that holds n bytes and a NUL. */
static size_t room(size_t n)
{
    size_t size = 4096;
    while (size < n + 1)
        size *= 2;
    return size;
}

static void append(char **text, size_t *n, const char *line, size_t len)
{
    if (!*text || room(*n + len) != room(*n))
        *text = realloc(*text, room(*n + len));
    memcpy(*text + *n, line, len);
    *n += len;
    (*text)[*n] = 0;
}

static void say(void *ctx, const struct message *m)
{
    struct drive *d = ctx;
    int stream = -1;
    if (m->type == MESSAGE_ESTIMATE) {
        stream = ((const struct estimate *)(const void *)m)->stream;
        d->n_estimates[stream]++;
    }
    if (d->on_message)
        d->on_message(d->ctx, m);
    if (!d->keeps_text)
        return;
    size_t len =
        wire_encode(&d->settings->rig, m, WIRE_JSON, d->line, d->line_size);
    ck_assert_uint_gt(len, 0);
    append(&d->all, &d->n_all, d->line, len);
    if (stream == STREAM_LIVE)
        append(&d->live, &d->n_live, d->line, len);
    if (stream == STREAM_SETTLED)
        append(&d->settled, &d->n_settled, d->line, len);
}

void drive_init(struct drive *d, const char *rig_text)
{
    struct problems problems;
    memset(d, 0, sizeof *d);
    problems_init(&problems);
    status st = settings_parse(&d->settings, "test.json", rig_text,
                               strlen(rig_text), NULL, 0, &problems);
    ck_assert_msg(st == ST_OK, "%s", problems.text ? problems.text : "");
    problems_fini(&problems);
    const struct rig *rig = &d->settings->rig;
    size_t bytes = run_bytes(rig);
    d->memory = aligned_alloc(64, bytes);
    d->run =
        run_init(d->memory, bytes, rig, (struct message_sink){say, d, NULL});
    ck_assert_ptr_nonnull(d->run);
    d->line_size = wire_message_bound(rig);
    d->line = malloc(d->line_size);
    d->keeps_text = true;
}

void drive_fini(struct drive *d)
{
    settings_free(d->settings);
    free(d->memory);
    free(d->line);
    free(d->live);
    free(d->settled);
    free(d->all);
}

void drive_start(struct drive *d, int64_t line_ns)
{
    run_start(d->run, line_ns);
}

void drive_feed_bytes(struct drive *d, int64_t a_ns, const void *bytes,
                      size_t len)
{
    struct sender from = {.family = 4, .address = {127, 0, 0, 1}, .port = 9};
    run_feed(d->run, a_ns, &from, bytes, len);
}

void drive_feed(struct drive *d, int64_t a_ns, const char *fmt, ...)
{
    char text[4096];
    va_list args;
    va_start(args, fmt);
    int len = vsnprintf(text, sizeof text, fmt, args);
    va_end(args);
    ck_assert_int_lt(len, (int)sizeof text);
    drive_feed_bytes(d, a_ns, text, (size_t)len);
}

uint64_t drive_total(struct drive *d, enum outcome o)
{
    return run_counts(d->run)->total.outcome[o];
}

void drive_check_ledgers(struct drive *d, uint64_t n_measurements,
                         uint64_t n_datagrams)
{
    const struct counts *c = run_counts(d->run);
    uint64_t total = 0, datagrams = 0, sensors = 0;
    for (int o = 0; o < OUTCOME_COUNT; o++) {
        total += c->total.outcome[o];
        for (uint32_t i = 0; i < c->n_sensors; i++)
            sensors += c->sensor[i].outcome[o];
    }
    for (int o = 0; o < DATAGRAM_OUTCOME_COUNT; o++)
        datagrams += c->datagrams[o];
    ck_assert_uint_eq(total, n_measurements);
    ck_assert_uint_eq(datagrams, n_datagrams);
    ck_assert_uint_le(sensors, total);
    ck_assert_uint_le(total - sensors,
                      c->total.outcome[OUTCOME_UNKNOWN_SENSOR] +
                          c->total.outcome[OUTCOME_UNKNOWN_TRACK]);
}
