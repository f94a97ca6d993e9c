/* The capture's bytes: written, read back, read by libpcap, cut and spoilt. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <pcap.h>
#include <stdio.h>
#include <string.h>

#include "tests/unit/pcap_case.h"

static uint32_t be16(const uint8_t *b)
{
    return (uint32_t)b[0] << 8 | b[1];
}

/* --- writing ----------------------------------------------------------------
 */

START_TEST(the_file_head_is_that_of_a_nanosecond_raw_capture)
{
    static const uint8_t want[PCAP_FILE_HEAD_SIZE] = {
        0x4d, 0x3c, 0xb2, 0xa1, 2, 0, 4, 0, 0,   0, 0, 0,
        0,    0,    0,    0,    0, 0, 4, 0, 101, 0, 0, 0};
    uint8_t head[PCAP_FILE_HEAD_SIZE];
    struct pcap_form form;
    pcap_write_file_head(head);
    ck_assert_mem_eq(head, want, sizeof want);
    ck_assert(pcap_read_file_head(head, sizeof head, &form));
    ck_assert(!form.is_swapped && !form.is_micro);
    ck_assert_uint_eq(form.linktype, PCAP_LINKTYPE_RAW);
}
END_TEST

/* Header checksum by hand: 4500 + 0024 + 0000 + 4000 + 4011 + 0a00 + 0001 +
 * 0a00 + 0002 = d938, its complement is 26c7. */
START_TEST(an_ipv4_record_is_as_worked_by_hand)
{
    static const uint8_t want[44] = {
        0x00, 0xca, 0x9a, 0x3b, 0x15, 0xcd, 0x5b, 0x07, 36, 0, 0,
        0,    36,   0,    0,    0,    0x45, 0,    0,    36, 0, 0,
        0x40, 0,    64,   17,   0x26, 0xc7, 10,   0,    0,  1, 10,
        0,    0,    2,    0,    1,    0,    2,    0,    16, 0, 0};
    uint8_t record[RECORD_MAX];
    size_t n = write_record(record, &from_4, &to_4, rfc1071, 8);
    ck_assert_uint_eq(n, 52);
    ck_assert_mem_eq(record, want, sizeof want);
}
END_TEST

/* Words of ::1, ::1, length 16, protocol 17, ports 1 and 2, length 16 and the
 * payload: 1 + 1 + 10 + 11 + 1 + 2 + 10 + ddf2 = de28; complement 21d7. */
START_TEST(the_udp_checksum_of_ipv6_is_as_worked_by_hand)
{
    uint8_t record[RECORD_MAX];
    size_t n = write_record(record, &from_6, &to_6, rfc1071, 8);
    ck_assert_uint_eq(n, 72);
    ck_assert_uint_eq(record[16], 0x60);
    ck_assert_uint_eq(be16(record + 16 + 4), 16);
    ck_assert_uint_eq(be16(record + 56 + 6), 0x21d7);
}
END_TEST

/* With ffd5 the sum is ffff (1 + 1 + a + 11 + 1 + 2 + a = 2a): the checksum
 * would be 0, which means "none". */
START_TEST(a_udp_checksum_of_zero_is_written_as_ffff)
{
    static const uint8_t payload[2] = {0xff, 0xd5};
    uint8_t record[RECORD_MAX];
    write_record(record, &from_6, &to_6, payload, 2);
    ck_assert_uint_eq(be16(record + 56 + 6), 0xffff);
}
END_TEST

/* An odd last byte counts as a word with 0: aa and aa00 give the sum
 * 2c more by 3 lengths (1 + 1 = 2 less) and the same payload word. */
START_TEST(an_odd_payload_is_summed_with_a_zero_byte)
{
    static const uint8_t payload[2] = {0xaa, 0};
    uint8_t odd[RECORD_MAX], even[RECORD_MAX];
    write_record(odd, &from_6, &to_6, payload, 1);
    write_record(even, &from_6, &to_6, payload, 2);
    ck_assert_uint_eq(be16(odd + 56 + 6), be16(even + 56 + 6) + 2);
}
END_TEST

