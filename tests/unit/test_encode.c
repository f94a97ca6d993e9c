/* Messages to JSON lines and MessagePack maps. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>

#include "tests/unit/encode_case.h"

/* --- estimate ---------------------------------------------------------------
 */

START_TEST(a_live_estimate_has_all_keys_in_order)
{
    some_estimate();
    check_message(
        "{\"type\":\"estimate\",\"track\":\"carriage\",\"stream\":\"live\","
        "\"n\":7,\"t\":\"2001-09-09T01:46:40.123456789Z\",\"x\":[1.5,-0.25],"
        "\"u\":[3,2],\"P\":[9,2,4],\"verdict\":\"good\",\"why\":[],"
        "\"sensor\":\"wheel\",\"nis\":0.75,\"dof\":1,\"accepted\":true,"
        "\"arrived\":\"2001-09-09T01:46:40.130000000Z\",\"rerun\":3}\n");
}
END_TEST

START_TEST(a_settled_estimate_carries_nothing_of_arrival)
{
    struct estimate *e = some_estimate();
    e->stream = STREAM_SETTLED;
    e->accepted = 0;
    e->dof = 0;
    e->verdict = VERDICT_DOUBTFUL;
    e->n_why = 4;
    e->why[0] = (struct reason){REASON_SILENT, 0};
    e->why[1] = (struct reason){REASON_U, 1};
    e->why[2] = (struct reason){REASON_UNDETERMINED, 0};
    e->why[3] = (struct reason){REASON_REFUSED, 1};
    check_message(
        "{\"type\":\"estimate\",\"track\":\"carriage\","
        "\"stream\":\"settled\",\"n\":7,"
        "\"t\":\"2001-09-09T01:46:40.123456789Z\",\"x\":[1.5,-0.25],"
        "\"u\":[3,2],\"P\":[9,2,4],\"verdict\":\"doubtful\","
        "\"why\":[\"silent:laser\",\"u:x.rate\",\"undetermined:x\","
        "\"refused:wheel\"],\"sensor\":\"wheel\",\"nis\":null,\"dof\":0,"
        "\"accepted\":false}\n");
}
END_TEST

START_TEST(undetermined_states_are_null_in_x_u_and_their_part_of_P)
{
    struct estimate *e = some_estimate();
    e->undetermined = 1 << 1;
    e->stream = STREAM_SETTLED;
    e->sensor = -1;
    check_message(
        "{\"type\":\"estimate\",\"track\":\"carriage\","
        "\"stream\":\"settled\",\"n\":7,"
        "\"t\":\"2001-09-09T01:46:40.123456789Z\",\"x\":[1.5,null],"
        "\"u\":[3,null],\"P\":[9,null,null],\"verdict\":\"good\",\"why\":[],"
        "\"sensor\":null,\"nis\":0.75,\"dof\":1,\"accepted\":true}\n");
}
END_TEST

START_TEST(an_undetermined_first_state_is_null_in_its_column_too)
{
    some_estimate()->undetermined = 1 << 0;
    check_message(NULL);
    ck_assert_ptr_nonnull(strstr(line, "\"x\":[null,-0.25],\"u\":[null,2],"
                                       "\"P\":[null,null,4],"));
}
END_TEST

START_TEST(what_is_not_finite_is_null_never_nan)
{
    struct estimate *e = some_estimate();
    e->v[0] = (double)NAN;
    e->v[2] = (double)INFINITY;
    e->nis = -(double)INFINITY;
    check_message(
        "{\"type\":\"estimate\",\"track\":\"carriage\",\"stream\":\"live\","
        "\"n\":7,\"t\":\"2001-09-09T01:46:40.123456789Z\","
        "\"x\":[null,-0.25],\"u\":[null,2],\"P\":[null,2,4],"
        "\"verdict\":\"good\",\"why\":[],\"sensor\":\"wheel\",\"nis\":null,"
        "\"dof\":1,\"accepted\":true,"
        "\"arrived\":\"2001-09-09T01:46:40.130000000Z\",\"rerun\":3}\n");
}
END_TEST

START_TEST(times_before_1970_are_the_same_in_both_forms)
{
    struct estimate *e = some_estimate();
    e->t_ns = -1;
    e->arrived_ns = INT64_MIN + 1000000000;
    check_message(NULL);
    e->t_ns = INT64_MAX;
    e->arrived_ns = 0;
    check_message(NULL);
}
END_TEST

