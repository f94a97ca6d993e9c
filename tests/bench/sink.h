/* sink.h - the least that a receiver of datagrams can do: take them in batches
 * with kernel stamps on, and decode. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_BENCH_SINK_H
#define TESTS_BENCH_SINK_H

#include <arpa/inet.h>
#include <errno.h>
#include <netinet/in.h>
#include <netinet/udp.h>
#include <sys/socket.h>

#include "tests/bench/bench.h"
#include "tests/bench/ideal.h"

#ifndef UDP_GRO
#define UDP_GRO 104
#endif

enum { SINK_BATCH = 64, SINK_SLOT_SIZE = 65536, SINK_BUFFER_SIZE = 4 << 20 };

struct sink {
    struct mmsghdr message[SINK_BATCH];
    struct iovec piece[SINK_BATCH];
    char control[SINK_BATCH][256];
    uint8_t slot[SINK_BATCH][SINK_SLOT_SIZE];
};

static inline int64_t sink_stamp(struct msghdr *h, int *segment)
{
    int64_t stamp_ns = 0;
    *segment = 0;
    for (struct cmsghdr *c = CMSG_FIRSTHDR(h); c; c = CMSG_NXTHDR(h, c)) {
        if (c->cmsg_level == SOL_SOCKET && c->cmsg_type == SO_TIMESTAMPNS) {
            struct timespec t;
            memcpy(&t, CMSG_DATA(c), sizeof t);
            stamp_ns = (int64_t)t.tv_sec * 1000000000 + t.tv_nsec;
        } else if (c->cmsg_level == IPPROTO_UDP && c->cmsg_type == UDP_GRO) {
            memcpy(segment, CMSG_DATA(c), sizeof *segment);
        }
    }
    return stamp_ns;
}

/* is_merging: takes merged sends as one buffer, as the daemon does. */
static inline int sink_socket(int *port, bool is_merging)
{
    struct sockaddr_in at = {.sin_family = AF_INET,
                             .sin_addr.s_addr = htonl(INADDR_LOOPBACK)};
    socklen_t len = sizeof at;
    int fd = socket(AF_INET, SOCK_DGRAM, 0), size = SINK_BUFFER_SIZE, one = 1;
    setsockopt(fd, SOL_SOCKET, SO_RCVBUF, &size, sizeof size);
    setsockopt(fd, SOL_SOCKET, SO_TIMESTAMPNS, &one, sizeof one);
    if (is_merging)
        setsockopt(fd, IPPROTO_UDP, UDP_GRO, &one, sizeof one);
    BENCH_NEEDS(bind(fd, (struct sockaddr *)&at, sizeof at) == 0, "bind");
    BENCH_NEEDS(getsockname(fd, (struct sockaddr *)&at, &len) == 0, "port");
    *port = ntohs(at.sin_port);
    return fd;
}

static inline void sink_take(struct sink *s, int i, uint64_t *check)
{
    int segment;
    int64_t stamp_ns = sink_stamp(&s->message[i].msg_hdr, &segment);
    size_t len = s->message[i].msg_len;
    size_t each = segment > 0 ? (size_t)segment : len;
    for (size_t at = 0; at < len; at += each) {
        struct ideal_measurement m = {0};
        if (!ideal_decode(s->slot[i] + at, len - at < each ? len - at : each,
                          &m))
            _exit(2);
        *check += (uint64_t)m.seq + (uint64_t)stamp_ns;
    }
    s->message[i].msg_hdr.msg_controllen = sizeof s->control[i];
}

/* Until it is killed. */
static inline void sink_run(int fd)
{
    static struct sink s;
    uint64_t check = 0;
    for (int i = 0; i < SINK_BATCH; i++) {
        s.piece[i] = (struct iovec){s.slot[i], SINK_SLOT_SIZE};
        s.message[i].msg_hdr.msg_iov = &s.piece[i];
        s.message[i].msg_hdr.msg_iovlen = 1;
        s.message[i].msg_hdr.msg_control = s.control[i];
        s.message[i].msg_hdr.msg_controllen = sizeof s.control[i];
    }
    for (;;) {
        int n = recvmmsg(fd, s.message, SINK_BATCH, MSG_WAITFORONE, NULL);
        if (n < 0 && errno != EINTR)
            _exit(2);
        for (int i = 0; i < n; i++)
            sink_take(&s, i, &check);
        __asm__ volatile("" : : "r"(check)); /* else nobody needs it */
    }
}

#endif
