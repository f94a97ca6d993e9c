/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/host.h"

#include <stdio.h>
#include <string.h>

#include "daemon/line.h"

void host_init(struct host *h)
{
    memset(h, 0, sizeof *h);
    pthread_mutex_init(&h->lock, NULL);
}

void host_fini(struct host *h)
{
    pthread_mutex_destroy(&h->lock);
}

static void fill(struct host_message *m, const char *what, const char *text,
                 uint64_t n)
{
    m->t_ns = line_read().real_ns;
    m->n = n;
    snprintf(m->what, sizeof m->what, "%s", what);
    snprintf(m->text, sizeof m->text, "%s", text);
}

void host_say(struct host *h, const char *what, const char *text, uint64_t n)
{
    pthread_mutex_lock(&h->lock);
    if (h->n < HOST_MAX)
        fill(&h->waiting[h->n++], what, text, n);
    else
        h->n_left_out++;
    pthread_mutex_unlock(&h->lock);
}

int host_take(struct host *h, struct host_message *out)
{
    pthread_mutex_lock(&h->lock);
    int n = h->n;
    memcpy(out, h->waiting, (size_t)n * sizeof *out);
    if (h->n_left_out > 0)
        fill(&out[n++], "skipped", "host messages left out: too many at once",
             h->n_left_out);
    h->n = 0;
    h->n_left_out = 0;
    pthread_mutex_unlock(&h->lock);
    return n;
}
