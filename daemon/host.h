/* host.h - what only this machine can know, on its way to the subscribers.
 *
 * Kernel drops, capture gaps, clock steps, start and stop: said from any
 * thread into a short list, taken by the hub.  They are never mixed with what
 * the run says, for a replay cannot know them.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_HOST_H
#define DAEMON_HOST_H

#include <pthread.h>
#include <stdint.h>

enum { HOST_MAX = 64 };

struct host_message {
    int64_t t_ns; /* realtime                                       */
    char what[16];
    char text[600];
    uint64_t n;
};

struct host {
    pthread_mutex_t lock;
    struct host_message waiting[HOST_MAX];
    int n;
    uint64_t n_left_out; /* found the list full                            */
};

void host_init(struct host *h);
void host_fini(struct host *h);

/* `what` is a word, `text` a sentence, `n` a number (wire_encode_host). */
void host_say(struct host *h, const char *what, const char *text, uint64_t n);

/* Moves everything that waits to out[HOST_MAX + 1] and returns how many; the
 * last one says how many were left out, if any were. */
int host_take(struct host *h, struct host_message *out);

#endif
