/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/create.h"

#include <errno.h>
#include <string.h>
#include <sys/stat.h>

#include "daemon/capture.h"

static bool is_same(const char *a, const char *b)
{
    struct stat x, y;
    return a != NULL && b != NULL && stat(a, &x) == 0 && stat(b, &y) == 0 &&
           x.st_dev == y.st_dev && x.st_ino == y.st_ino;
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
    if (capture_look(path) == CAPTURE_OURS) {
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
