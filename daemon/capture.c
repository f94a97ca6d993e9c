/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/capture.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* What one read brings at most, and the largest record fits in: it stays in
 * the processor's cache, which a mapped file does not. */
enum { BUFFER_SIZE = 2 * PCAP_SNAPLEN, RECORD_SIZE_MAX = PCAP_SNAPLEN + 16 };

struct capture {
    char **path; /* files in order                              */
    size_t n_paths, at_path;
    int fd;          /* of the file being read, -1 = none           */
    uint64_t unread; /* bytes of it that no read brought yet        */
    size_t at, n;    /* next byte and end of what the buffer holds  */
    struct pcap_form form;
    struct capture_tally tally;
    uint8_t buffer[BUFFER_SIZE];
};

static void close_file(struct capture *c)
{
    if (c->fd >= 0)
        close(c->fd);
    c->fd = -1;
    c->at = c->n = 0;
    c->unread = 0;
}

/* Moves what is left to the front and reads on; false at the end. */
static bool read_on(struct capture *c)
{
    c->n -= c->at;
    memmove(c->buffer, c->buffer + c->at, c->n);
    c->at = 0;
    size_t room = sizeof c->buffer - c->n;
    if (room > c->unread)
        room = (size_t)c->unread;
    ssize_t got;
    do
        got = room > 0 ? read(c->fd, c->buffer + c->n, room) : 0;
    while (got < 0 && errno == EINTR);
    if (got <= 0)
        return false;
    c->n += (size_t)got;
    c->unread -= (uint64_t)got;
    return true;
}

void capture_close(struct capture *c)
{
    if (!c)
        return;
    close_file(c);
    for (size_t i = 0; i < c->n_paths; i++)
        free(c->path[i]);
    free(c->path);
    free(c);
}

static const char *linktype_name(uint32_t linktype)
{
    switch (linktype) {
    case 0:
        return "NULL (loopback)";
    case 1:
        return "EN10MB (Ethernet)";
    case 113:
        return "LINUX_SLL";
    case 276:
        return "LINUX_SLL2";
    default:
        return "unknown";
    }
}

/* Opens the file and checks its head. */
static status open_file(struct capture *c, const char *path, struct err *err)
{
    struct stat st;
    c->fd = open(path, O_RDONLY | O_CLOEXEC);
    status result = ST_OK;
    if (c->fd < 0 || fstat(c->fd, &st) != 0) {
        result = err_set(err, ST_IO, "%s: cannot be read: %s", path,
                         strerror(errno));
        goto out;
    }
    if (st.st_size < PCAP_FILE_HEAD_SIZE) {
        result = err_set(err, ST_PARSE,
                         "%s: %lld bytes, too short for a capture of at least "
                         "%d; name a pcap file or a capture folder",
                         path, (long long)st.st_size, PCAP_FILE_HEAD_SIZE);
        goto out;
    }
    c->unread = (uint64_t)st.st_size;
    if (!read_on(c)) {
        result = err_set(err, ST_IO, "%s: cannot be read: %s", path,
                         strerror(errno));
        goto out;
    }
    if (!pcap_read_file_head(c->buffer, c->n, &c->form))
        result = err_set(err, ST_PARSE,
                         "%s: does not begin like a pcap file; pcapng is not "
                         "built yet, save it as pcap",
                         path);
    else if (c->form.linktype != PCAP_LINKTYPE_RAW)
        result =
            err_set(err, ST_LATER,
                    "%s: link type %u, %s, is not built yet; only RAW "
                    "(101) is read",
                    path, c->form.linktype, linktype_name(c->form.linktype));
    c->at = PCAP_FILE_HEAD_SIZE;
    c->tally.n_files++;
    c->tally.n_bytes += (uint64_t)st.st_size;
out:
    if (result != ST_OK)
        close_file(c);
    return result;
}