START_TEST(the_longest_datagram_is_written_and_one_byte_more_is_not)
{
    static uint8_t payload[65536], record[65536 + PCAP_RECORD_HEAD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_4, &to_4, payload, 65507);
    ck_assert_uint_eq(n, 44 + 65507);
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used),
                     PCAP_RECORD);
    ck_assert_uint_eq(r.len, 65507);
    n = write_record(record, &from_6, &to_6, payload, 65527);
    ck_assert_uint_eq(n, 64 + 65527);
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used),
                     PCAP_RECORD);
    ck_assert_uint_eq(r.len, 65527);
    ck_assert_uint_eq(
        pcap_write_record_head(record, a_ns, &from_4, &to_4, payload, 65508),
        0);
    ck_assert_uint_eq(
        pcap_write_record_head(record, a_ns, &from_6, &to_6, payload, 65528),
        0);
    ck_assert_uint_eq(
        pcap_write_record_head(record, a_ns, &from_4, &to_4, payload, SIZE_MAX),
        0);
}
END_TEST

START_TEST(stamps_outside_the_format_are_clamped)
{
    static const int64_t stamps[][2] = {
        {-1, 0},
        {INT64_MIN, 0},
        {4294967295999999999, 4294967295999999999},
        {4294967296000000000, 4294967295999999999},
        {INT64_MAX, 4294967295999999999},
    };
    for (size_t i = 0; i < sizeof stamps / sizeof *stamps; i++) {
        uint8_t record[RECORD_MAX];
        struct pcap_record r;
        size_t used;
        size_t n = pcap_write_record_head(record, stamps[i][0], &from_4, &to_4,
                                          rfc1071, 0);
        ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used),
                         PCAP_RECORD);
        ck_assert_int_eq(r.a_ns, stamps[i][1]);
    }
}
END_TEST

/* --- and back ---------------------------------------------------------------
 */

static void check_sender(const struct sender *a, const struct sender *b)
{
    ck_assert_uint_eq(a->family, b->family);
    ck_assert_uint_eq(a->port, b->port);
    ck_assert_mem_eq(a->address, b->address, 16);
}

START_TEST(a_datagram_comes_back_as_it_was)
{
    const struct sender *from = _i == 0 ? &from_4 : &from_6;
    const struct sender *to = _i == 0 ? &to_4 : &to_6;
    for (size_t len = 0; len <= 8; len++) {
        uint8_t record[RECORD_MAX];
        struct pcap_record r;
        size_t used = 0;
        size_t n = write_record(record, from, to, rfc1071, len);
        ck_assert_int_eq(
            pcap_read_record(&ours, record, sizeof record, &r, &used),
            PCAP_RECORD);
        ck_assert_uint_eq(used, n);
        ck_assert_int_eq(r.a_ns, a_ns);
        ck_assert_int_eq(r.control, CONTROL_NONE);
        check_sender(&r.from, from);
        check_sender(&r.to, to);
        ck_assert_uint_eq(r.len, len);
        ck_assert_ptr_eq(r.payload, record + n - len);
    }
}
END_TEST

START_TEST(our_address_of_another_family_is_left_unspecified)
{
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_6, &to_4, rfc1071, 8);
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used),
                     PCAP_RECORD);
    check_sender(&r.to, &(struct sender){6, {0}, 2});
}
END_TEST

/* The four ways in which a file may stand: byte order and unit of stamps. */
static void put_32(uint8_t *at, uint32_t v, bool is_big_endian)
{
    for (int i = 0; i < 4; i++)
        at[i] = (uint8_t)(v >> 8 * (is_big_endian ? 3 - i : i));
}

