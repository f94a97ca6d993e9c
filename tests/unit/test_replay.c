/* Records through the replay driver give what the live run said. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/suite.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "core/wire/encode.h"
#include "core/wire/pcap.h"
#include "tests/support/drive.h"
#include "tools/output.h"
#include "tools/replay.h"

#define START_NS 1000000000123456789
#define MS       ((int64_t)1000000)

enum { CAPTURE_MAX = 1 << 20, PORT = 8410 };

static const char rig_text[] =
    "{\"order\": {\"horizon\": \"200 ms\", \"ahead\": \"1 s\"},"
    " \"tracks\": {\"tank\": {\"state\": [{\"model\": \"random-walk\", "
    "\"name\": \"level\", \"unit\": \"m\", \"q\": \"1e-4 m2/s\"}]}},"
    " \"sensors\": {\"gauge\": {\"track\": \"tank\", \"reads\": \"level\", "
    "\"unit\": \"m\", \"u\": \"5 mm\", \"rate\": \"50 Hz\"}}}";

/* A live run beside what its recorder would have written. */
static struct drive live;
static uint8_t capture[CAPTURE_MAX];
static size_t used;
static char *said;
static size_t said_len;

static void record(int64_t a_ns, int port, const char *text)
{
    struct sender from = {.family = 4, .address = {127, 0, 0, 1}, .port = 9};
    struct sender to = {.family = 4, .address = {127, 0, 0, 1}};
    to.port = (uint16_t)port;
    size_t len = strlen(text);
    used += pcap_write_record_head(capture + used, a_ns, &from, &to,
                                   (const uint8_t *)text, len);
    memcpy(capture + used, text, len);
    used += len;
}

static void control(enum control_kind kind, int64_t line_ns)
{
    used += pcap_write_control(capture + used, CAPTURE_MAX - used, kind,
                               line_ns, 0, "");
}

static void feed(int64_t a_ns, int64_t t_ns, double z)
{
    char text[160];
    snprintf(text, sizeof text, "{\"sensor\":\"gauge\",\"ns\":%lld,\"z\":%.6f}",
             (long long)t_ns, z);
    record(run_arrival(live.run, a_ns), PORT, text);
    drive_feed_bytes(&live, a_ns, text, strlen(text));
}

/* Readings up to three periods late: enough lines to fill a buffer twice. */
static int64_t live_readings(int64_t from_ns)
{
    struct random noise;
    random_init(&noise, 7, 0);
    int64_t a_ns = from_ns;
    for (int i = 0; i < 600; i++) {
        a_ns += 20 * MS;
        int64_t late_ns = (int64_t)(random_uniform(&noise) * 60) * MS;
        feed(a_ns, a_ns - late_ns, 1 + 0.005 * random_normal(&noise));
    }
    return a_ns;
}

static void begin(void)
{
    drive_init(&live, rig_text);
    pcap_write_file_head(capture);
    used = PCAP_FILE_HEAD_SIZE;
}

static void end(void)
{
    drive_fini(&live);
    free(said);
    said = NULL;
}

/* Replays what was captured; `said` holds description, messages, summary. */
static struct replay replay_all(int port, enum output_streams streams)
{
    struct replay r;
    struct output o;
    struct pcap_form form;
    FILE *to = open_memstream(&said, &said_len);
    ck_assert_int_eq(output_init(&o, &live.settings->rig, to, streams), ST_OK);
    ck_assert_int_eq(
        replay_init(&r, &live.settings->rig, port, output_sink(&o)), ST_OK);
    ck_assert(pcap_read_file_head(capture, used, &form));
    for (size_t at = PCAP_FILE_HEAD_SIZE, step; at < used; at += step) {
        struct pcap_record record;
        ck_assert_int_eq(
            pcap_read_record(&form, capture + at, used - at, &record, &step),
            PCAP_RECORD);
        replay_take(&r, &record);
    }
    replay_end(&r);
    ck_assert_int_eq(output_fini(&o), ST_OK);
    fclose(to);
    replay_fini(&r);
    return r;
}

static void must_be_what_was_said_live(void)
{
    size_t i = 0;
    while (i < said_len && i < live.n_all && said[i] == live.all[i])
        i++;
    size_t from = i < 60 ? 0 : i - 60;
    ck_assert_msg(i == said_len && i == live.n_all,
                  "byte %zu of %zu and %zu: \"%.120s\", live \"%.120s\"", i,
                  said_len, live.n_all, said + from, live.all + from);
}

START_TEST(a_capture_of_ours_gives_what_the_live_run_said)
{
    control(CONTROL_START, START_NS);
    drive_start(&live, START_NS);
    int64_t a_ns = live_readings(START_NS);
    for (int i = 1; i <= 3; i++) {
        control(CONTROL_TIME, a_ns + i * 1000 * MS);
        run_advance(live.run, a_ns + i * 1000 * MS);
    }
    control(CONTROL_REANCHOR, a_ns + 3600000 * MS);
    run_reanchor(live.run, a_ns + 3600000 * MS);
    a_ns = live_readings(a_ns + 3600000 * MS);
    control(CONTROL_STOP, a_ns + 77 * MS);
    run_stop(live.run, a_ns + 77 * MS);

    struct replay r = replay_all(PORT, OUTPUT_BOTH);
    ck_assert_uint_gt(live.n_estimates[STREAM_LIVE], 1000);
    ck_assert_uint_gt(live.n_estimates[STREAM_SETTLED], 1000);
    must_be_what_was_said_live();
    ck_assert_uint_eq(r.n_fed, 1200);
    ck_assert(r.is_ours);
    ck_assert(r.is_ended);
}
END_TEST

