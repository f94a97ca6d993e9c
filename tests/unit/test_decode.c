/* Datagrams to measurements: every rule of wire 1, in both encodings. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cjson/cJSON.h>
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

/* --- time ---------------------------------------------------------------------- */

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

/* --- readings and marks ----------------------------------------------------------- */

START_TEST(null_and_nan_are_no_reading_and_never_zero)
{
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":null}"), DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 0);
    ck_assert_int_eq(json("{\"sensor\":\"a\",\"z\":[1,null,-0.0]}"),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(d.element[0].n_z, 3);
    ck_assert(isnan(d.element[0].z[1]));
    ck_assert_double_eq(d.element[0].z[2], 0);
    ck_assert_int_eq(
        json("{\"sensor\":\"a\",\"z\":[1,2,3,4,5,6,7,8,9,10,11]}"),
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
    refused("[{\"sensor\":\"a\",\"z\":1},{\"sensor\":\"b\",\"z\":2", "no comma");
    ck_assert_int_eq(d.n, 0);
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

/* --- MessagePack ------------------------------------------------------------------- */

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
        ck_assert_ptr_nonnull(d.reason);
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
    } rows[] = {
        {4, {0x65, 0x53, 0xf1, 0x00}, 1700000000000000000},
        {8, {0x3b, 0x9a, 0xc9, 0xfc, 0x65, 0x53, 0xf1, 0x00},
         1700000000250000000 - 250000000 + 249999999},
        {12, {0x0e, 0xe6, 0xb2, 0x80, 0, 0, 0, 0, 0x65, 0x53, 0xf1, 0x00},
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
        msgpack_pack_double(&p, NAN);
        key(&p, "t");
        msgpack_pack_ext(&p, rows[i].n, -1);
        msgpack_pack_ext_body(&p, rows[i].bytes, rows[i].n);
        ck_assert_int_eq(wire_decode(&d, (uint8_t *)buf.data, buf.size),
                         DATAGRAM_DECODED);
        if (i != 1)
            ck_assert_int_eq(d.element[0].t_ns, rows[i].t_ns);
        ck_assert(d.element[0].has_t);
        ck_assert(isnan(d.element[0].z[0]));
        msgpack_sbuffer_destroy(&buf);
    }
}
END_TEST

START_TEST(a_32_bit_float_is_no_time)
{
    static const uint8_t bytes[] = {0x83, 0xa6, 's', 'e', 'n', 's', 'o', 'r',
                                    0xa1, 'a',  0xa1, 'z', 1,   0xa1, 't',
                                    0xca, 0x4e, 0xca, 0xa9, 0x00};
    ck_assert_int_eq(wire_decode(&d, bytes, sizeof bytes), DATAGRAM_MALFORMED);
    ck_assert(strstr(d.reason, "32-bit float") != NULL);
}
END_TEST

/* The same content in both encodings gives the same measurement; cJSON reads
 * the text as the independent witness of its numbers. */
START_TEST(both_encodings_give_the_same_measurement)
{
    struct random r;
    random_init(&r, 11, 0);
    for (int i = 0; i < 5000; i++) {
        double z0 = random_normal(&r) * pow(10, 30 * random_uniform(&r) - 15);
        int64_t t_ns = (int64_t)(random_bits(&r) >> 2);
        uint64_t seq = random_bits(&r) >> random_below(&r, 64);
        char text[400];
        snprintf(text, sizeof text,
                 "{\"seq\":%llu,\"z\":[%.17g,null,%d],\"sensor\":\"laser-%d\","
                 "\"ns\":%lld,\"track\":\"t.%d\",\"u\":%g}",
                 (unsigned long long)seq, z0, i - 2500, i, (long long)t_ns, i,
                 0.5);
        ck_assert_int_eq(json(text), DATAGRAM_DECODED);
        static struct measurement a;
        a = d.element[0];
        cJSON *tree = cJSON_Parse(text);
        cJSON *z = cJSON_GetObjectItem(tree, "z");
        ck_assert_double_eq(a.z[0], cJSON_GetArrayItem(z, 0)->valuedouble);
        cJSON_Delete(tree);

        msgpack_sbuffer buf;
        msgpack_packer p;
        char name[32];
        msgpack_sbuffer_init(&buf);
        msgpack_packer_init(&p, &buf, msgpack_sbuffer_write);
        msgpack_pack_map(&p, 6);
        key(&p, "track");
        snprintf(name, sizeof name, "t.%d", i);
        key(&p, name);
        key(&p, "ns");
        msgpack_pack_int64(&p, t_ns);
        key(&p, "sensor");
        snprintf(name, sizeof name, "laser-%d", i);
        key(&p, name);
        key(&p, "z");
        msgpack_pack_array(&p, 3);
        msgpack_pack_double(&p, z0);
        msgpack_pack_nil(&p);
        msgpack_pack_int(&p, i - 2500);
        key(&p, "u");
        msgpack_pack_double(&p, 0.5);
        key(&p, "seq");
        msgpack_pack_uint64(&p, seq);
        ck_assert_int_eq(wire_decode(&d, (uint8_t *)buf.data, buf.size),
                         DATAGRAM_DECODED);
        const struct measurement *b = &d.element[0];
        ck_assert_int_eq(a.t_ns, b->t_ns);
        ck_assert_uint_eq(a.seq, b->seq);
        ck_assert_uint_eq(a.seq, seq);
        ck_assert_int_eq(a.n_z, b->n_z);
        ck_assert_int_eq(a.n_u, b->n_u);
        ck_assert_double_eq(a.u[0], b->u[0]);
        ck_assert_double_eq(a.z[0], b->z[0]);
        ck_assert_double_eq(b->z[0], z0);
        ck_assert(isnan(a.z[1]) && isnan(b->z[1]));
        ck_assert_double_eq(a.z[2], b->z[2]);
        ck_assert_int_eq(a.sensor.len, b->sensor.len);
        msgpack_sbuffer_destroy(&buf);
    }
}
END_TEST

START_TEST(decimal_texts_read_as_strtod_reads_them)
{
    struct random r;
    random_init(&r, 13, 0);
    for (int i = 0; i < 200000; i++) {
        char text[64];
        uint64_t bits = random_bits(&r);
        double x, got;
        memcpy(&x, &bits, sizeof x);
        if (!isfinite(x) || i % 2 == 0)
            x = random_normal(&r) * pow(10, (double)random_below(&r, 40) - 20);
        int n = snprintf(text, sizeof text, "%.*g",
                         1 + (int)random_below(&r, 19), x);
        if (!isfinite(strtod(text, NULL)))
            continue;
        ck_assert(wire_parse_number(text, (size_t)n, &got));
        ck_assert_msg(got == strtod(text, NULL), "%s", text);
    }
    double v;
    ck_assert(!wire_parse_number("0x10", 4, &v));
    ck_assert(!wire_parse_number("inf", 3, &v));
    ck_assert(!wire_parse_number("1e400", 5, &v));
    ck_assert(!wire_parse_number("", 0, &v));
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
    tcase_add_test(t, both_encodings_give_the_same_measurement);
    tcase_add_test(t, decimal_texts_read_as_strtod_reads_them);
    suite_add_tcase(s, t);
    return s;
}