enum capture_look capture_look(const char *path)
{
    enum { LOOK_SIZE = 4096 };
    uint8_t bytes[LOOK_SIZE];
    struct pcap_form form;
    struct pcap_record record;
    size_t used;
    FILE *file = fopen(path, "rb");
    size_t n = file == NULL ? 0 : fread(bytes, 1, sizeof bytes, file);
    if (file != NULL)
        fclose(file);
    if (!pcap_read_file_head(bytes, n, &form))
        return CAPTURE_NONE;
    bool is_ours = pcap_read_record(&form, bytes + PCAP_FILE_HEAD_SIZE,
                                    n - PCAP_FILE_HEAD_SIZE, &record,
                                    &used) == PCAP_RECORD &&
                   record.control != CONTROL_NONE;
    return is_ours ? CAPTURE_OURS : CAPTURE_FOREIGN;
}

static int by_name(const void *a, const void *b)
{
    return strcmp(*(char *const *)a, *(char *const *)b);
}

static bool is_segment(const char *name)
{
    size_t n = strlen(name);
    return n > 5 && strcmp(name + n - 5, ".pcap") == 0;
}

static bool add_path(struct capture *c, const char *folder, const char *name)
{
    char **paths = realloc(c->path, (c->n_paths + 1) * sizeof *paths);
    if (!paths)
        return false;
    c->path = paths;
    size_t size = strlen(folder) + strlen(name) + 2;
    char *path = malloc(size);
    if (!path)
        return false;
    snprintf(path, size, "%s%s%s", folder, *name ? "/" : "", name);
    c->path[c->n_paths++] = path;
    return true;
}

static status list(struct capture *c, const char *path, struct err *err)
{
    DIR *folder = opendir(path);
    if (!folder)
        return add_path(c, path, "") ? ST_OK
                                     : err_set(err, ST_NOMEM, "out of memory");
    bool is_good = true;
    for (struct dirent *e; is_good && (e = readdir(folder)) != NULL;)
        if (is_segment(e->d_name))
            is_good = add_path(c, path, e->d_name);
    closedir(folder);
    if (!is_good)
        return err_set(err, ST_NOMEM, "out of memory");
    if (c->n_paths == 0)
        return err_set(err, ST_IO, "%s: no *.pcap file in this folder", path);
    qsort(c->path, c->n_paths, sizeof *c->path, by_name);
    return ST_OK;
}

status capture_open(struct capture **out, const char *path, struct err *err)
{
    struct capture *c = calloc(1, sizeof *c);
    *out = NULL;
    if (!c)
        return err_set(err, ST_NOMEM, "out of memory");
    c->fd = -1;
    status st = list(c, path, err);
    if (st == ST_OK)
        st = open_file(c, c->path[0], err);
    if (st != ST_OK) {
        capture_close(c);
        return st;
    }
    c->at_path = 1;
    *out = c;
    return ST_OK;
}

/* False when there is no further file; one that cannot be read counts as torn
 * altogether. */
static bool next_file(struct capture *c)
{
    c->tally.torn_bytes += c->n - c->at + c->unread;
    close_file(c);
    while (c->at_path < c->n_paths) {
        struct stat st;
        const char *path = c->path[c->at_path++];
        if (open_file(c, path, NULL) == ST_OK)
            return true;
        if (stat(path, &st) == 0)
            c->tally.torn_bytes += (uint64_t)st.st_size;
    }
    return false;
}

bool capture_next(struct capture *c, struct pcap_record *record)
{
    while (c->fd >= 0) {
        size_t used = 0;
        switch (pcap_read_record(&c->form, c->buffer + c->at, c->n - c->at,
                                 record, &used)) {
        case PCAP_RECORD:
            c->at += used;
            c->tally.n_records++;
            return true;
        case PCAP_SKIP:
            c->at += used;
            c->tally.n_skipped++;
            break;
        case PCAP_TORN: /* in the buffer; in the file too if no more comes */
            if (c->n - c->at > RECORD_SIZE_MAX || !read_on(c))
                next_file(c);
            break;
        }
    }
    return false;
}

const struct capture_tally *capture_tally(const struct capture *c)
{
    return &c->tally;
}
