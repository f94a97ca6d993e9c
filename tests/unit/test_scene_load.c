/* What a wrong rehearsal file is told, with its place. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/suite.h"
#include "tests/unit/play_case.h"

/* A text, and the beginning of the only report that it gives. */
struct wrong {
    const char *text, *report;
};

#define CART "{\"truth\": {\"cart\": "

static const struct wrong wrongs[] = {
    {"[]", "rehearsal.json:1:1: error: a rehearsal is an object"},
    {"{\"seed\": 7,}", "rehearsal.json:1:12: error: a key must follow"},
    {"{\"truth\": {\"cart\": []}, \"sede\": 7}",
     "rehearsal.json:1:25: error: \"sede\" is no key here\n"
     "     1 | {\"truth\": {\"cart\": []}, \"sede\": 7}\n"
     "       |                         ^\n"
     "       = did you mean \"seed\"?\n"},
    {"{\"truth\": {\"cart\": []},\n \"seed\": 1, \"seed\": 2}",
     "rehearsal.json:2:13: error: the key \"seed\" stands twice"},
    {"{\"seed\": 7}", "rehearsal.json:1:1: error: the key \"truth\" is "
                      "missing"},
    {"{\"truth\": {\"cart\": []}, \"seed\": -1}",
     "rehearsal.json:1:33: error: a seed is a whole number of 0 .. 2^53"},
    {"{\"truth\": {\"cart\": []}, \"seed\": 0.5}",
     "rehearsal.json:1:33: error: a seed is a whole number of 0 .. 2^53"},
    {"{\"truth\": {\"cart\": []}, \"lasts\": \"3 m\"}",
     "rehearsal.json:1:34: error: the unit \"m\" is of another kind"},
    {"{\"truth\": {\"cart\": []}, \"lasts\": 0}",
     "rehearsal.json:1:34: error: it must last longer than 0 s"},
    {"{\"truth\": {\"cat\": []}}",
     "rehearsal.json:1:12: error: \"cat\" is no track of the rig\n"
     "     1 | {\"truth\": {\"cat\": []}}\n"
     "       |            ^\n"
     "       = did you mean \"cart\"?\n"},
    {CART "{\"start\": {\"xx\": 1}}}}",
     "rehearsal.json:1:31: error: \"xx\" is no state of this track"},
    {CART "{\"start\": {\"x\": \"3 s\"}}}}",
     "rehearsal.json:1:36: error: the unit \"s\" is of another kind"},
    {CART "{\"start\": {\"x\": {\"mean\": 3, \"u\": -1}}}}}",
     "rehearsal.json:1:53: error: u is below 0"},
    {CART "{\"wander\": {\"x.rate\": 1}}}}",
     "rehearsal.json:1:32: error: \"x.rate\" is no block of this track"},
    {CART "{\"wander\": {\"x\": \"0.2 m2/s3\"}}}}",
     "rehearsal.json:1:37: error: the unit \"m2/s3\" is of another kind"},
    {CART "{\"wander\": {\"x\": -1}}}}",
     "rehearsal.json:1:37: error: the density -1 m2/s5 is below 0"},
    {CART "[{\"at\": 1, \"speed\": 1}]}}",
     "rehearsal.json:1:21: error: the track has 3 blocks and the move does "
     "not say which it moves"},
    {CART "[{\"of\": \"x\", \"at\": 1}]}}",
     "rehearsal.json:1:21: error: a move has one of jerk, accel, speed, to; "
     "this has 0"},
    {CART "[{\"of\": \"x\", \"at\": 1, \"speed\": 1, \"to\": 2}]}}",
     "rehearsal.json:1:21: error: a move has one of jerk, accel, speed, to; "
     "this has 2"},
    {CART "[{\"of\": \"x\", \"at\": 1, \"accel\": \"1 m/s2\"}]}}",
     "rehearsal.json:1:21: error: a jerk or an accel needs a time above 0"},
    {CART "[{\"of\": \"x\", \"at\": 1, \"accel\": \"1 m/s\", \"for\": 1}]}}",
     "rehearsal.json:1:51: error: the unit \"m/s\" is of another kind"},
    {CART "[{\"of\": \"x\", \"at\": 1, \"accel\": 1, \"for\": 2},\n"
          " {\"of\": \"x\", \"at\": \"2.5 s\", \"speed\": 0}]}}",
     "rehearsal.json:2:2: error: this move begins at 2.5 s, before the one "
     "above it ends at 3 s"},
    {CART "[{\"of\": \"y\", \"at\": 1, \"speed\": 1}]}}",
     "rehearsal.json:1:28: error: \"y\" is no block of this track"},
    {CART "[{\"of\": \"x\", \"at\": \"-1 s\", \"speed\": 1}]}}",
     "rehearsal.json:1:39: error: the time -1 s is outside 0 .. 1e9 s"},
    {CART "[]}, \"network\": {\"lasre\": {}}}",
     "rehearsal.json:1:37: error: \"lasre\" is no key here\n"},
    {CART "[]}, \"network\": {\"laser\": {\"dalay\": 1}}}",
     "rehearsal.json:1:47: error: \"dalay\" is no key here\n"},
    {CART "[]}, \"network\": {\"laser\": {\"delay\": [2, 1]}}}",
     "rehearsal.json:1:56: error: the first delay is longer"},
    {CART "[]}, \"network\": {\"laser\": {\"delay\": [2]}}}",
     "rehearsal.json:1:56: error: a delay is one time or two"},
    {CART "[]}, \"network\": {\"laser\": {\"loss\": 1.5}}}",
     "rehearsal.json:1:55: error: the share 1.5 is outside 0 .. 1"},
    {CART "[]}, \"network\": {\"laser\": {\"form\": \"xml\"}}}",
     "rehearsal.json:1:55: error: \"xml\" is no form of a datagram"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"laser\", "
          "\"freeze\": true}]}",
     "rehearsal.json:1:75: error: the fault \"freeze\" is not built yet"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"lasre\", "
          "\"silence\": true}]}",
     "rehearsal.json:1:66: error: \"lasre\" is no sensor of the rig"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"laser\"}]}",
     "rehearsal.json:1:36: error: a fault has one of jump, silence"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"sensor\": \"laser\", "
          "\"jump\": 1}]}",
     "rehearsal.json:1:36: error: the fault has no \"for\""},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"tower-a\", "
          "\"jump\": 1}]}",
     "rehearsal.json:1:85: error: tower-a reads 2 components"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"laser\", "
          "\"silence\": false}]}",
     "rehearsal.json:1:86: error: silence is true or it is not there"},
    {CART "[]}, \"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"laser\", "
          "\"track\": \"raft-1\", \"jump\": 1}]}",
     "rehearsal.json:1:84: error: \"raft-1\" is no track of the truth"},
};

