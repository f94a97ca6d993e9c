/* Datagrams to measurements: every rule of wire 1, in both encodings. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <msgpack.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "core/wire/decode.h"
#include "tests/suite.h"

static struct wire_decoder d;

/* In a block of its own size, so that a read past the end is seen; it stays
 * until the next call because the result points into it. */
static enum datagram_outcome json(const char *text)
{
    static char *exact;
    size_t len = strlen(text);
    free(exact);
    exact = malloc(len > 0 ? len : 1);
    memcpy(exact, text, len);
    return wire_decode(&d, (uint8_t *)exact, len);
}

static void refused(const char *text, const char *reason)
{
    ck_assert_int_ne(json(text), DATAGRAM_DECODED);
    ck_assert_msg(d.reason && strstr(d.reason, reason), "%s: %s", text,
                  d.reason ? d.reason : "no reason");
}

/* --- time
 * ---------------------------------------------------------------------- */

static int64_t time_of(const char *value)
{
    char text[200];
    snprintf(text, sizeof text, "{\"sensor\":\"a\",\"z\":1,%s}", value);
    ck_assert_msg(json(text) == DATAGRAM_DECODED, "%s: %s", text, d.reason);
    ck_assert(d.element[0].has_t);
    return d.element[0].t_ns;
}

START_TEST(stamps_are_exact_to_the_nanosecond)
{
    ck_assert_int_eq(time_of("\"ns\":1764563999123456789"),
                     1764563999123456789);
    ck_assert_int_eq(time_of("\"ns\":\"1764563999123456789\""),
                     1764563999123456789);
    ck_assert_int_eq(time_of("\"ns\":9223372036854775807"), INT64_MAX);
    ck_assert_int_eq(time_of("\"ns\":\"-5\""), -5);
    ck_assert_int_eq(time_of("\"t\":1700000000"), 1700000000000000000);
    ck_assert_int_eq(time_of("\"t\":1700000000.25"), 1700000000250000000);
    /* examples of RFC 3339, 5.8 */
    ck_assert_int_eq(time_of("\"t\":\"1985-04-12T23:20:50.52Z\""),
                     482196050520000000);
    ck_assert_int_eq(time_of("\"t\":\"1996-12-19T16:39:57-08:00\""),
                     851042397000000000);
    ck_assert_int_eq(time_of("\"t\":\"1990-12-31T23:59:60Z\""),
                     662688000000000000);
    ck_assert_int_eq(time_of("\"t\":\"2000-02-29T00:00:00.000000001Z\""),
                     951782400000000001);
}
END_TEST

/* A number of seconds means the nearest ns to its double. */
START_TEST(a_number_of_seconds_rounds_to_the_nearest_nanosecond)
{
    struct random r;
    random_init(&r, 7, 0);
    for (int i = 0; i < 20000; i++) {
        double t = 1.6e9 + 2e8 * random_uniform(&r);
        char value[60];
        snprintf(value, sizeof value, "\"t\":%.17g", t);
        /* t = m 2^-22 exactly: the exact answer in 128-bit integers */
        __extension__ __int128 ns = (__int128)(int64_t)ldexp(t, 22);
        ns = (ns * 1000000000 + (1 << 21)) >> 22;
        ck_assert_int_eq(time_of(value), (int64_t)ns);
    }
}
END_TEST

START_TEST(seconds_near_a_tie_and_before_1970_round_to_the_nearest)
{
    /* n + 1/2 ns less one bit, and the tie itself: 2^-10 s = 976562.5 ns */
    ck_assert_int_eq(time_of("\"t\":0.0009765625"), 976563);
    ck_assert_int_eq(time_of("\"t\":0.00097656249999999989"), 976562);
    ck_assert_int_eq(time_of("\"t\":-1.5"), -1500000000);
    ck_assert_int_eq(time_of("\"t\":-3.25e-9"), -3);
    ck_assert_int_eq(time_of("\"t\":4.9999999999999994e-10"), 0);
    ck_assert_int_eq(time_of("\"t\":5e-324"), 0);
    ck_assert_int_eq(time_of("\"t\":0"), 0);
    ck_assert_int_eq(time_of("\"t\":9.1e9"), 9100000000000000000);
}
END_TEST

