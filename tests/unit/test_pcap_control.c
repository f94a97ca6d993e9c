/* Control records: what a replay must know beside datagrams. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "tests/unit/pcap_case.h"

/* --- control records --------------------------------------------------------
 */

static void read_control(const uint8_t *record, size_t n, struct pcap_record *r)
{
    size_t used;
    ck_assert_uint_gt(n, 0);
    ck_assert_int_eq(pcap_read_record(&ours, record, n, r, &used), PCAP_RECORD);
    ck_assert_uint_eq(used, n);
}

static void check_text(const struct text *text, const char *want)
{
    ck_assert_int_eq(text->len, (int)strlen(want));
    ck_assert_mem_eq(text->at, want, strlen(want));
}

START_TEST(a_start_record_is_as_stated)
{
    static const char want[] =
        "{\"ropewalk\":\"start\",\"line\":\"1000000000123456789\","
        "\"engine\":\"1\",\"build\":\"0.1.0+a b\",\"rig\":\"00ff\"}";
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t n = pcap_write_control(record, sizeof record, CONTROL_START, a_ns, 1,
                                  "0.1.0+a b 00ff");
    ck_assert_uint_eq(n, 44 + strlen(want));
    ck_assert_mem_eq(record + 44, want, strlen(want));
    read_control(record, n, &r);
    ck_assert_int_eq(r.control, CONTROL_START);
    ck_assert_int_eq(r.line_ns, a_ns);
    ck_assert_uint_eq(r.n, 1);
    check_text(&r.build, "0.1.0+a b");
    check_text(&r.rig, "00ff");
}
END_TEST

START_TEST(a_drops_record_is_as_stated)
{
    static const char want[] = "{\"ropewalk\":\"drops\",\"line\":\"-5\","
                               "\"n\":\"18446744073709551615\","
                               "\"text\":\"a \\\"b\\\" \\\\\"}";
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t n = pcap_write_control(record, sizeof record, CONTROL_DROPS, -5,
                                  UINT64_MAX, "a \"b\" \\");
    ck_assert_uint_eq(n, 44 + strlen(want));
    ck_assert_mem_eq(record + 44, want, strlen(want));
    read_control(record, n, &r);
    ck_assert_int_eq(r.line_ns, -5);
    ck_assert_uint_eq(r.n, UINT64_MAX);
    check_text(&r.text, "a \\\"b\\\" \\\\");
}
END_TEST

START_TEST(every_kind_of_control_record_comes_back)
{
    static const int64_t lines[] = {0, INT64_MAX, INT64_MIN, a_ns};
    for (int kind = CONTROL_START; kind <= CONTROL_STOP; kind++) {
        uint8_t record[RECORD_MAX];
        struct pcap_record r;
        int64_t line_ns = lines[kind % 4];
        size_t n = pcap_write_control(
            record, sizeof record, (enum control_kind)kind, line_ns, 7, NULL);
        read_control(record, n, &r);
        ck_assert_int_eq(r.control, kind);
        ck_assert_int_eq(r.line_ns, line_ns);
        ck_assert_uint_eq(r.n, 7);
        for (size_t size = 0; size < n; size++)
            ck_assert_uint_eq(pcap_write_control(record, size,
                                                 (enum control_kind)kind,
                                                 line_ns, 7, NULL),
                              0);
    }
}
END_TEST

/* Bodies from 0.0.0.0:0 that are not quite control records. */
static const char *const bodies[] = {
    "",
    "{}",
    "{\"ropewalk\":\"begin\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\"}",
    "{\"ropewalk\":\"\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"\",\"n\":\"0\",\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\"",
    "{\"ropewalk\":\"stop\",\"line\":\"1\",\"n\":\"0\",\"text\":\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\\",
    "{\"ropewalk\":\"stop\",\"line\":\"1x\",\"n\":\"0\",\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"9223372036854775808\",\"n\":\"0\","
    "\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"-9223372036854775809\",\"n\":\"0\","
    "\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"1\",\"n\":\"18446744073709551616\","
    "\"text\":\"\"}",
    "{\"ropewalk\":\"stop\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\"} ",
    "{\"ropewalk\":\"start\",\"line\":\"1\",\"n\":\"0\",\"text\":\"\"}",
};

START_TEST(a_control_record_that_is_not_ours_is_skipped)
{
    static const struct sender nobody = {.family = 4};
    uint8_t record[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    const char *body = bodies[_i];
    size_t n = write_record(record, &nobody, &nobody, body, strlen(body));
    ck_assert_int_eq(pcap_read_record(&ours, record, n, &r, &used), PCAP_SKIP);
    ck_assert_uint_eq(used, n);
}
END_TEST

START_TEST(a_datagram_that_looks_like_a_control_record_is_none)
{
    uint8_t record[RECORD_MAX], other[RECORD_MAX];
    struct pcap_record r;
    size_t used;
    size_t n =
        pcap_write_control(record, sizeof record, CONTROL_STOP, a_ns, 0, NULL);
    n = write_record(other, &from_4, &to_4, record + 44, n - 44);
    ck_assert_int_eq(pcap_read_record(&ours, other, n, &r, &used), PCAP_RECORD);
    ck_assert_int_eq(r.control, CONTROL_NONE);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("pcap_control");
    TCase *t = tcase_create("pcap_control");
    tcase_add_test(t, a_start_record_is_as_stated);
    tcase_add_test(t, a_drops_record_is_as_stated);
    tcase_add_test(t, every_kind_of_control_record_comes_back);
    tcase_add_loop_test(t, a_control_record_that_is_not_ours_is_skipped, 0,
                        sizeof bodies / sizeof *bodies);
    tcase_add_test(t, a_datagram_that_looks_like_a_control_record_is_none);
    suite_add_tcase(s, t);
    return s;
}