enum { N_WRONGS = sizeof wrongs / sizeof *wrongs };

static status parse(const char *text, const char *const *left_out,
                    struct problems *problems)
{
    struct play_case c;
    case_rig_init(&c);
    const struct scene_source from = {&c.settings->rig, "rehearsal.json",
                                      left_out};
    problems_init(problems);
    status st = scene_parse(&c.scene, &from, text, strlen(text), problems);
    ck_assert((st == ST_OK) == (c.scene != NULL));
    case_fini(&c);
    return st;
}

START_TEST(what_is_wrong_is_told_with_its_place)
{
    struct problems problems;
    const struct wrong *w = &wrongs[_i];
    ck_assert_int_ne(parse(w->text, NULL, &problems), ST_OK);
    ck_assert_int_eq(problems.n, 1);
    ck_assert_msg(strncmp(problems.text, w->report, strlen(w->report)) == 0,
                  "%s\nexpected: %s", problems.text, w->report);
    problems_fini(&problems);
}
END_TEST

START_TEST(all_problems_are_told_at_once)
{
    struct problems problems;
    ck_assert_int_ne(
        parse("{\"lasts\": 0, \"seed\": 1.5, \"x\": 1}", NULL, &problems),
        ST_OK);
    ck_assert_int_eq(problems.n, 4);
    problems_fini(&problems);
}
END_TEST

START_TEST(a_sensor_that_is_left_out_may_be_named)
{
    static const char *const left_out[] = {"radar", NULL};
    struct problems problems;
    ck_assert_int_eq(
        parse("{\"truth\": {\"cart\": []}, \"network\": {\"radar\": "
              "{\"delay\": 1}}, \"faults\": [{\"at\": 1, \"for\": 1, "
              "\"sensor\": \"radar\", \"silence\": true}]}",
              left_out, &problems),
        ST_OK);
    problems_fini(&problems);
}
END_TEST

START_TEST(comments_are_allowed)
{
    struct problems problems;
    ck_assert_int_eq(parse("// so\n{\"truth\": /* a\n cart */ "
                           "{\"cart\": []}}",
                           NULL, &problems),
                     ST_OK);
    problems_fini(&problems);
}
END_TEST

/* Every beginning of a sound file is refused without harm. */
START_TEST(no_truncated_file_does_harm)
{
    static const char text[] =
        CART "{\"start\": {\"x\": {\"mean\": 3, \"u\": \"1 mm\"}}, \"moves\": "
             "[{\"of\": \"x\", \"at\": 1, \"jerk\": -2, \"for\": 0.5}]}}, "
             "\"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"laser\", "
             "\"jump\": 1}], \"network\": {\"laser\": {\"delay\": [1, 2]}}}";
    struct problems problems;
    char part[sizeof text];
    for (size_t len = 0; len < sizeof text - 1; len += 3) {
        snprintf(part, sizeof part, "%.*s", (int)len, text);
        ck_assert_int_ne(parse(part, NULL, &problems), ST_OK);
        ck_assert_int_ge(problems.n, 1);
        problems_fini(&problems);
    }
    ck_assert_int_eq(parse(text, NULL, &problems), ST_OK);
    problems_fini(&problems);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("scene_load");
    TCase *t = tcase_create("load");
    tcase_set_timeout(t, 120); /* each load reads the table of units        */
    tcase_add_loop_test(t, what_is_wrong_is_told_with_its_place, 0, N_WRONGS);
    tcase_add_test(t, all_problems_are_told_at_once);
    tcase_add_test(t, a_sensor_that_is_left_out_may_be_named);
    tcase_add_test(t, comments_are_allowed);
    tcase_add_test(t, no_truncated_file_does_harm);
    suite_add_tcase(s, t);
    return s;
}
