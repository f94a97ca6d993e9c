/* The tool as a process: help, manual pages, check and import. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/suite.h"

#include <cjson/cJSON.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "core/wire/decode.h"
#include "core/wire/pcap.h"
#include "tests/support/tool.h"
#include "tools/call.h"

/* --- help ---------------------------------------------------------------- */

START_TEST(help_shows_examples_first_and_names_every_verb)
{
    ck_assert_int_eq(TOOL("--help"), EXIT_FINE);
    ck_assert_str_eq(tool_said, "");
    ck_assert_ptr_nonnull(strstr(tool_out, "Examples:"));
    ck_assert(strstr(tool_out, "Examples:") < strstr(tool_out, "Usage:"));
    for (int i = 0; verb_list[i] != NULL; i++) {
        char line[80];
        snprintf(line, sizeof line, "\n  %-10s%s\n", verb_list[i]->name,
                 verb_list[i]->summary);
        ck_assert_msg(strstr(tool_out, line) != NULL, "no line for %s",
                      verb_list[i]->name);
    }
}
END_TEST

START_TEST(help_of_every_verb_fits_eighty_columns)
{
    for (int i = 0; verb_list[i] != NULL; i++) {
        ck_assert_int_eq(TOOL(verb_list[i]->name, "--help"), EXIT_FINE);
        ck_assert_int_eq(strncmp(tool_out, "Examples:\n", 10), 0);
        for (const char *line = tool_out; *line != '\0';) {
            size_t len = strcspn(line, "\n");
            ck_assert_msg(len <= 80, "%s: %.*s", verb_list[i]->name, (int)len,
                          line);
            line += len + 1;
        }
    }
}
END_TEST

START_TEST(the_version_is_one_line)
{
    ck_assert_int_eq(TOOL("--version"), EXIT_FINE);
    ck_assert_int_eq(strncmp(tool_out, "ropewalk 0.", 11), 0);
    ck_assert_ptr_eq(strchr(tool_out, '\n'), tool_out + tool_out_len - 1);
}
END_TEST

START_TEST(an_unknown_verb_gets_the_nearest_one)
{
    ck_assert_int_eq(TOOL("relpay"), EXIT_WRONG_USE);
    ck_assert_str_eq(tool_out, "");
    ck_assert_str_eq(tool_said, "ropewalk: relpay: no such verb; did you mean "
                                "replay?\n");
}
END_TEST

START_TEST(no_verb_at_all_is_wrong_use_and_shows_help_on_stderr)
{
    ck_assert_int_eq(tool_run("", NULL), EXIT_WRONG_USE);
    ck_assert_str_eq(tool_out, "");
    ck_assert_ptr_nonnull(strstr(tool_said, "Usage: ropewalk VERB"));
}
END_TEST

START_TEST(a_key_of_the_rig_file_is_explained)
{
    ck_assert_int_eq(TOOL("help", "order.horizon"), EXIT_FINE);
    ck_assert_ptr_nonnull(strstr(tool_out, "horizon"));
    ck_assert_int_eq(TOOL("help", "no.such.key"), EXIT_WRONG_USE);
    ck_assert_ptr_nonnull(strstr(tool_said, "neither a verb nor a key"));
}
END_TEST

START_TEST(every_manual_page_is_without_warnings)
{
    char command[400];
    ck_assert_int_eq(TOOL("help", "--man", tool_folder), EXIT_FINE);
    snprintf(command, sizeof command,
             "mandoc -T lint -W warning %s/*.[158] && ls %s/*.[158] | wc -l "
             "> %s/pages",
             tool_folder, tool_folder, tool_folder);
    ck_assert_int_eq(system(command), 0);
    int n = 3; /* the tool, the daemon, the rig file */
    while (verb_list[n - 3] != NULL)
        n++;
    tool_read(tool_path("pages"), tool_out);
    ck_assert_int_eq(strtol(tool_out, NULL, 10), n);
}
END_TEST

/* --- check --------------------------------------------------------------- */