START_TEST(the_years_that_nanoseconds_hold_are_the_years_that_are_taken)
{
    /* days from 1970-01-01 by proleptic Gregorian count */
    ck_assert_int_eq(time_of("\"t\":\"1678-01-01T00:00:00Z\""),
                     -(int64_t)106650 * 86400 * 1000000000);
    ck_assert_int_eq(time_of("\"t\":\"2261-12-31T23:59:59.999999999+00:00\""),
                     (int64_t)106651 * 86400 * 1000000000 - 1);
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"1677-12-31T23:59:59Z\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"2262-01-01T00:00:00Z\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"2100-02-29T00:00:00Z\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"ns\":9223372036854775808}",
            "integer of nanoseconds");
    refused("{\"sensor\":\"a\",\"z\":1,\"ns\":\"9223372036854775808\"}",
            "integer of nanoseconds");
}
END_TEST

START_TEST(wrong_stamps_are_refused_with_the_remedy)
{
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":1700000000123}", "milliseconds");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":1700000000123456}",
            "micro- or nanoseconds");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"yesterday\"}", "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"2023-02-29T00:00:00Z\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"2023-02-28T00:00:00.1234567891Z"
            "\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":\"2023-02-28T00:00:00\"}",
            "RFC 3339");
    refused("{\"sensor\":\"a\",\"z\":1,\"t\":1,\"ns\":1}", "both t and ns");
    refused("{\"sensor\":\"a\",\"z\":1,\"ns\":1.5}", "integer of nanoseconds");
}
END_TEST

/* --- readings and marks
 * ----------------------------------------------------------- */

START_TEST(null_and_nan_are_no_reading_and_never_zero)
{
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":null}"), DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 0);
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":[1,null,-0.0]}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 3);
    ck_assert(isnan(d.element[0].z[1]));
    ck_assert(d.element[0].z[2] == 0 && signbit(d.element[0].z[2]));
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":-0}"), DATAGRAM_DECODED);
    ck_assert(d.element[0].z[0] == 0 && signbit(d.element[0].z[0]));
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":[1,2,3,4,5,6,7,8,9,10,11]}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 11);
    refused("{\"sensor\":\"a\",\"z\":[]}", "empty list");
    refused("{\"sensor\":\"a\",\"z\":\"1\"}", "z is neither");
    refused("{\"sensor\":\"a\",\"z\":[[1]]}", "z is neither");
    refused("{\"sensor\":\"a\",\"z\":nan}", "null");
    refused("{\"sensor\":\"a\",\"z\":1e999}", "too large");
    refused("{\"sensor\":\"a\"}", "no `z`");
}
END_TEST

