/* pcap_case.h - records that the test_pcap programs share. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_UNIT_PCAP_CASE_H
#define TESTS_UNIT_PCAP_CASE_H

#include <string.h>

#include "core/wire/pcap.h"
#include "tests/suite.h"

enum { RECORD_MAX = 1024, A_NS_PART = 123456789 };

static const int64_t a_ns = 1000000000000000000 + A_NS_PART;
__attribute__((unused)) static const struct pcap_form ours = {
    .linktype = PCAP_LINKTYPE_RAW};
__attribute__((unused)) static const struct sender from_4 = {
    4, {10, 0, 0, 1}, 1};
__attribute__((unused)) static const struct sender to_4 = {4, {10, 0, 0, 2}, 2};
__attribute__((unused)) static const struct sender from_6 = {6, {[15] = 1}, 1};
__attribute__((unused)) static const struct sender to_6 = {6, {[15] = 1}, 2};

/* The example of RFC 1071, section 3: its sum is 0xddf2. */
__attribute__((unused)) static const uint8_t rfc1071[8] = {
    0x00, 0x01, 0xf2, 0x03, 0xf4, 0xf5, 0xf6, 0xf7};

/* One whole record; returns its size. */
static size_t write_record(uint8_t *out, const struct sender *from,
                           const struct sender *to, const void *payload,
                           size_t len)
{
    size_t n = pcap_write_record_head(out, a_ns, from, to, payload, len);
    memcpy(out + n, payload, len);
    return n + len;
}

#endif