START_TEST(a_good_rig_is_shown_as_it_was_understood)
{
    ck_assert_int_eq(TOOL("check", tool_write("rig.json", tool_rig)),
                     EXIT_FINE);
    ck_assert_str_eq(tool_said, "");
    ck_assert_ptr_nonnull(strstr(tool_out, "valid, \"level day\""));
    ck_assert_ptr_nonnull(strstr(tool_out,
                                 "q = 0.0001 m2/s: like an unmodelled "
                                 "rate of 0.01 m/s that lasts 1 s"));
    ck_assert_ptr_nonnull(strstr(tool_out, "reads level in mm, u 5 mm"));
}
END_TEST

START_TEST(check_as_json_is_one_object_with_the_same_facts)
{
    ck_assert_int_eq(TOOL("check", tool_write("rig.json", tool_rig), "--json"),
                     EXIT_FINE);
    cJSON *all = cJSON_Parse(tool_out);
    ck_assert_ptr_nonnull(all);
    const cJSON *sensor =
        cJSON_GetArrayItem(cJSON_GetObjectItemCaseSensitive(all, "sensors"), 0);
    ck_assert_double_eq_tol(
        cJSON_GetObjectItemCaseSensitive(sensor, "rate_hz")->valuedouble, 10,
        1e-12);
    ck_assert_double_gt(
        cJSON_GetObjectItemCaseSensitive(all, "memory_bytes")->valuedouble,
        1000);
    cJSON_Delete(all);
}
END_TEST

START_TEST(a_change_is_laid_over_the_rig)
{
    const char *rig = tool_write("rig.json", tool_rig);
    ck_assert_int_eq(TOOL("check", rig, "--set", "sensors.gauge.u=2 mm"),
                     EXIT_FINE);
    ck_assert_ptr_nonnull(strstr(tool_out, "reads level in mm, u 2 mm"));
    ck_assert_int_eq(TOOL("check", rig, "--set", "sensors.gauge.uu=2 mm"),
                     EXIT_BAD_SETTINGS);
    ck_assert_int_eq(TOOL("check", rig, "--without", "gauge"),
                     EXIT_BAD_SETTINGS);
    ck_assert_ptr_nonnull(strstr(tool_said, "no sensors"));
    ck_assert_int_eq(TOOL("check", rig, "--set", "nothing"), EXIT_BAD_SETTINGS);
    ck_assert_ptr_nonnull(strstr(tool_said, "needs PATH=VALUE"));
}
END_TEST

START_TEST(a_bad_rig_is_refused_with_its_place)
{
    const char *rig = tool_write(
        "bad.json", "{\"tracks\": {\"tank\": {\"state\": [{\"model\": "
                    "\"random-wlak\", \"name\": \"level\", \"unit\": \"m\"}]}},"
                    "\n \"sensros\": {}}\n");
    ck_assert_int_eq(TOOL("check", rig), EXIT_BAD_SETTINGS);
    ck_assert_str_eq(tool_out, "");
    ck_assert_ptr_nonnull(strstr(tool_said, "bad.json:1:"));
    ck_assert_ptr_nonnull(strstr(tool_said, "bad.json:2:"));
    ck_assert_ptr_nonnull(strstr(tool_said, "random-walk"));
    ck_assert_ptr_nonnull(strstr(tool_said, "sensors"));
}
END_TEST

START_TEST(a_missing_rig_is_not_there)
{
    ck_assert_int_eq(TOOL("check", tool_path("none.json")), EXIT_NOT_THERE);
    ck_assert_ptr_nonnull(strstr(tool_said, "none.json"));
}
END_TEST

/* --- import -------------------------------------------------------------- */

/* Reads the next record of a capture in `tool_out`. */
static void next_record(size_t *at, struct pcap_record *r)
{
    struct pcap_form form;
    size_t used;
    ck_assert(
        pcap_read_file_head((const uint8_t *)tool_out, tool_out_len, &form));
    if (*at == 0)
        *at = PCAP_FILE_HEAD_SIZE;
    ck_assert_int_eq(pcap_read_record(&form, (const uint8_t *)tool_out + *at,
                                      tool_out_len - *at, r, &used),
                     PCAP_RECORD);
    *at += used;
}