START_TEST(marks_need_neither_sensor_nor_reading)
{
    ck_assert_int_eq(json("{\"mark\":\"note\",\"name\":\"run 7\",\"text\":"
                          "\"caf\\u00e9 \\ud83d\\ude00\\n\"}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].mark, MARK_NOTE);
    ck_assert_int_eq(d.element[0].note.len, 11);
    ck_assert_int_eq(
        memcmp(d.element[0].note.at, "caf\xc3\xa9 \xf0\x9f\x98\x80\n", 11), 0);
    refused("{\"mark\":\"begin\"}", "start, stop, zero, note");
    refused("{\"mark\":\"note\",\"text\":\"\\ud83d\"}", "surrogate");
    refused("{\"mark\":\"note\",\"text\":\"\\udc00\\udc00\"}", "surrogate");
}
END_TEST

START_TEST(one_bad_element_does_not_spoil_the_others)
{
    ck_assert_int_eq(json("[{\"sensor\":\"a\",\"z\":1},{\"z\":1},7,"
                          "{\"sensor\":\"b\",\"z\":2,\"v\":2},"
                          "{\"sensor\":\"c\",\"z\":3,\"v\":1}]"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.n, 2);
    ck_assert_int_eq(d.n_bad, 3);
    ck_assert(strstr(d.reason, "no `sensor`") != NULL);
    ck_assert_int_eq(d.element[1].sensor.at[0], 'c');
    /* broken syntax spoils the whole */
    refused("[{\"sensor\":\"a\",\"z\":1},{\"sensor\":\"b\",\"z\":2",
            "no comma");
    ck_assert_int_eq(d.n, 0);
}
END_TEST

START_TEST(the_place_of_a_reason_is_told)
{
    ck_assert_int_eq(json("[{\"sensor\":\"a\",\"z\":1},{\"sensor\":\"b\","
                          "\"z\":true},{\"seq\":-1}]"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.n_bad, 2);
    ck_assert_int_eq(d.at, 36); /* the key "z" of the second */
    ck_assert(strstr(d.reason, "z is neither") != NULL);
    refused("{\"sensor\":\"a\" \"z\":1}", "no comma");
    ck_assert_int_eq(d.at, 14);
}
END_TEST

START_TEST(more_than_1024_elements_are_counted_as_bad)
{
    static char text[40000];
    size_t used = 0;
    for (int i = 0; i < 1030; i++)
        used += (size_t)snprintf(text + used, sizeof text - used,
                                 "%c{\"sensor\":\"a\",\"z\":%d}",
                                 i == 0 ? '[' : ',', i);
    snprintf(text + used, sizeof text - used, "]");
    ck_assert_int_eq(json(text), DATAGRAM_DECODED);
    ck_assert_int_eq(d.n, 1024);
    ck_assert_int_eq(d.n_bad, 6);
    ck_assert_double_eq(d.element[1023].z[0], 1023);
    ck_assert(strstr(d.reason, "more than 1024") != NULL);
}
END_TEST

START_TEST(components_are_counted_to_255_and_the_rest_is_ignored)
{
    char text[1200] = "{\"sensor\":\"a\",\"z\":[0";
    size_t used = strlen(text);
    for (int i = 1; i < 300; i++)
        used +=
            (size_t)snprintf(text + used, sizeof text - used, ",%d", i % 10);
    snprintf(text + used, sizeof text - used, "]}");
    ck_assert_int_eq(json(text), DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 255);
    ck_assert_double_eq(d.element[0].z[READS_MAX - 1], READS_MAX - 1);
}
END_TEST

/* Whatever an unknown key holds, it costs nothing that known ones need. */
START_TEST(long_escaped_text_of_an_unknown_key_is_ignored)
{
    static char text[20000];
    size_t used = (size_t)snprintf(text, sizeof text, "{\"x\":[\"");
    for (int i = 0; i < 2500; i++)
        used += (size_t)snprintf(text + used, sizeof text - used, "\\u00e9");
    snprintf(text + used, sizeof text - used,
             "\"],\"sensor\":\"\\u0061\",\"z\":1}");
    ck_assert_msg(json(text) == DATAGRAM_DECODED, "%s", d.reason);
    ck_assert_int_eq(d.element[0].sensor.at[0], 'a');
    refused("{\"x\":[\"\\ud83d\"],\"sensor\":\"a\",\"z\":1}", "surrogate");
    refused("{\"x\":[\"\xc0\xaf\"],\"sensor\":\"a\",\"z\":1}", "UTF-8");
}
END_TEST

START_TEST(uncertainties_and_sequence_numbers_are_taken)
{
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":[1,2],\"u\":[0.1,2e-1],"
                          "\"seq\":18446744073709551615,\"cov\":[1,0,0,1]}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_u, 2);
    ck_assert_double_eq(d.element[0].u[1], 0.2);
    ck_assert(d.element[0].has_cov && d.element[0].has_seq);
    ck_assert(d.element[0].seq == UINT64_MAX);
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":1,\"u\":null,\"cov\":null,"
                          "\"t\":null}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_u, 0);
    ck_assert(!d.element[0].has_cov && !d.element[0].has_t);
    refused("{\"sensor\":\"a\",\"z\":1,\"u\":\"0.1\"}", "u is neither");
    refused("{\"sensor\":\"a\",\"z\":1,\"seq\":1.5}", "seq is no counter");
    refused("{\"sensor\":\"a\",\"z\":1,\"seq\":18446744073709551616}",
            "seq is no counter");
}
END_TEST

START_TEST(malformed_datagrams_say_why)
{
    refused("", "empty");
    refused("\n", "empty");
    refused("hello", "neither JSON nor MessagePack");
    refused("{\"sensor\":\"a\",\"z\":1} {\"sensor\":\"a\",\"z\":1}", "behind");
    refused("{\"sensor\":\"a\",\"sensor\":\"a\",\"z\":1}", "twice");
    refused("{\"sensor\":\"-a\",\"z\":1}", "sensor is no id");
    refused("{\"sensor\":\"a b\",\"z\":1}", "sensor is no id");
    refused("{\"sensor\":\"a\",\"track\":\"\",\"z\":1}", "track is no id");
    refused("{\"sensor\":\"a\",\"z\":01}", "JSON does not know");
    refused("{\"sensor\":\"a\",\"z\":1,}", "key is no string");
    refused("{\"sensor\":\"a\",\"z\":1,\"x\":\"\xff\"}", "UTF-8");
    refused("{\"sensor\":\"a\",\"z\":1,\"x\":[[[[[[[[[1]]]]]]]]]}",
            "deeper than 8");
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":1,\"x\":[[[[[[[1]]]]]]]}"),
                     DATAGRAM_DECODED);
    refused("[{\"sensor\":\"a\",\"z\":1,\"x\":[[[[[[[1]]]]]]]}]",
            "deeper than 8");
    refused("{\"sensor\":\"a\",\"z\":1,\"seq\":-1}", "seq is no counter");
    refused("{\"sensor\":\"a\",\"samples\":[[1]]}", "not built yet");
    refused("{\"sensor\":\"a\",\"z\":1,\"tick\":5}", "not built yet");
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":1,\"v\":2}"),
                     DATAGRAM_WRONG_VERSION);
    ck_assert_int_eq(json(" {\"sensor\":\"a\",\"z\":1}\r\n"), DATAGRAM_DECODED);
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":1,\"zz\":{\"k\":[1,{}]}}"),
                     DATAGRAM_DECODED);
}
END_TEST