START_TEST(both_byte_orders_and_both_units_are_read)
{
    bool is_big = _i & 1, is_micro = _i & 2;
    uint8_t head[PCAP_FILE_HEAD_SIZE] = {0}, record[RECORD_MAX];
    struct pcap_form form;
    struct pcap_record r;
    size_t used;
    put_32(head, is_micro ? 0xa1b2c3d4 : 0xa1b23c4d, is_big);
    put_32(head + 20, 101, is_big);
    ck_assert(pcap_read_file_head(head, sizeof head, &form));
    ck_assert_int_eq(form.is_swapped, is_big);
    ck_assert_int_eq(form.is_micro, is_micro);
    ck_assert_uint_eq(form.linktype, 101);

    size_t n = write_record(record, &from_4, &to_4, rfc1071, 8);
    put_32(record, 1000000000, is_big);
    put_32(record + 4, is_micro ? 123456 : A_NS_PART, is_big);
    put_32(record + 8, (uint32_t)n - 16, is_big);
    put_32(record + 12, (uint32_t)n - 16, is_big);
    ck_assert_int_eq(pcap_read_record(&form, record, n, &r, &used),
                     PCAP_RECORD);
    ck_assert_int_eq(r.a_ns, is_micro ? a_ns - 789 : a_ns);
    ck_assert_uint_eq(used, n);
    put_32(record + 4, is_micro ? 1000000 : 1000000000, is_big);
    ck_assert_int_eq(pcap_read_record(&form, record, n, &r, &used), PCAP_TORN);
}
END_TEST

START_TEST(what_is_no_capture_is_refused)
{
    uint8_t head[PCAP_FILE_HEAD_SIZE];
    struct pcap_form form;
    pcap_write_file_head(head);
    for (size_t len = 0; len < sizeof head; len++)
        ck_assert(!pcap_read_file_head(head, len, &form));
    for (size_t i = 0; i < 4; i++) {
        pcap_write_file_head(head);
        head[i] ^= 1;
        ck_assert(!pcap_read_file_head(head, sizeof head, &form));
    }
}
END_TEST

/* Three records cut at every byte: what is whole is read, the rest is torn. */
START_TEST(a_tail_torn_at_any_byte_loses_only_the_record_it_is_in)
{
    uint8_t file[RECORD_MAX];
    size_t end[4] = {0};
    end[1] = write_record(file, &from_4, &to_4, rfc1071, 8);
    end[2] = end[1] + write_record(file + end[1], &from_6, &to_6, rfc1071, 5);
    end[3] = end[2] + pcap_write_control(file + end[2], RECORD_MAX - end[2],
                                         CONTROL_TIME, a_ns, 0, NULL);
    for (size_t len = 0; len <= end[3]; len++) {
        uint8_t cut[RECORD_MAX];
        memcpy(cut + RECORD_MAX - len, file, len);
        const uint8_t *at = cut + RECORD_MAX - len;
        size_t rest = len, used, n = 0;
        struct pcap_record r;
        while (pcap_read_record(&ours, at, rest, &r, &used) == PCAP_RECORD) {
            at += used;
            rest -= used;
            n++;
        }
        size_t want = 0;
        while (want < 3 && end[want + 1] <= len)
            want++;
        ck_assert_uint_eq(n, want);
        ck_assert_uint_eq(rest, len - end[want]);
    }
}
END_TEST

START_TEST(a_tail_of_zeros_is_torn_not_a_row_of_records)
{
    static const uint8_t zeros[4096];
    struct pcap_record r;
    size_t used;
    ck_assert_int_eq(pcap_read_record(&ours, zeros, sizeof zeros, &r, &used),
                     PCAP_TORN);
}
END_TEST

/* --- what others send -------------------------------------------------------
 */

/* One byte of a good record changed; the record is whole, but none of ours,
 * or its numbers make no sense. */