START_TEST(counts_of_every_size_are_the_same_in_both_forms)
{
    struct estimate *e = some_estimate();
    for (int bits = 0; bits <= 53; bits++) {
        e->n = (uint64_t)1 << bits;
        check_message(NULL);
        e->n--;
        check_message(NULL);
    }
}
END_TEST

/* --- event ------------------------------------------------------------------
 */

START_TEST(an_event_names_its_track_and_sensor_if_it_has_them)
{
    struct event *e = some_event(EVENT_REANCHOR);
    check_message("{\"type\":\"event\",\"event\":\"reanchor\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\"}\n");
    e->event = EVENT_SILENT;
    e->sensor = 0;
    snprintf(e->head.track, sizeof e->head.track, "raft-1");
    check_message("{\"type\":\"event\",\"event\":\"silent\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\","
                  "\"track\":\"raft-1\",\"sensor\":\"laser\"}\n");
}
END_TEST

START_TEST(a_verdict_event_says_what_it_was_and_why)
{
    struct event *e = some_event(EVENT_VERDICT);
    snprintf(e->head.track, sizeof e->head.track, "raft-1");
    e->head.kind = 1;
    e->verdict = VERDICT_LOST;
    e->was = VERDICT_COASTING;
    e->n_why = 1;
    e->why[0] = (struct reason){REASON_U, 0};
    check_message("{\"type\":\"event\",\"event\":\"verdict\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\","
                  "\"track\":\"raft-1\",\"verdict\":\"lost\","
                  "\"was\":\"coasting\",\"why\":[\"u:heading\"]}\n");
}
END_TEST

START_TEST(a_reason_without_a_known_subject_is_its_code_alone)
{
    struct event *e = some_event(EVENT_VERDICT);
    e->n_why = 4;
    e->why[0] = (struct reason){REASON_U, 0}; /* of no kind               */
    e->why[1] = (struct reason){REASON_SILENT, -1};
    e->why[2] = (struct reason){REASON_REFUSED, 2};
    e->why[3] = (struct reason){REASON_COUNT, 0};
    check_message("{\"type\":\"event\",\"event\":\"verdict\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\","
                  "\"verdict\":\"starting\",\"was\":\"starting\","
                  "\"why\":[\"u\",\"silent\",\"refused\",\"\"]}\n");
}
END_TEST

START_TEST(a_mark_carries_its_name_and_text)
{
    struct event *e = some_event(EVENT_MARK);
    e->mark = MARK_NOTE;
    snprintf(e->name, sizeof e->name, "run-3");
    snprintf(e->note, sizeof e->note, "wind\t\"strong\" \\ \x01 20 °C");
    check_message("{\"type\":\"event\",\"event\":\"mark\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\","
                  "\"mark\":\"note\",\"name\":\"run-3\","
                  "\"text\":\"wind\\t\\\"strong\\\" \\\\ \\u0001 20 °C\"}\n");
}
END_TEST

/* Each is bad at its last shown byte, or cut short (RFC 3629, section 4). */
static const char *const bad_text[] = {
    "\x80",         "\xc1\xbf",         "\xe0\x9f\xbf",
    "\xed\xa0\x80", "\xf0\x8f\xbf\xbf", "\xf4\x90\x80\x80",
    "\xff",         "\xe2\x82",         "\xc3(",
};

START_TEST(bad_utf8_is_replaced_so_that_a_message_is_always_readable)
{
    struct event *e = some_event(EVENT_MARK);
    snprintf(e->note, sizeof e->note, "%s", bad_text[_i]);
    check_message(NULL);
    ck_assert_ptr_nonnull(strstr(line, "\xef\xbf\xbd"));
    for (const char *s = bad_text[_i]; *s != '\0'; s++)
        ck_assert(strchr(strstr(line, "\"text\""), *s) == NULL ||
                  strchr("\xef\xbf\xbd(", *s) != NULL);
}
END_TEST

/* --- counts -----------------------------------------------------------------
 */