START_TEST(a_foreign_capture_ends_a_horizon_after_its_last_datagram)
{
    drive_start(&live, START_NS);
    feed(START_NS, START_NS - 5 * MS, 1);
    int64_t a_ns = live_readings(START_NS);
    run_stop(live.run, a_ns + 200 * MS);

    struct replay r = replay_all(PORT, OUTPUT_BOTH);
    must_be_what_was_said_live();
    ck_assert(!r.is_ours);
}
END_TEST

START_TEST(a_capture_that_was_cut_off_settles_where_it_ends)
{
    control(CONTROL_START, START_NS);
    drive_start(&live, START_NS);
    int64_t a_ns = live_readings(START_NS);
    run_stop(live.run, a_ns);

    struct replay r = replay_all(PORT, OUTPUT_BOTH);
    must_be_what_was_said_live();
    ck_assert_int_eq(r.line_ns, a_ns);
}
END_TEST

START_TEST(a_stream_alone_is_the_same_lines_with_the_others_left_out)
{
    control(CONTROL_START, START_NS);
    drive_start(&live, START_NS);
    int64_t a_ns = live_readings(START_NS);
    control(CONTROL_STOP, a_ns);
    run_stop(live.run, a_ns);

    replay_all(PORT, OUTPUT_SETTLED);
    ck_assert_ptr_null(strstr(said, "\"stream\":\"live\""));
    const char *line = live.settled;
    while (*line != '\0') {
        size_t len = strcspn(line, "\n") + 1;
        ck_assert_ptr_nonnull(memmem(said, said_len, line, len));
        line += len;
    }
}
END_TEST

START_TEST(no_stream_leaves_estimates_and_counts_out)
{
    control(CONTROL_START, START_NS);
    drive_start(&live, START_NS);
    control(CONTROL_STOP, live_readings(START_NS));

    replay_all(PORT, OUTPUT_NONE);
    ck_assert_ptr_null(strstr(said, "\"type\":\"estimate\""));
    ck_assert_ptr_null(strstr(said, "\"type\":\"counts\""));
}
END_TEST

START_TEST(datagrams_to_another_port_are_counted_and_not_fed)
{
    drive_start(&live, START_NS);
    record(START_NS, 9999, "{\"sensor\":\"gauge\",\"z\":1}");
    feed(START_NS, START_NS, 1);
    struct replay r = replay_all(PORT, OUTPUT_BOTH);
    ck_assert_uint_eq(r.n_fed, 1);
    ck_assert_uint_eq(r.n_other_port, 1);
    free(said);
    r = replay_all(0, OUTPUT_BOTH);
    ck_assert_uint_eq(r.n_fed, 2);
    ck_assert_uint_eq(r.n_other_port, 0);
}
END_TEST

START_TEST(a_second_start_begins_a_line_with_a_new_state)
{
    control(CONTROL_START, START_NS);
    drive_start(&live, START_NS);
    int64_t a_ns = live_readings(START_NS);
    control(CONTROL_STOP, a_ns);
    run_stop(live.run, a_ns);
    size_t once = live.n_all;

    size_t half = used - PCAP_FILE_HEAD_SIZE;
    memcpy(capture + used, capture + PCAP_FILE_HEAD_SIZE, half);
    used += half;
    struct replay r = replay_all(PORT, OUTPUT_BOTH);
    ck_assert_uint_eq(r.n_starts, 2);
    ck_assert_uint_eq(said_len, 2 * once);
    ck_assert_int_eq(memcmp(said, live.all, once), 0);
    ck_assert_int_eq(memcmp(said + once, live.all, once), 0);
}
END_TEST

static void fail_to_write(struct output *o)
{
    struct event e = {.head = {sizeof e, MESSAGE_EVENT, 0xffff, ""}};
    struct message_sink sink = output_sink(o);
    for (int i = 0; i < 10000; i++)
        sink.say(sink.ctx, &e.head);
}

START_TEST(a_full_disk_is_an_error_and_not_silence)
{
    struct output o;
    FILE *to = fopen("/dev/full", "wb");
    ck_assert_ptr_nonnull(to);
    ck_assert_int_eq(output_init(&o, &live.settings->rig, to, OUTPUT_BOTH),
                     ST_OK);
    fail_to_write(&o);
    ck_assert_int_eq(output_fini(&o), ST_IO);
    fclose(to);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("replay");
    TCase *t = tcase_create("driver");
    tcase_add_checked_fixture(t, begin, end);
    tcase_add_test(t, a_capture_of_ours_gives_what_the_live_run_said);
    tcase_add_test(t, a_foreign_capture_ends_a_horizon_after_its_last_datagram);
    tcase_add_test(t, a_capture_that_was_cut_off_settles_where_it_ends);
    tcase_add_test(t,
                   a_stream_alone_is_the_same_lines_with_the_others_left_out);
    tcase_add_test(t, no_stream_leaves_estimates_and_counts_out);
    tcase_add_test(t, datagrams_to_another_port_are_counted_and_not_fed);
    tcase_add_test(t, a_second_start_begins_a_line_with_a_new_state);
    tcase_add_test(t, a_full_disk_is_an_error_and_not_silence);
    suite_add_tcase(s, t);
    return s;
}