/* --- MessagePack
 * ------------------------------------------------------------------- */

START_TEST(lengths_that_claim_gigabytes_reserve_nothing)
{
    static const uint8_t claims[][10] = {
        {0x9c, 0x1f, 0x21, 0xdd, 0x63, 0x61, 0x6d, 0x21, 0x74, 0x2f},
        {0xdd, 0xff, 0xff, 0xff, 0xff, 0x80, 0, 0, 0, 0},
        {0xdf, 0xff, 0xff, 0xff, 0xff, 0xa1, 'z', 1, 0, 0},
        {0x81, 0xa1, 'z', 0xdb, 0xff, 0xff, 0xff, 0xff, 1, 2},
        {0x81, 0xa1, 'z', 0xc9, 0xff, 0xff, 0xff, 0xff, 1, 2}};
    for (size_t i = 0; i < sizeof claims / sizeof *claims; i++) {
        ck_assert_int_eq(wire_decode(&d, claims[i], 10), DATAGRAM_MALFORMED);
        ck_assert_msg(strstr(d.reason, "ends in the middle"), "%d: %s", (int)i,
                      d.reason);
    }
}
END_TEST

static void key(msgpack_packer *p, const char *text)
{
    msgpack_pack_str_with_body(p, text, strlen(text));
}

