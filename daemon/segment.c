/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/segment.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <time.h>
#include <unistd.h>

#include "core/wire/pcap.h"

enum { NUMBER_MAX = 999999 }; /* six digits: names sort as they were made */

static status say(struct err *err, const char *path, const char *what)
{
    return err_set(err, ST_IO, "%s: cannot %s: %s", path, what,
                   strerror(errno));
}

/* All or nothing: a short write is taken back, so that the file ends with
 * a whole record. */
static bool write_all(int fd, const uint8_t *bytes, size_t len)
{
    size_t done = 0;
    while (done < len) {
        ssize_t n = write(fd, bytes + done, len - done);
        if (n < 0 && errno == EINTR)
            continue;
        if (n <= 0)
            return false;
        done += (size_t)n;
    }
    return true;
}

static void rig_path(const struct segment *g, char *path, size_t size)
{
    size_t len = strlen(g->path) - strlen(".pcap");
    snprintf(path, size, "%.*s.rig.json", (int)len, g->path);
}

static void copy_rig(const struct segment *g, const struct settings *s)
{
    char path[sizeof g->path + 16];
    rig_path(g, path, sizeof path);
    int fd = open(path, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0644);
    if (fd < 0)
        return;
    /* A rig copy that does not fit is no reason to lose measurements. */
    if (!write_all(fd, (const uint8_t *)s->text, s->text_len))
        unlink(path);
    close(fd);
}

status segment_open(struct segment *g, const struct settings *s,
                    int64_t start_ns, int *number, int64_t line_ns,
                    struct err *err)
{
    char stamp[32];
    time_t second = (time_t)(start_ns / 1000000000);
    struct tm utc;
    int next = *number;
    gmtime_r(&second, &utc);
    strftime(stamp, sizeof stamp, "%Y%m%dT%H%M%SZ", &utc);
    do {
        snprintf(g->path, sizeof g->path, "%s/%s-%06d.pcap", s->folder, stamp,
                 ++next);
        g->fd = open(g->path, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0644);
    } while (g->fd < 0 && errno == EEXIST && next < NUMBER_MAX);
    if (g->fd < 0)
        return say(err, g->path, "be made");
    *number = next;
    g->written = 0;
    g->begun_ns = line_ns;
    g->is_dirty = false;
    pcap_write_file_head(g->buffer);
    g->used = PCAP_FILE_HEAD_SIZE;
    g->n_buffered = 0;
    copy_rig(g, s);
    return ST_OK;
}

status segment_flush(struct segment *g, struct err *err)
{
    if (g->used == 0)
        return ST_OK;
    if (!write_all(g->fd, g->buffer, g->used)) {
        int reason = errno;
        if (ftruncate(g->fd, (off_t)g->written) != 0)
            reason = errno;
        errno = reason;
        return say(err, g->path, "be written");
    }
    g->written += g->used;
    g->used = 0;
    g->n_buffered = 0;
    g->is_dirty = true;
    return ST_OK;
}

status segment_put(struct segment *g, const void *bytes, size_t len,
                   struct err *err)
{
    if (g->used + len > SEGMENT_BUFFER) {
        status st = segment_flush(g, err);
        if (st != ST_OK)
            return st;
    }
    memcpy(g->buffer + g->used, bytes, len);
    g->used += len;
    g->n_buffered++;
    return ST_OK;
}

status segment_sync(struct segment *g, struct err *err)
{
    status st = segment_flush(g, err);
    if (st != ST_OK || !g->is_dirty)
        return st;
    if (fdatasync(g->fd) != 0)
        return say(err, g->path, "be synced");
    g->is_dirty = false;
    return ST_OK;
}

void segment_close(struct segment *g)
{
    char path[sizeof g->path + 16];
    if (g->fd >= 0)
        close(g->fd);
    if (g->fd >= 0 && g->written == 0) {
        rig_path(g, path, sizeof path);
        unlink(path);
        unlink(g->path);
    }
    g->fd = -1;
    g->n_buffered = 0;
    g->used = 0;
}