#define LEDGERS                                                                \
    "\"datagrams\":{\"received\":21,\"decoded\":1,\"malformed\":2,"            \
    "\"wrong-version\":3,\"not-allowed\":4,\"bad-key\":5,\"over-quota\":6},"   \
    "\"measurements\":{\"total\":" MANY ",\"sensors\":{\"laser\":" MANY        \
    ",\"wheel\":" NONE "},\"tallies\":{\"total\":{\"late\":5,"                 \
    "\"seq-conflict\":0,\"lost\":0,\"u-ignored\":0},\"sensors\":{"             \
    "\"laser\":{\"late\":0,\"seq-conflict\":0,\"lost\":0,\"u-ignored\":0},"    \
    "\"wheel\":{\"late\":5,\"seq-conflict\":0,\"lost\":0,"                     \
    "\"u-ignored\":0}}}}"
#define MANY                                                                   \
    "{\"used\":0,\"gated\":1,\"withheld\":2,\"pending\":3,"                    \
    "\"no-reading\":4,\"duplicate\":5,\"too-late\":6,\"too-early\":7,"         \
    "\"no-stamp\":8,\"wrong-size\":9,\"implausible\":10,"                      \
    "\"unknown-sensor\":11,\"unknown-track\":12,\"over-quota\":13}"
#define NONE                                                                   \
    "{\"used\":0,\"gated\":0,\"withheld\":0,\"pending\":0,"                    \
    "\"no-reading\":0,\"duplicate\":0,\"too-late\":0,\"too-early\":0,"         \
    "\"no-stamp\":0,\"wrong-size\":0,\"implausible\":0,"                       \
    "\"unknown-sensor\":0,\"unknown-track\":0,\"over-quota\":0}"

START_TEST(counts_show_both_ledgers_and_the_tallies)
{
    some_counts();
    check_message("{\"type\":\"counts\","
                  "\"t\":\"2001-09-09T01:46:40.000000000Z\"," LEDGERS
                  ",\"marks\":2,\"bad-elements\":4}\n");
}
END_TEST

START_TEST(a_summary_is_one_line_made_of_pieces)
{
    struct counts *c = some_counts();
    struct sensor_summary first[2] = {{10, 8, 15, 6}, {0}};
    struct sensor_summary second[2] = {{2, 0, 30, 0}, {4, 4, 5, 5}};
    struct track_summary a = {"carriage", 0, -1.25, 18, first};
    struct track_summary b = {"raft-1", 1, (double)NAN, 4, second};

    size_t len = wire_summary_begin(&rig, c, line, sizeof line);
    len += wire_summary_track(&rig, &a, true, line + len, sizeof line - len);
    len += wire_summary_track(&rig, &b, false, line + len, sizeof line - len);
    len += wire_summary_end(line + len, sizeof line - len);
    line[len] = '\0';
    ck_assert_str_eq(
        line, "{\"type\":\"summary\",\"counts\":{" LEDGERS "},\"tracks\":{"
              "\"carriage\":{\"loglik\":-1.25,\"measurements\":18,\"nis\":{"
              "\"laser\":{\"mean\":1.5,\"n\":10,\"accepted_mean\":0.75}}},"
              "\"raft-1\":{\"loglik\":null,\"measurements\":4,\"nis\":{"
              "\"laser\":{\"mean\":15,\"n\":2,\"accepted_mean\":null},"
              "\"wheel\":{\"mean\":1.25,\"n\":4,\"accepted_mean\":1.25}}}}}\n");
}
END_TEST

START_TEST(a_summary_of_no_track_is_whole)
{
    size_t len = wire_summary_begin(&rig, some_counts(), line, sizeof line);
    len += wire_summary_end(line + len, sizeof line - len);
    line[len] = '\0';
    ck_assert_str_eq(line, "{\"type\":\"summary\",\"counts\":{" LEDGERS
                           "},\"tracks\":{}}\n");
    ck_assert_uint_eq(wire_summary_end(line, 2), 0);
}
END_TEST

/* --- description and connection ---------------------------------------------
 */

