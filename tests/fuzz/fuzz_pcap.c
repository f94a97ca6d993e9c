/* Any bytes as a capture: file head, then records to the end.
 *
 * Built with -fsanitize=fuzzer,address,undefined.  Beside memory errors it
 * looks for views outside the bytes, sizes that do not add up and records
 * that do not survive being written again. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>
#include <string.h>

#include "core/wire/pcap.h"

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t len);

static void must(bool claim)
{
    if (!claim)
        abort();
}

static void must_lie_inside(const void *at, size_t n, const uint8_t *record,
                            size_t size)
{
    if (n == 0)
        return;
    must((const uint8_t *)at >= record);
    must((size_t)((const uint8_t *)at - record) <= size - n);
}

static void must_equal(const struct sender *a, const struct sender *b)
{
    must(a->family == b->family && a->port == b->port);
    must(memcmp(a->address, b->address, sizeof a->address) == 0);
}

static void must_come_back(const struct pcap_record *r)
{
    static const struct pcap_form ours = {.linktype = PCAP_LINKTYPE_RAW};
    static uint8_t again[PCAP_RECORD_HEAD_MAX + 65536];
    struct pcap_record b;
    size_t used;
    size_t n = pcap_write_record_head(again, r->a_ns, &r->from, &r->to,
                                      r->payload, r->len);
    must(n > 0);
    memcpy(again + n, r->payload, r->len);
    must(pcap_read_record(&ours, again, n + r->len, &b, &used) == PCAP_RECORD);
    must(used == n + r->len && b.len == r->len && b.a_ns == r->a_ns);
    must(b.control == r->control && b.line_ns == r->line_ns && b.n == r->n);
    must_equal(&b.from, &r->from);
    must_equal(&b.to, &r->to);
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t len)
{
    struct pcap_form form;
    if (!pcap_read_file_head(bytes, len, &form))
        return 0;
    bytes += PCAP_FILE_HEAD_SIZE;
    len -= PCAP_FILE_HEAD_SIZE;
    for (;;) {
        struct pcap_record r;
        size_t used = 0;
        enum pcap_result result =
            pcap_read_record(&form, bytes, len, &r, &used);
        if (result == PCAP_TORN)
            return 0;
        must(used > 0 && used <= len);
        if (result == PCAP_RECORD) {
            must_lie_inside(r.payload, r.len, bytes, used);
            must_lie_inside(r.text.at, (size_t)r.text.len, bytes, used);
            must_lie_inside(r.build.at, (size_t)r.build.len, bytes, used);
            must_lie_inside(r.rig.at, (size_t)r.rig.len, bytes, used);
            must_come_back(&r);
        }
        bytes += used;
        len -= used;
    }
}
