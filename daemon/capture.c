/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/capture.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>

struct capture {
    char **path; /* files in order                              */
    size_t n_paths, at_path;
    uint8_t *bytes; /* of the file being read, NULL = none         */
    size_t len, at;
    struct pcap_form form;
    struct capture_tally tally;
};

static void unmap(struct capture *c)
{
    if (c->bytes)
        munmap(c->bytes, c->len);
    c->bytes = NULL;
    c->len = c->at = 0;
}

void capture_close(struct capture *c)
{
    if (!c)
        return;
    unmap(c);
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

/* Maps the file and checks its head. */
static status map(struct capture *c, const char *path, struct err *err)
{
    struct stat st;
    int fd = open(path, O_RDONLY | O_CLOEXEC);
    status result = ST_OK;
    if (fd < 0 || fstat(fd, &st) != 0) {
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
    c->len = (size_t)st.st_size;
    void *at = mmap(NULL, c->len, PROT_READ, MAP_PRIVATE, fd, 0);
    if (at == MAP_FAILED) {
        result = err_set(err, ST_IO, "%s: cannot be mapped: %s", path,
                         strerror(errno));
        goto out;
    }
    c->bytes = at;
    c->at = PCAP_FILE_HEAD_SIZE;
    madvise(at, c->len, MADV_SEQUENTIAL);
    if (!pcap_read_file_head(c->bytes, c->len, &c->form))
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
    c->tally.n_files++;
    c->tally.n_bytes += c->len;
out:
    if (fd >= 0)
        close(fd);
    if (result != ST_OK)
        unmap(c);
    return result;
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
    status st = list(c, path, err);
    if (st == ST_OK)
        st = map(c, c->path[0], err);
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
    c->tally.torn_bytes += c->len - c->at;
    unmap(c);
    while (c->at_path < c->n_paths) {
        struct stat st;
        const char *path = c->path[c->at_path++];
        if (map(c, path, NULL) == ST_OK)
            return true;
        if (stat(path, &st) == 0)
            c->tally.torn_bytes += (uint64_t)st.st_size;
    }
    return false;
}

bool capture_next(struct capture *c, struct pcap_record *record)
{
    for (;;) {
        size_t used = 0;
        if (!c->bytes)
            return false;
        if (c->at == c->len) {
            if (!next_file(c))
                return false;
            continue;
        }
        switch (pcap_read_record(&c->form, c->bytes + c->at, c->len - c->at,
                                 record, &used)) {
        case PCAP_RECORD:
            c->at += used;
            c->tally.n_records++;
            return true;
        case PCAP_SKIP:
            c->at += used;
            c->tally.n_skipped++;
            break;
        case PCAP_TORN:
            if (!next_file(c))
                return false;
            break;
        }
    }
}

const struct capture_tally *capture_tally(const struct capture *c)
{
    return &c->tally;
}