START_TEST(a_description_names_rig_build_tracks_and_sensors)
{
    size_t len = wire_encode_description(&rig, "0.1.0+abc", WIRE_JSON, line,
                                         sizeof line);
    size_t n = wire_encode_description(&rig, "0.1.0+abc", WIRE_MSGPACK, packed,
                                       sizeof packed);
    line[len] = '\0';
    ck_assert_str_eq(
        line, "{\"type\":\"description\",\"rig\":\"carriage \\\"day\\\"\","
              "\"wire\":1,\"engine\":2,\"build\":\"0.1.0+abc\","
              "\"rig_hash\":\"00ff\",\"P\":\"lower triangle by rows\","
              "\"tracks\":[{\"id\":\"carriage\",\"states\":["
              "{\"name\":\"x\",\"unit\":\"m\"},"
              "{\"name\":\"x.rate\",\"unit\":\"m/s\"}]},"
              "{\"id\":\"raft-*\",\"states\":[{\"name\":\"heading\","
              "\"unit\":\"°\"}]}],"
              "\"sensors\":[{\"name\":\"laser\",\"track\":\"carriage\","
              "\"unit\":[\"mm\"]},{\"name\":\"wheel\",\"track\":\"carriage\","
              "\"unit\":[\"m/s\",\"rad\"]}]}\n");
    check_same(len, n);
}
END_TEST

START_TEST(heartbeat_bye_and_host_are_as_stated)
{
    int64_t t_ns = 1000000000000000000;
    size_t len = wire_encode_heartbeat(t_ns, 5, WIRE_JSON, line, sizeof line);
    size_t n =
        wire_encode_heartbeat(t_ns, 5, WIRE_MSGPACK, packed, sizeof packed);
    line[len] = '\0';
    ck_assert_str_eq(line, "{\"type\":\"heartbeat\","
                           "\"t\":\"2001-09-09T01:46:40.000000000Z\","
                           "\"skipped\":5}\n");
    check_same(len, n);

    len = wire_encode_bye("stopping", WIRE_JSON, line, sizeof line);
    n = wire_encode_bye("stopping", WIRE_MSGPACK, packed, sizeof packed);
    line[len] = '\0';
    ck_assert_str_eq(line, "{\"type\":\"bye\",\"reason\":\"stopping\"}\n");
    check_same(len, n);

    const char *text = "the kernel dropped 3 datagrams";
    len =
        wire_encode_host(t_ns, "drops", text, 3, WIRE_JSON, line, sizeof line);
    n = wire_encode_host(t_ns, "drops", text, 3, WIRE_MSGPACK, packed,
                         sizeof packed);
    line[len] = '\0';
    ck_assert_str_eq(line, "{\"type\":\"host\",\"what\":\"drops\","
                           "\"t\":\"2001-09-09T01:46:40.000000000Z\",\"n\":3,"
                           "\"text\":\"the kernel dropped 3 datagrams\"}\n");
    check_same(len, n);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("encode");
    TCase *t = tcase_create("encode");
    tcase_add_checked_fixture(t, set_up, NULL);
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_live_estimate_has_all_keys_in_order);
    tcase_add_test(t, a_settled_estimate_carries_nothing_of_arrival);
    tcase_add_test(t, undetermined_states_are_null_in_x_u_and_their_part_of_P);
    tcase_add_test(t, an_undetermined_first_state_is_null_in_its_column_too);
    tcase_add_test(t, what_is_not_finite_is_null_never_nan);
    tcase_add_test(t, times_before_1970_are_the_same_in_both_forms);
    tcase_add_test(t, counts_of_every_size_are_the_same_in_both_forms);
    tcase_add_test(t, an_event_names_its_track_and_sensor_if_it_has_them);
    tcase_add_test(t, a_verdict_event_says_what_it_was_and_why);
    tcase_add_test(t, a_reason_without_a_known_subject_is_its_code_alone);
    tcase_add_test(t, a_mark_carries_its_name_and_text);
    tcase_add_loop_test(
        t, bad_utf8_is_replaced_so_that_a_message_is_always_readable, 0,
        sizeof bad_text / sizeof *bad_text);
    tcase_add_test(t, counts_show_both_ledgers_and_the_tallies);
    tcase_add_test(t, a_summary_is_one_line_made_of_pieces);
    tcase_add_test(t, a_summary_of_no_track_is_whole);
    tcase_add_test(t, a_description_names_rig_build_tracks_and_sensors);
    tcase_add_test(t, heartbeat_bye_and_host_are_as_stated);
    suite_add_tcase(s, t);
    return s;
}
