/* Wrong rig files: what is said of each, whole; planned keys by name. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "config/table.h"
#include "tests/suite.h"
#include "tests/unit/load_case.h"
#include "tests/unit/load_wrong.h"

#define COUNT(a) (int)(sizeof(a) / sizeof *(a))

/* The reports on a text, which must not load. */
static char *refuse(const char *text)
{
    struct settings *s;
    char *said = load_text(&s, text, NULL, 0);
    ck_assert_msg(s == NULL, "%s", text);
    return said;
}

START_TEST(a_wrong_file_is_refused_with_place_reason_and_remedy)
{
    char *said = refuse(wrong[_i].text);
    ck_assert_msg(strcmp(said, wrong[_i].report) == 0, "%s:\n%s",
                  wrong[_i].name, said);
    free(said);
}
END_TEST

/* A small rig with `extra` at the top, in its track, state block, sensor and
 * the sensor's time. */
static void rig_with(char *out, size_t size, const char *top, const char *track,
                     const char *block, const char *sensor)
{
    snprintf(out, size,
             "{%s \"tracks\": {\"c\": {%s \"state\": {%s \"model\": "
             "\"random-walk\", \"name\": \"x\", \"unit\": \"m\", \"q\": 1}}}, "
             "\"sensors\": {\"s\": {%s \"reads\": \"x\", \"u\": 1}}}",
             top, track, block, sensor);
}

/* The key of a row with a value, inside the objects that its path names. */
static void nest(char *out, size_t size, const char *path)
{
    const char *dot = strchr(path, '.');
    if (dot == NULL) {
        snprintf(out, size, "\"%s\": {}", path);
        return;
    }
    char inner[200];
    nest(inner, sizeof inner, dot + 1);
    snprintf(out, size, "\"%.*s\": {%s}", (int)(dot - path), path, inner);
}

START_TEST(every_planned_key_is_refused_by_name)
{
    int n = 0;
    for (int i = 0; i < table_n; i++) {
        const char *path = table_rows[i].path;
        char extra[256], text[1024], want[128];
        if (!table_rows[i].is_planned)
            continue;
        const char *rest = path;
        bool is_block = strncmp(path, "tracks.*.state.", 15) == 0;
        bool is_track = strncmp(path, "tracks.*.", 9) == 0 && !is_block;
        bool is_sensor = strncmp(path, "sensors.*.", 10) == 0;
        rest += is_block ? 15 : is_track ? 9 : is_sensor ? 10 : 0;
        nest(extra, sizeof extra - 1, rest);
        strncat(extra, ",", 2);
        bool is_top = !is_block && !is_track && !is_sensor;
        rig_with(text, sizeof text, is_top ? extra : "", is_track ? extra : "",
                 is_block ? extra : "", is_sensor ? extra : "");
        char *said = refuse(text);
        snprintf(want, sizeof want,
                 "error: \"%s\" is planned but not built yet\n",
                 table_key(&table_rows[i]));
        ck_assert_msg(strstr(said, want) != NULL, "%s: %s", path, said);
        ck_assert_ptr_nonnull(strstr(said, "       = remove it\n"));
        ck_assert_ptr_eq(strstr(said, "error:"), strstr(said, want));
        free(said);
        n++;
    }
    ck_assert_int_gt(n, 25);
}
END_TEST

START_TEST(every_planned_form_is_refused_by_name)
{
    static const char *const forms[] = {"change", "mean", "expression"};
    static const char *const models[] = {"coordinated-turn"};
    char text[1024], want[128];
    for (int i = 0; i < COUNT(forms) + COUNT(models); i++) {
        const char *name =
            i < COUNT(forms) ? forms[i] : models[i - COUNT(forms)];
        snprintf(text, sizeof text,
                 "{\"tracks\": {\"c\": {\"state\": {\"model\": \"%s\", \"name\""
                 ": \"x\", \"unit\": \"m\", \"q\": 1}}}, \"sensors\": {\"s\": "
                 "{\"reads\": {\"%s\": 1}, \"u\": 1}}}",
                 i < COUNT(forms) ? "random-walk" : name,
                 i < COUNT(forms) ? name : "x");
        char *said = refuse(text);
        snprintf(want, sizeof want, "\"%s\" is planned but not built yet\n",
                 name);
        ck_assert_msg(strstr(said, want) != NULL, "%s", said);
        free(said);
    }
}
END_TEST