START_TEST(timestamps_of_all_three_sizes_are_taken)
{
    static const struct {
        size_t n;
        uint8_t bytes[12];
        int64_t t_ns;
    } rows[] = {{4, {0x65, 0x53, 0xf1, 0x00}, 1700000000000000000},
                {8,
                 {0x3b, 0x9a, 0xc9, 0xfc, 0x65, 0x53, 0xf1, 0x00},
                 1700000000249999999},
                {12,
                 {0x0e, 0xe6, 0xb2, 0x80, 0, 0, 0, 0, 0x65, 0x53, 0xf1, 0x00},
                 1700000000250000000}};
    for (int i = 0; i < 3; i++) {
        msgpack_sbuffer buf;
        msgpack_packer p;
        msgpack_sbuffer_init(&buf);
        msgpack_packer_init(&p, &buf, msgpack_sbuffer_write);
        msgpack_pack_map(&p, 3);
        key(&p, "sensor");
        key(&p, "a");
        key(&p, "z");
        msgpack_pack_double(&p, (double)NAN);
        key(&p, "t");
        msgpack_pack_ext(&p, rows[i].n, -1);
        msgpack_pack_ext_body(&p, rows[i].bytes, rows[i].n);
        ck_assert_int_eq(wire_decode(&d, (uint8_t *)buf.data, buf.size),
                         DATAGRAM_DECODED);
        ck_assert_int_eq(d.element[0].t_ns, rows[i].t_ns);
        ck_assert(d.element[0].has_t);
        ck_assert(isnan(d.element[0].z[0]));
        msgpack_sbuffer_destroy(&buf);
    }
}
END_TEST

static enum datagram_outcome packed(const char *bytes, size_t len)
{
    return wire_decode(&d, (const uint8_t *)bytes, len);
}
#define PACKED(bytes) packed(bytes, sizeof bytes - 1)

START_TEST(depth_bytes_behind_the_end_and_wrong_versions_in_messagepack)
{
    /* {"x": [[[[[[[1]]]]]]], "mark": "stop"}: eight levels, then nine */
    ck_assert_int_eq(PACKED("\x82\xa1x\x91\x91\x91\x91\x91\x91\x91\x01"
                            "\xa4mark\xa4stop"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(PACKED("\x82\xa1x\x91\x91\x91\x91\x91\x91\x91\x91\x01"
                            "\xa4mark\xa4stop"),
                     DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "deeper than 8") != NULL);
    ck_assert_int_eq(PACKED("\x81\xa4mark\xa4stop\n\0\0"), DATAGRAM_DECODED);
    ck_assert_int_eq(PACKED("\x81\xa4mark\xa4stop\x80"), DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "behind the end") != NULL);
    ck_assert_int_eq(d.at, 11);
    ck_assert_int_eq(PACKED("\x82\xa4mark\xa4stop\xa1v\x02"),
                     DATAGRAM_WRONG_VERSION);
    ck_assert_int_eq(PACKED("\x94\x81\xa4mark\xa4stop\x07\x80\x91\x81\x01\x02"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.n, 1);
    ck_assert_int_eq(d.n_bad, 3);
    ck_assert_int_eq(PACKED("\x82\x91\x01\x01\xa4mark\xa4stop"),
                     DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "key of a map") != NULL);
    ck_assert_int_eq(PACKED("\x81\xa1x\xc1"), DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "never uses") != NULL);
    ck_assert_int_eq(PACKED("\x81\xa1x\xa1\xff"), DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "UTF-8") != NULL);
    ck_assert_int_eq(PACKED("\x90"), DATAGRAM_MALFORMED);
    ck_assert_int_eq(PACKED("\xc0"), DATAGRAM_MALFORMED);
}
END_TEST