static const struct {
    const char *what;
    bool is_6;
    int at;
    uint8_t value;
    enum pcap_result want;
} changes[] = {
    {"the same byte", false, 16, 0x45, PCAP_RECORD},
    {"IP version 5", false, 16, 0x55, PCAP_SKIP},
    {"a header of 4 words", false, 16, 0x44, PCAP_SKIP},
    {"a header longer than the packet", false, 16, 0x4f, PCAP_SKIP},
    {"a total beyond the record", false, 19, 37, PCAP_SKIP},
    {"a total that cuts UDP", false, 19, 35, PCAP_SKIP},
    {"a total below the header", false, 19, 19, PCAP_SKIP},
    {"a total of 0", false, 19, 0, PCAP_SKIP},
    {"more fragments", false, 22, 0x20, PCAP_SKIP},
    {"a fragment's offset", false, 23, 1, PCAP_SKIP},
    {"neither flag", false, 22, 0, PCAP_RECORD},
    {"TCP", false, 25, 6, PCAP_SKIP},
    {"a wrong header checksum", false, 26, 0, PCAP_RECORD},
    {"UDP length beyond the packet", false, 41, 17, PCAP_SKIP},
    {"UDP length below its header", false, 41, 7, PCAP_SKIP},
    {"UDP length shorter", false, 41, 9, PCAP_RECORD},
    {"longer on the wire", false, 12, 37, PCAP_SKIP},
    {"shorter on the wire", false, 12, 35, PCAP_TORN},
    {"longer than the file", false, 8, 37, PCAP_TORN},
    {"huge", false, 11, 0x80, PCAP_TORN},
    {"empty", false, 8, 0, PCAP_TORN},
    {"IPv6 as it was", true, 16, 0x60, PCAP_RECORD},
    {"IPv6 beyond the record", true, 21, 17, PCAP_SKIP},
    {"IPv6 that cuts UDP", true, 21, 15, PCAP_SKIP},
    {"IPv6 fragment", true, 22, 44, PCAP_SKIP},
    {"IPv6 ICMP", true, 22, 58, PCAP_SKIP},
    {"IPv6 options that are not there", true, 22, 60, PCAP_SKIP},
};

START_TEST(what_is_no_datagram_of_ours_is_skipped)
{
    uint8_t record[RECORD_MAX];
    bool is_6 = changes[_i].is_6;
    struct pcap_record r;
    size_t used = 0;
    size_t n = write_record(record, is_6 ? &from_6 : &from_4,
                            is_6 ? &to_6 : &to_4, rfc1071, 8);
    record[changes[_i].at] = changes[_i].value;
    ck_assert_msg(pcap_read_record(&ours, record, n, &r, &used) ==
                      changes[_i].want,
                  "%s", changes[_i].what);
    if (changes[_i].want != PCAP_TORN)
        ck_assert_uint_eq(used, n);
}
END_TEST

/* Lengths that lead out of their header, with bytes there that would pass. */
START_TEST(lengths_inside_headers_are_not_believed)
{
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_4, &to_4, rfc1071, 8);
    record[16] = 0x40; /* a header of no words ...                        */
    record[21] = 16;   /* ... where a UDP length would stand              */
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used), PCAP_SKIP);
    n = write_record(record, &from_6, &to_6, rfc1071, 8);
    record[22] = 60; /* options of 8 * 255 + 8 bytes, then UDP            */
    record[56] = 17;
    record[57] = 255;
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used), PCAP_SKIP);
}
END_TEST

START_TEST(options_before_udp_are_stepped_over)
{
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_6, &to_6, rfc1071, 8);
    memmove(record + 56 + 24, record + 56, n - 56);
    memset(record + 56, 0, 24);
    n += 24;
    record[8] = record[12] = (uint8_t)(n - 16);
    record[21] = 16 + 24;
    record[22] = 0;      /* hop-by-hop, 8 bytes                          */
    record[56] = 60;     /* then destination options, 16 bytes           */
    record[56 + 8] = 17; /* then UDP                                     */
    record[56 + 9] = 1;
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used),
                     PCAP_RECORD);
    ck_assert_uint_eq(r.len, 8);
    ck_assert_mem_eq(r.payload, rfc1071, 8);
    record[56] = 44; /* a fragment                                        */
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used), PCAP_SKIP);
}
END_TEST

START_TEST(padding_after_the_packet_is_no_payload)
{
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_4, &to_4, rfc1071, 1);
    memset(record + n, 0xee, 17);
    record[8] = record[12] = (uint8_t)(n - 16 + 17);
    ck_assert_int_eq(pcap_read_record(&ours, record, n + 17, &r, &used),
                     PCAP_RECORD);
    ck_assert_uint_eq(used, n + 17);
    ck_assert_uint_eq(r.len, 1);
}
END_TEST

START_TEST(another_link_type_is_skipped_whole)
{
    const struct pcap_form ethernet = {.linktype = 1};
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n = write_record(record, &from_4, &to_4, rfc1071, 8);
    ck_assert_int_eq(pcap_read_record(&ethernet, record, n, &r, &used),
                     PCAP_SKIP);
    ck_assert_uint_eq(used, n);
}
END_TEST