START_TEST(objects_that_are_planned_as_values_are_refused)
{
    static const char *const values[] = {
        "\"time\": {\"delay\": {\"mean\": 1, \"u\": 1}}, \"like\": \"t\""};
    for (int i = 0; i < COUNT(values); i++) {
        char extra[256], text[1024];
        rig_with(text, sizeof text, "", "", "", "");
        char *end = strstr(text, "\"s\": {");
        snprintf(extra, sizeof extra, "\"s\": {%s}, \"t\": {%s", values[i],
                 end + 6);
        snprintf(end, sizeof text - (size_t)(end - text), "%s", extra);
        char *said = refuse(text);
        ck_assert_ptr_nonnull(
            strstr(said, "as an object is planned but not built yet"));
        free(said);
    }
}
END_TEST

START_TEST(names_in_braces_are_reported_once)
{
    char *said = refuse(
        "{\"tracks\": {\"c{1..6}\": {\"state\": {\"model\": \"random-walk\","
        " \"name\": \"x\", \"unit\": \"m\", \"q\": 1}}},\n"
        " \"sensors\": {\"s{1..6}\": {\"track\": \"c{1..6}\",\n"
        "  \"reads\": \"x\", \"u\": \"1 s\"}}}");
    ck_assert_str_eq(
        said, "rig.json:3:22: error: the unit \"s\" is of another kind than "
              "\"m\"\n     3 |   \"reads\": \"x\", \"u\": \"1 s\"}}}\n"
              "       |                      ^\n"
              "       = give one that converts to m\n");
    free(said);
}
END_TEST

START_TEST(too_many_states_or_sensors_are_refused)
{
    char *said =
        refuse("{\"tracks\": {\"c\": {\"state\": {\"model\": \"random-walk\","
               " \"name\": \"x\", \"unit\": \"m\", \"q\": 1}}},"
               " \"sensors\": {\"s{1..200}\": {\"reads\": \"x\", \"u\": 1},"
               " \"t{1..100}\": {\"reads\": \"x\", \"u\": 1}}}");
    ck_assert_ptr_nonnull(strstr(said, "more than 256 sensors"));
    free(said);
    char text[8192] = "{\"tracks\": {\"c\": {\"state\": [";
    for (int i = 0; i < 17; i++) {
        size_t n = strlen(text);
        snprintf(text + n, sizeof text - n,
                 "%s{\"model\": \"constant-acceleration\", \"name\": \"x%d\","
                 "\"unit\": \"m\", \"q\": 1}",
                 i > 0 ? "," : "", i);
    }
    strncat(text, "]}}, \"sensors\": {\"s\": {\"reads\": \"x0\", \"u\": 1}}}",
            100);
    said = refuse(text);
    ck_assert_ptr_nonnull(strstr(said, "a track holds 48 states"));
    free(said);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load_wrong");
    TCase *t = tcase_create("load_wrong");
    tcase_set_timeout(t, 60);
    tcase_add_loop_test(t, a_wrong_file_is_refused_with_place_reason_and_remedy,
                        0, COUNT(wrong));
    tcase_add_test(t, every_planned_key_is_refused_by_name);
    tcase_add_test(t, every_planned_form_is_refused_by_name);
    tcase_add_test(t, objects_that_are_planned_as_values_are_refused);
    tcase_add_test(t, names_in_braces_are_reported_once);
    tcase_add_test(t, too_many_states_or_sensors_are_refused);
    suite_add_tcase(s, t);
    return s;
}