START_TEST(every_width_of_messagepack_is_read)
{
    /* int8 -3, int16 -300, int32 -70000, int64 -2^40; array32 in map16 */
    ck_assert_int_eq(
        PACKED("\xde\0\3\xa6sensor\xa1"
               "a\xa1z\xdd\0\0\0\4\xd0\xfd\xd1\xfe\xd4\xd2\xff\xfe\xee"
               "\x90\xd3\xff\xff\xff\0\0\0\0\0\x05\x01"),
        DATAGRAM_DECODED);
    static const double z[] = {-3, -300, -70000, -1099511627776.0};
    ck_assert_int_eq(d.element[0].n_z, 4);
    for (int i = 0; i < 4; i++)
        ck_assert_double_eq(d.element[0].z[i], z[i]);
    ck_assert_int_eq(PACKED("\xdc\0\1\xdf\0\0\0\1\xa4mark\xd9\4stop"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(PACKED("\x82\xa6sensor\xa1"
                            "a\xa1z\x92\xa1x\x01"),
                     DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "z is neither") != NULL);
}
END_TEST

START_TEST(every_cut_of_a_datagram_is_malformed)
{
    static const char whole[] = "\x84\xa6sensor\xa1"
                                "a\xa1z\x92\xcb\x3f\xf0\0\0\0\0\0\0\xc0\xa1t"
                                "\xc7\x0c\xff\0\0\0\5\0\0\0\0\x65\x53\xf1\1"
                                "\xa3seq\xcd\x12\x34";
    ck_assert_int_eq(PACKED(whole), DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].t_ns, 1700000001000000005);
    for (size_t len = 0; len < sizeof whole - 1; len++) {
        ck_assert_int_eq(packed(whole, len), DATAGRAM_MALFORMED);
        ck_assert_int_eq(d.n, 0);
    }
}
END_TEST

START_TEST(infinite_readings_are_passed_on_and_infinite_times_are_not)
{
    ck_assert_int_eq(PACKED("\x82\xa6sensor\xa1"
                            "a\xa1z\xcb\x7f\xf0\0\0\0\0\0\0"),
                     DATAGRAM_DECODED);
    ck_assert(isinf(d.element[0].z[0]));
    ck_assert_int_eq(PACKED("\x83\xa6sensor\xa1"
                            "a\xa1z\x01\xa1t\xcb\x7f\xf8\0\0\0\0\0\0"),
                     DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "NaN or infinite") != NULL);
}
END_TEST

START_TEST(a_32_bit_float_is_no_time)
{
    static const uint8_t bytes[] = {0x83, 0xa6, 's',  'e',  'n',  's', 'o',
                                    'r',  0xa1, 'a',  0xa1, 'z',  1,   0xa1,
                                    't',  0xca, 0x4e, 0xca, 0xa9, 0x00};
    ck_assert_int_eq(wire_decode(&d, bytes, sizeof bytes), DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "32-bit float") != NULL);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("decode");
    TCase *t = tcase_create("decode");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, stamps_are_exact_to_the_nanosecond);
    tcase_add_test(t, a_number_of_seconds_rounds_to_the_nearest_nanosecond);
    tcase_add_test(t, wrong_stamps_are_refused_with_the_remedy);
    tcase_add_test(t, null_and_nan_are_no_reading_and_never_zero);
    tcase_add_test(t, marks_need_neither_sensor_nor_reading);
    tcase_add_test(t, one_bad_element_does_not_spoil_the_others);
    tcase_add_test(t, malformed_datagrams_say_why);
    tcase_add_test(t, lengths_that_claim_gigabytes_reserve_nothing);
    tcase_add_test(t, timestamps_of_all_three_sizes_are_taken);
    tcase_add_test(t, a_32_bit_float_is_no_time);
    tcase_add_test(t, seconds_near_a_tie_and_before_1970_round_to_the_nearest);
    tcase_add_test(
        t, the_years_that_nanoseconds_hold_are_the_years_that_are_taken);
    tcase_add_test(t, the_place_of_a_reason_is_told);
    tcase_add_test(t, more_than_1024_elements_are_counted_as_bad);
    tcase_add_test(t, components_are_counted_to_255_and_the_rest_is_ignored);
    tcase_add_test(t, long_escaped_text_of_an_unknown_key_is_ignored);
    tcase_add_test(t, uncertainties_and_sequence_numbers_are_taken);
    tcase_add_test(
        t, depth_bytes_behind_the_end_and_wrong_versions_in_messagepack);
    tcase_add_test(t, every_width_of_messagepack_is_read);
    tcase_add_test(t, every_cut_of_a_datagram_is_malformed);
    tcase_add_test(t,
                   infinite_readings_are_passed_on_and_infinite_times_are_not);
    suite_add_tcase(s, t);
    return s;
}
