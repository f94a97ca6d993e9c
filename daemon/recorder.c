/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/recorder.h"

#include <errno.h>
#include <pthread.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/statvfs.h>
#include <time.h>
#include <unistd.h>

#include "core/wire/encode.h"
#include "daemon/log.h"
#include "daemon/ring.h"
#include "daemon/segment.h"

#define RING_SIZE   (16 * 1024 * 1024)
#define CONTROL_MAX 1024
#define SECOND_NS   1000000000
#define REMIND_NS   (30ll * SECOND_NS) /* of a capture that stands still   */

struct recorder {
    const struct settings *settings;
    struct recorder_watch watch;
    struct ring ring;
    pthread_t thread;
    _Atomic bool is_stopping;
    _Atomic uint64_t n_refused; /* records that found the ring full      */

    /* the writer's own */
    struct segment segment;
    int64_t start_ns, line_ns;
    int number;
    uint64_t n_lost; /* since the last gap record             */
    int64_t synced_ns, retried_ns, checked_ns, gap_ns; /* monotonic        */
    int64_t told_ns; /* of the last line in the log           */
};

static int64_t mono_ns(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (int64_t)t.tv_sec * SECOND_NS + t.tv_nsec;
}

/* --- ingest's side
 * ------------------------------------------------------------ */

/* In the ring a record has its arrival in front, for the segment's age. */
enum { FRONT = 8 };

bool recorder_put(struct recorder *r, int64_t a_ns, const struct sender *from,
                  const struct sender *to, const uint8_t *payload, size_t len)
{
    uint8_t *at = ring_reserve(&r->ring, FRONT + PCAP_RECORD_HEAD_MAX + len);
    if (!at) {
        atomic_fetch_add_explicit(&r->n_refused, 1, memory_order_relaxed);
        return false;
    }
    memcpy(at, &a_ns, FRONT);
    size_t head =
        pcap_write_record_head(at + FRONT, a_ns, from, to, payload, len);
    memcpy(at + FRONT + head, payload, len);
    ring_commit(&r->ring, FRONT + head + len);
    return true;
}

bool recorder_control(struct recorder *r, enum control_kind kind,
                      int64_t line_ns, uint64_t n, const char *text)
{
    uint8_t *at = ring_reserve(&r->ring, FRONT + CONTROL_MAX);
    if (!at) {
        atomic_fetch_add_explicit(&r->n_refused, 1, memory_order_relaxed);
        return false;
    }
    memcpy(at, &line_ns, FRONT);
    size_t len =
        pcap_write_control(at + FRONT, CONTROL_MAX, kind, line_ns, n, text);
    ring_commit(&r->ring, FRONT + len);
    return true;
}

/* --- the writer's side
 * ---------------------------------------------------------- */

static bool is_below_floor(struct recorder *r)
{
    struct statvfs fs;
    if (r->settings->floor_bytes <= 0 || statvfs(r->settings->folder, &fs) != 0)
        return false;
    return (double)fs.f_bavail * (double)fs.f_frsize <
           (double)r->settings->floor_bytes;
}

/* The segment is given up; a new one is tried once a second. */
static void give_up(struct recorder *r, const struct err *err)
{
    char text[sizeof err->text + 64];
    r->n_lost += r->segment.fd >= 0 ? r->segment.n_buffered : 0;
    segment_close(&r->segment);
    r->retried_ns = mono_ns();
    snprintf(text, sizeof text, "capture interrupted, fusion goes on: %s",
             err->text);
    r->watch.gap(r->watch.ctx, text, r->n_lost);
    if (r->retried_ns - r->told_ns < REMIND_NS && r->told_ns != 0)
        return;
    log_warn("%s", text);
    r->told_ns = r->retried_ns;
}

static void put_gap(struct recorder *r)
{
    uint8_t record[CONTROL_MAX];
    struct err err;
    uint64_t n = r->n_lost + atomic_exchange(&r->n_refused, 0);
    if (n == 0)
        return;
    size_t len = pcap_write_control(record, sizeof record, CONTROL_GAP,
                                    r->line_ns, n, "");
    if (segment_put(&r->segment, record, len, &err) != ST_OK) {
        r->n_lost = n;
        give_up(r, &err);
        return;
    }
    r->watch.gap(r->watch.ctx, "the capture goes on; records missing from it",
                 n);
    log_warn("the capture goes on in %s; records missing from it: %llu",
             r->segment.path, (unsigned long long)n);
    r->n_lost = 0;
    r->told_ns = 0;
}

static bool open_next(struct recorder *r)
{
    struct err err;
    if (is_below_floor(r)) {
        err_set(&err, ST_IO,
                "%s: less free than capture.floor; free some space",
                r->settings->folder);
        give_up(r, &err);
        return false;
    }
    status st = segment_open(&r->segment, r->settings, r->start_ns, &r->number,
                             r->line_ns, &err);
    if (st != ST_OK) {
        give_up(r, &err);
        return false;
    }
    put_gap(r);
    return r->segment.fd >= 0;
}

static bool is_full(const struct recorder *r)
{
    const struct segment *g = &r->segment;
    return g->written + g->used >= (uint64_t)r->settings->segment_bytes ||
           r->line_ns - g->begun_ns >= r->settings->segment_every_ns;
}

