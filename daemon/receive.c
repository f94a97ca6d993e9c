/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/receive.h"

#include <errno.h>
#include <linux/sock_diag.h>
#include <netinet/in.h>
#include <netinet/udp.h>
#include <stdlib.h>
#include <string.h>
#include <sys/uio.h>
#include <unistd.h>

#ifndef UDP_GRO
#define UDP_GRO 104
#endif

enum { CONTROL_SIZE = 256, DRAIN_NS = 200000000 };

struct receive {
    uv_poll_t poll;
    int fd;
    struct receive_taker taker;
    struct receive_counts counts;
    struct mmsghdr message[RECEIVE_SLOTS];
    struct iovec piece[RECEIVE_SLOTS];
    struct sockaddr_storage from[RECEIVE_SLOTS];
    char control[RECEIVE_SLOTS][CONTROL_SIZE];
    uint8_t *slots;
    uint32_t drops_seen; /* the kernel's own counter, which wraps        */
};

/* What stands beside a datagram. */
struct beside {
    int64_t stamp_ns;
    int segment; /* bytes of each datagram of a merged buffer, 0 = whole    */
};

static struct beside look_beside(struct msghdr *h, int64_t otherwise_ns)
{
    struct beside b = {otherwise_ns, 0};
    for (struct cmsghdr *c = CMSG_FIRSTHDR(h); c; c = CMSG_NXTHDR(h, c)) {
        if (c->cmsg_level == SOL_SOCKET && c->cmsg_type == SO_TIMESTAMPNS) {
            struct timespec t;
            memcpy(&t, CMSG_DATA(c), sizeof t);
            b.stamp_ns = (int64_t)t.tv_sec * 1000000000 + t.tv_nsec;
        } else if (c->cmsg_level == IPPROTO_UDP && c->cmsg_type == UDP_GRO) {
            memcpy(&b.segment, CMSG_DATA(c), sizeof b.segment);
        }
    }
    return b;
}

static void give(struct receive *r, int slot, struct line_reading now)
{
    struct msghdr *h = &r->message[slot].msg_hdr;
    const uint8_t *bytes = r->piece[slot].iov_base;
    size_t len = r->message[slot].msg_len;
    struct beside b = look_beside(h, now.real_ns);
    struct sender from = endpoint_sender(&r->from[slot]);
    if (h->msg_flags & MSG_TRUNC)
        r->counts.n_cut++; /* what is left of it will not decode */
    size_t each = b.segment > 0 ? (size_t)b.segment : len;
    r->counts.n_merged += each < len;
    if (len == 0)
        r->taker.datagram(r->taker.ctx, now, b.stamp_ns, &from, bytes, 0);
    for (size_t at = 0; at < len; at += each)
        r->taker.datagram(r->taker.ctx, now, b.stamp_ns, &from, bytes + at,
                          len - at < each ? len - at : each);
}

static void rearm(struct receive *r, int n)
{
    for (int i = 0; i < n; i++) {
        r->message[i].msg_hdr.msg_namelen = sizeof r->from[i];
        r->message[i].msg_hdr.msg_controllen = CONTROL_SIZE;
        r->message[i].msg_hdr.msg_flags = 0;
    }
}

/* One batch; false when the socket was empty. */
static bool take_batch(struct receive *r)
{
    struct line_reading now = line_read();
    int n = recvmmsg(r->fd, r->message, RECEIVE_SLOTS, MSG_DONTWAIT, NULL);
    if (n <= 0) {
        if (n < 0 && (errno == EAGAIN || errno == EWOULDBLOCK))
            r->taker.empty(r->taker.ctx, now);
        else if (n < 0 && errno != EINTR)
            r->counts.n_errors++;
        return false;
    }
    for (int i = 0; i < n; i++)
        give(r, i, now);
    rearm(r, n);
    return true;
}

void receive_look(struct receive *r)
{
    for (int i = 0; i < RECEIVE_BATCHES; i++)
        if (!take_batch(r))
            break;
}

static void on_readable(uv_poll_t *poll, int result, int events)
{
    (void)result;
    (void)events;
    receive_look(poll->data);
}