START_TEST(a_table_becomes_a_capture_in_order_of_arrival)
{
    static struct wire_decoder d;
    static const int64_t arrivals_ns[] = {0, 130000000, 200000000, 220000000,
                                          300000000};
    static const int64_t stamps_ns[] = {0, 100000000, 200000000, 110000000,
                                        300000000};
    const char *table = tool_write("a.csv", tool_table);
    ck_assert_int_eq(TOOL("import", table, tool_path("a.pcap")), EXIT_FINE);
    ck_assert_ptr_nonnull(strstr(tool_said,
                                 "stamps count from zero; zero is taken "
                                 "as 2001-09-09T01:46:40"));
    tool_out_len = tool_read(tool_path("a.pcap"), tool_out);
    struct pcap_record r;
    size_t at = 0;
    for (int i = 0; i < 5; i++) {
        next_record(&at, &r);
        ck_assert_int_eq(r.a_ns, 1000000000000000000 + arrivals_ns[i]);
        ck_assert_int_eq(r.to.port, 8410);
        ck_assert_int_eq(wire_decode(&d, r.payload, r.len), DATAGRAM_DECODED);
        ck_assert_int_eq(d.element[0].t_ns, 1000000000000000000 + stamps_ns[i]);
    }
    ck_assert_uint_eq(at, tool_out_len);
    ck_assert_double_eq_tol(d.element[0].z[0], 1, 1e-15);
}
END_TEST

START_TEST(bad_lines_are_named_and_nothing_is_written)
{
    const char *table = tool_write("a.csv", "t,sensor,z0\n2000000000,a,1\n"
                                            "2000000001,a,x\n2000000002,a\n");
    const char *capture = tool_path("a.pcap");
    ck_assert_int_eq(TOOL("import", table, capture), EXIT_PROBLEM);
    ck_assert_ptr_nonnull(strstr(tool_said, "a.csv:3: 'x' is no number"));
    ck_assert_ptr_nonnull(strstr(tool_said, "a.csv:4: 2 fields"));
    ck_assert_int_ne(access(capture, F_OK), 0);
    ck_assert_int_eq(TOOL("import", "--skip-bad", "--json", table, capture),
                     EXIT_FINE);
    ck_assert_str_eq(tool_out,
                     "{\"measurements\":1,\"left_out\":0,\"bad_lines\":2,"
                     "\"first\":\"2033-05-18T03:33:20.000000000Z\","
                     "\"last\":\"2033-05-18T03:33:20.000000000Z\"}\n");
}
END_TEST

START_TEST(a_rig_keeps_only_what_it_reads)
{
    const char *rig = tool_write("rig.json", tool_rig);
    const char *table = tool_write("a.csv", tool_table);
    ck_assert_int_eq(
        TOOL("import", "--rig", rig, "--json", table, tool_path("a.pcap")),
        EXIT_FINE);
    ck_assert_ptr_nonnull(
        strstr(tool_out, "\"measurements\":4,\"left_out\":1"));
}
END_TEST

static void add_help(Suite *s)
{
    TCase *t = tcase_create("help");
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_set_timeout(t, 30);
    tcase_add_test(t, help_shows_examples_first_and_names_every_verb);
    tcase_add_test(t, help_of_every_verb_fits_eighty_columns);
    tcase_add_test(t, the_version_is_one_line);
    tcase_add_test(t, an_unknown_verb_gets_the_nearest_one);
    tcase_add_test(t, no_verb_at_all_is_wrong_use_and_shows_help_on_stderr);
    tcase_add_test(t, a_key_of_the_rig_file_is_explained);
    tcase_add_test(t, every_manual_page_is_without_warnings);
    suite_add_tcase(s, t);
}

static void add_files(Suite *s)
{
    TCase *t = tcase_create("files");
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_set_timeout(t, 30);
    tcase_add_test(t, a_good_rig_is_shown_as_it_was_understood);
    tcase_add_test(t, check_as_json_is_one_object_with_the_same_facts);
    tcase_add_test(t, a_change_is_laid_over_the_rig);
    tcase_add_test(t, a_bad_rig_is_refused_with_its_place);
    tcase_add_test(t, a_missing_rig_is_not_there);
    tcase_add_test(t, a_table_becomes_a_capture_in_order_of_arrival);
    tcase_add_test(t, bad_lines_are_named_and_nothing_is_written);
    tcase_add_test(t, a_rig_keeps_only_what_it_reads);
    suite_add_tcase(s, t);
}

Suite *suite(void)
{
    Suite *s = suite_create("tool");
    add_help(s);
    add_files(s);
    return s;
}