static void write_record(struct recorder *r, const uint8_t *bytes, size_t len)
{
    struct err err;
    memcpy(&r->line_ns, bytes, FRONT);
    if (r->segment.fd >= 0 && is_full(r)) {
        if (segment_sync(&r->segment, &err) == ST_OK)
            segment_close(&r->segment);
        else
            give_up(r, &err);
    }
    if (r->segment.fd < 0 &&
        (mono_ns() - r->retried_ns < SECOND_NS || !open_next(r))) {
        r->n_lost++;
        return;
    }
    if (segment_put(&r->segment, bytes + FRONT, len - FRONT, &err) != ST_OK) {
        r->n_lost++;
        give_up(r, &err);
    }
}

static void keep(struct recorder *r, int64_t now_ns)
{
    struct err err;
    status st = ST_OK;
    if (r->segment.fd < 0)
        return;
    if (atomic_load(&r->n_refused) > 0 &&
        (now_ns - r->gap_ns >= SECOND_NS || atomic_load(&r->is_stopping))) {
        r->gap_ns = now_ns;
        put_gap(r);
    }
    if (r->segment.fd < 0)
        return;
    if (r->settings->sync == SYNC_ALWAYS ||
        (r->settings->sync == SYNC_EVERY_SECOND &&
         now_ns - r->synced_ns >= SECOND_NS)) {
        st = segment_sync(&r->segment, &err);
        r->synced_ns = now_ns;
    } else {
        st = segment_flush(&r->segment, &err);
    }
    if (st == ST_OK && now_ns - r->checked_ns >= SECOND_NS) {
        r->checked_ns = now_ns;
        if (is_below_floor(r))
            st = err_set(&err, ST_IO,
                         "%s: less free than capture.floor; free some space",
                         r->settings->folder);
    }
    if (st != ST_OK)
        give_up(r, &err);
}

static void *write_records(void *arg)
{
    struct recorder *r = arg;
    for (;;) {
        bool is_stopping = atomic_load(&r->is_stopping);
        size_t len, n = 0;
        const uint8_t *record;
        while ((record = ring_front(&r->ring, &len)) != NULL) {
            write_record(r, record, len);
            ring_pop(&r->ring);
            if (++n == 4096)
                break;
        }
        int64_t now_ns = mono_ns();
        keep(r, now_ns);
        if (n == 0 && is_stopping)
            break;
        if (n < 4096 && !is_stopping)
            nanosleep(&(struct timespec){0, 20000000}, NULL);
    }
    return NULL;
}

/* --- life
 * ------------------------------------------------------------------------ */

/* Makes the folder and those above it. */
static bool make_folder(const char *path)
{
    char part[SETTINGS_PATH_SIZE];
    snprintf(part, sizeof part, "%s", path);
    for (char *s = part + 1; *s; s++) {
        if (*s != '/')
            continue;
        *s = 0;
        if (mkdir(part, 0755) != 0 && errno != EEXIST)
            return false;
        *s = '/';
    }
    return mkdir(part, 0755) == 0 || errno == EEXIST;
}

status recorder_start(struct recorder **out, const struct settings *s,
                      int64_t line_ns, struct recorder_watch watch,
                      struct err *err)
{
    struct recorder *r = calloc(1, sizeof *r);
    status st = ST_OK;
    *out = NULL;
    if (!r)
        return err_set(err, ST_NOMEM, "out of memory");
    r->settings = s;
    r->watch = watch;
    r->start_ns = r->line_ns = line_ns;
    r->segment.fd = -1;
    if (!make_folder(s->folder)) {
        st = err_set(err, ST_IO, "capture.folder %s: cannot be made: %s",
                     s->folder, strerror(errno));
        goto out;
    }
    st = segment_open(&r->segment, s, line_ns, &r->number, line_ns, err);
    if (st != ST_OK)
        goto out;
    st = ring_init(&r->ring, RING_SIZE);
    if (st != ST_OK) {
        err_set(err, st, "capture: no memory for the ring");
        goto out;
    }
    char text[128];
    snprintf(text, sizeof text, "%s %s", ROPEWALK_BUILD, s->rig.file_hash);
    recorder_control(r, CONTROL_START, line_ns, ENGINE_NUMBER, text);
    if (pthread_create(&r->thread, NULL, write_records, r) != 0) {
        st = err_set(err, ST_IO, "capture: no thread: %s", strerror(errno));
        goto out;
    }
    *out = r;
    return ST_OK;
out:
    segment_close(&r->segment);
    ring_fini(&r->ring);
    free(r);
    return st;
}

void recorder_stop(struct recorder *r)
{
    struct err err;
    if (!r)
        return;
    atomic_store(&r->is_stopping, true);
    pthread_join(r->thread, NULL);
    if (r->segment.fd >= 0 && segment_sync(&r->segment, &err) != ST_OK)
        log_warn("the end of the capture is lost: %s", err.text);
    segment_close(&r->segment);
    ring_fini(&r->ring);
    free(r);
}

const char *recorder_folder(const struct recorder *r)
{
    return r->settings->folder;
}

double recorder_lasts_s(const struct settings *s, double bytes_per_s)
{
    struct statvfs fs;
    if (statvfs(s->folder, &fs) != 0 || bytes_per_s <= 0)
        return -1;
    double room =
        (double)fs.f_bavail * (double)fs.f_frsize - (double)s->floor_bytes;
    return room > 0 ? room / bytes_per_s : 0;
}
