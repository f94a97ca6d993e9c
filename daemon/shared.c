/* Encoded bytes that several subscribers send.  One thread only. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>
#include <string.h>

#include "daemon/subscriber.h"

struct shared *shared_new(const char *bytes, size_t len)
{
    struct shared *s = malloc(sizeof *s + len);
    if (!s)
        return NULL;
    s->n_users = 1;
    s->len = len;
    memcpy(s->bytes, bytes, len);
    return s;
}

void shared_drop(struct shared *s)
{
    if (s && --s->n_users == 0)
        free(s);
}