/* What lies in the buffer is laid in far less than the bound; whoever sends
 * without a pause must not keep the daemon from stopping. */
void receive_drain(struct receive *r)
{
    int64_t until_ns = line_read().mono_ns + DRAIN_NS;
    while (take_batch(r) && line_read().mono_ns < until_ns)
        ;
}

static status set_up(struct receive *r, int64_t buffer_bytes, struct err *err)
{
    int one = 1,
        size = (int)(buffer_bytes > INT32_MAX ? INT32_MAX : buffer_bytes);
    /* The privileged form goes beyond the system's limit; the plain one is
     * clipped to it, which receive_buffer tells. */
    if (setsockopt(r->fd, SOL_SOCKET, SO_RCVBUFFORCE, &size, sizeof size) != 0)
        setsockopt(r->fd, SOL_SOCKET, SO_RCVBUF, &size, sizeof size);
    if (setsockopt(r->fd, SOL_SOCKET, SO_TIMESTAMPNS, &one, sizeof one) != 0)
        return err_set(err, ST_IO, "receive.udp: no kernel time stamps: %s",
                       strerror(errno));
    /* Without it merged sends arrive singly: slower, not wrong. */
    setsockopt(r->fd, IPPROTO_UDP, UDP_GRO, &one, sizeof one);
    for (int i = 0; i < RECEIVE_SLOTS; i++) {
        r->piece[i] = (struct iovec){r->slots + (size_t)i * RECEIVE_SLOT_SIZE,
                                     RECEIVE_SLOT_SIZE};
        struct msghdr *h = &r->message[i].msg_hdr;
        h->msg_name = &r->from[i];
        h->msg_iov = &r->piece[i];
        h->msg_iovlen = 1;
        h->msg_control = r->control[i];
    }
    rearm(r, RECEIVE_SLOTS);
    return ST_OK;
}

status receive_start(struct receive **out, uv_loop_t *loop, struct endpoint *at,
                     int64_t buffer_bytes, struct receive_taker taker,
                     struct err *err)
{
    struct receive *r = calloc(1, sizeof *r);
    status st = ST_OK;
    *out = NULL;
    if (!r)
        return err_set(err, ST_NOMEM, "out of memory");
    r->taker = taker;
    r->fd = endpoint_bind(at, SOCK_DGRAM, err);
    r->slots = malloc((size_t)RECEIVE_SLOTS * RECEIVE_SLOT_SIZE);
    if (r->fd < 0)
        st = ST_IO;
    else if (!r->slots)
        st = err_set(err, ST_NOMEM, "receive.udp: no memory for its slots");
    else
        st = set_up(r, buffer_bytes, err);
    if (st == ST_OK && uv_poll_init(loop, &r->poll, r->fd) != 0)
        st = err_set(err, ST_IO, "receive.udp: cannot be polled");
    if (st != ST_OK) {
        if (r->fd >= 0)
            close(r->fd);
        free(r->slots);
        free(r);
        return st;
    }
    r->poll.data = r;
    uv_poll_start(&r->poll, UV_READABLE, on_readable);
    *out = r;
    return ST_OK;
}

struct receive_counts receive_counts(struct receive *r)
{
    uint32_t info[SK_MEMINFO_VARS] = {0};
    socklen_t len = sizeof info;
    if (getsockopt(r->fd, SOL_SOCKET, SO_MEMINFO, info, &len) == 0) {
        uint32_t more = info[SK_MEMINFO_DROPS] - r->drops_seen;
        r->counts.n_dropped += more;
        r->drops_seen += more;
    }
    return r->counts;
}

int receive_buffer(const struct receive *r)
{
    int size = 0;
    socklen_t len = sizeof size;
    getsockopt(r->fd, SOL_SOCKET, SO_RCVBUF, &size, &len);
    return size;
}

static void on_closed(uv_handle_t *handle)
{
    struct receive *r = handle->data;
    close(r->fd);
    free(r->slots);
    free(r);
}

void receive_close(struct receive *r)
{
    if (r)
        uv_close((uv_handle_t *)&r->poll, on_closed);
}