/* --- another reader ---------------------------------------------------------
 */

static void check_packet(pcap_t *p, const uint8_t *record, size_t n)
{
    struct pcap_pkthdr *head;
    const u_char *packet;
    ck_assert_int_eq(pcap_next_ex(p, &head, &packet), 1);
    ck_assert_int_eq(head->ts.tv_sec, 1000000000);
    ck_assert_int_eq(head->ts.tv_usec, A_NS_PART); /* ns were asked for   */
    ck_assert_uint_eq(head->caplen, n - 16);
    ck_assert_uint_eq(head->len, n - 16);
    ck_assert_mem_eq(packet, record + 16, n - 16);
}

START_TEST(libpcap_reads_what_we_write)
{
    uint8_t head[PCAP_FILE_HEAD_SIZE], record[3][RECORD_MAX];
    char reason[PCAP_ERRBUF_SIZE];
    size_t n[3] = {
        write_record(record[0], &from_4, &to_4, rfc1071, 8),
        write_record(record[1], &from_6, &to_6, rfc1071, 5),
        pcap_write_control(record[2], RECORD_MAX, CONTROL_STOP, a_ns, 0, ""),
    };
    FILE *file = tmpfile();
    ck_assert_ptr_nonnull(file);
    pcap_write_file_head(head);
    fwrite(head, 1, sizeof head, file);
    for (int i = 0; i < 3; i++)
        fwrite(record[i], 1, n[i], file);
    rewind(file);

    pcap_t *p = pcap_fopen_offline_with_tstamp_precision(
        file, PCAP_TSTAMP_PRECISION_NANO, reason);
    ck_assert_msg(p != NULL, "%s", reason);
    ck_assert_int_eq(pcap_datalink(p), DLT_RAW);
    ck_assert_int_eq(pcap_is_swapped(p), 0);
    for (int i = 0; i < 3; i++)
        check_packet(p, record[i], n[i]);
    struct pcap_pkthdr *last;
    const u_char *packet;
    ck_assert_int_eq(pcap_next_ex(p, &last, &packet), PCAP_ERROR_BREAK);
    pcap_close(p);
}
END_TEST

#define COUNT(a) (int)(sizeof(a) / sizeof *(a))

static void add_writing(TCase *t)
{
    tcase_add_test(t, the_file_head_is_that_of_a_nanosecond_raw_capture);
    tcase_add_test(t, an_ipv4_record_is_as_worked_by_hand);
    tcase_add_test(t, the_udp_checksum_of_ipv6_is_as_worked_by_hand);
    tcase_add_test(t, a_udp_checksum_of_zero_is_written_as_ffff);
    tcase_add_test(t, an_odd_payload_is_summed_with_a_zero_byte);
    tcase_add_test(t, the_longest_datagram_is_written_and_one_byte_more_is_not);
    tcase_add_test(t, stamps_outside_the_format_are_clamped);
}

Suite *suite(void)
{
    Suite *s = suite_create("pcap");
    TCase *t = tcase_create("pcap");
    add_writing(t);
    tcase_add_loop_test(t, a_datagram_comes_back_as_it_was, 0, 2);
    tcase_add_test(t, our_address_of_another_family_is_left_unspecified);
    tcase_add_loop_test(t, both_byte_orders_and_both_units_are_read, 0, 4);
    tcase_add_test(t, what_is_no_capture_is_refused);
    tcase_add_test(t, a_tail_torn_at_any_byte_loses_only_the_record_it_is_in);
    tcase_add_test(t, a_tail_of_zeros_is_torn_not_a_row_of_records);
    tcase_add_loop_test(t, what_is_no_datagram_of_ours_is_skipped, 0,
                        COUNT(changes));
    tcase_add_test(t, lengths_inside_headers_are_not_believed);
    tcase_add_test(t, options_before_udp_are_stepped_over);
    tcase_add_test(t, padding_after_the_packet_is_no_payload);
    tcase_add_test(t, another_link_type_is_skipped_whole);
    tcase_add_test(t, libpcap_reads_what_we_write);
    suite_add_tcase(s, t);
    return s;
}
