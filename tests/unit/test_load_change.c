/* Changes of single settings: blocks by name, what is refused, no memory. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cJSON.h>
#include <stdlib.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/unit/load_case.h"

static const char text[] =
    "{\"tracks\": {\"carriage\": {\"state\": [\n"
    "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\",\n"
    "   \"unmodelled\": {\"accel\": \"1 m/s2\", \"lasts\": \"0.2 s\"}},\n"
    "  {\"model\": \"constant\", \"name\": \"wheel\", \"unit\": \"1\"}]}},\n"
    " \"sensors\": {\"laser\": {\"reads\": \"x\", \"u\": \"2 mm\"}}}";

static void expect_refusal(const char *path, const char *value,
                           const char *want)
{
    const struct settings_change change = {path, value};
    struct settings *s;
    char *said = load_text(&s, text, &change, 1);
    ck_assert_ptr_null(s);
    ck_assert_str_eq(said, want);
    free(said);
}

START_TEST(a_block_is_named_by_its_name_or_its_place)
{
    static const struct settings_change changes[] = {
        {"tracks.carriage.state.wheel.unit", "%"},
        {"tracks.carriage.state.0.unmodelled.accel", "3 m/s2"},
        {"tracks.carriage.state.x.unmodelled.lasts", "0.5 s"}};
    struct settings *s;
    char *said = load_text(&s, text, changes, 3);
    ck_assert_str_eq(said, "");
    free(said);
    const struct rig_kind *k = &s->rig.kind[0];
    ck_assert_double_eq_tol(k->block[0].q, 4.5, 1e-12); /* 3^2 0.5 */
    ck_assert_str_eq(k->state[2].unit, "%");
    settings_free(s);
}
END_TEST

START_TEST(a_block_that_is_not_there_is_refused)
{
    expect_refusal(
        "tracks.carriage.state.heel.unit", "m",
        "--set tracks.carriage.state.heel.unit: error: there is no "
        "\"heel.unit\"\n"
        "       = join keys by dots, a block by its name or place from 0\n");
}
END_TEST

START_TEST(a_number_inside_a_unit_is_refused)
{
    expect_refusal("order.horizon", "500 9s",
                   "--set order.horizon: error: the unit \"9s\" holds a "
                   "number\n       = digits in a unit are powers, like m/s2\n");
    expect_refusal("sensors.laser.unit", "3 mm",
                   "--set sensors.laser.unit: error: the unit \"3 mm\" holds a "
                   "number\n       = digits in a unit are powers, like m/s2\n");
}
END_TEST

START_TEST(a_delay_that_reaches_the_horizon_is_refused)
{
    expect_refusal("sensors.laser.time.delay", "0.5 s",
                   "--set sensors.laser.time.delay: error: a delay of 500 ms "
                   "reaches the horizon of 500 ms: all would be too late\n"
                   "       = make order.horizon longer\n");
}
END_TEST

START_TEST(a_stamp_that_is_planned_is_refused_by_name)
{
    expect_refusal("sensors.laser.time.stamp", "counter",
                   "--set sensors.laser.time.stamp: error: \"counter\" is "
                   "planned but not built yet\n"
                   "       = use another stamp\n");
}
END_TEST

START_TEST(the_meaning_of_a_wrong_type_is_one_clause)
{
    expect_refusal("tracks.carriage.start.at", "5",
                   "--set tracks.carriage.start.at: error: \"at\" must be a "
                   "text in quotation marks\n       = meant here: time of the "
                   "start, \"2026-05-04T10:00:00Z\"\n");
}
END_TEST

static long allocations_left;

static void *allocate(size_t n)
{
    return allocations_left-- > 0 ? malloc(n) : NULL;
}

/* The 1st, 2nd, 3rd ... allocation of the tree fails, and all after it. */
START_TEST(a_tree_that_gets_no_memory_is_said_and_never_half_loaded)
{
    static const struct settings_change changes[] = {
        {"sensors.laser.u", "5 cm"},
        {"order", "{\"hold\": \"1 ms\"}"},
        {"order.hold", "2 ms"},
        {"clock.wait", "3 s"},
        {"sensors.other", "{\"like\": \"laser\"}"}};
    cJSON_Hooks hooks = {allocate, free};
    status st = ST_NOMEM;
    long n = 0;
    cJSON_InitHooks(&hooks);
    for (; st != ST_OK && n < 1000; n++) {
        struct problems p;
        struct settings *s;
        problems_init(&p);
        allocations_left = n;
        st = settings_parse(&s, "rig.json", text, strlen(text), changes, 5, &p);
        ck_assert_msg(st == ST_OK || st == ST_NOMEM, "%ld: %s", n, p.text);
        ck_assert((s != NULL) == (st == ST_OK));
        ck_assert((p.n == 0) == (st == ST_OK));
        settings_free(s);
        problems_fini(&p);
    }
    cJSON_InitHooks(NULL);
    ck_assert_int_eq(st, ST_OK);
    ck_assert_int_gt(n, 40);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load_change");
    TCase *t = tcase_create("load_change");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_block_is_named_by_its_name_or_its_place);
    tcase_add_test(t, a_block_that_is_not_there_is_refused);
    tcase_add_test(t, a_number_inside_a_unit_is_refused);
    tcase_add_test(t, a_delay_that_reaches_the_horizon_is_refused);
    tcase_add_test(t, a_stamp_that_is_planned_is_refused_by_name);
    tcase_add_test(t, the_meaning_of_a_wrong_type_is_one_clause);
    tcase_add_test(t, a_tree_that_gets_no_memory_is_said_and_never_half_loaded);
    suite_add_tcase(s, t);
    return s;
}
