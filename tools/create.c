/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/create.h"

#include <errno.h>
#include <string.h>
#include <sys/stat.h>

#include "core/wire/pcap.h"

enum { LOOK_SIZE = 4096 };

static bool is_same(const char *a, const char *b)
{
    struct stat x, y;
    return a != NULL && b != NULL && stat(a, &x) == 0 && stat(b, &y) == 0 &&
           x.st_dev == y.st_dev && x.st_ino == y.st_ino;
}

/* Ours begin with a control record; rehearsals and imports do not. */
static bool is_daemons_capture(const char *path)
{
    uint8_t bytes[LOOK_SIZE];
    struct pcap_form form;
    struct pcap_record record;
    size_t used;
    FILE *file = fopen(path, "rb");
    size_t n = file == NULL ? 0 : fread(bytes, 1, sizeof bytes, file);
    if (file != NULL)
        fclose(file);
    return pcap_read_file_head(bytes, n, &form) &&
           pcap_read_record(&form, bytes + PCAP_FILE_HEAD_SIZE,
                            n - PCAP_FILE_HEAD_SIZE, &record,
                            &used) == PCAP_RECORD &&
           record.control != CONTROL_NONE;
}

FILE *create_file(const struct call *call, const char *path,
                  const char *const *input, int n)
{
    for (int i = 0; i < n; i++) {
        if (!is_same(path, input[i]))
            continue;
        call_say(call, "%s: is read as well; name another file to write", path);
        return NULL;
    }
    if (is_daemons_capture(path)) {
        call_say(call,
                 "%s: holds a capture that ropewalkd made; name another file, "
                 "or remove that one",
                 path);
        return NULL;
    }
    FILE *to = fopen(path, "wb");
    if (to == NULL)
        call_say(call, "%s: cannot be written: %s; name another file", path,
                 strerror(errno));
    return to;
}
