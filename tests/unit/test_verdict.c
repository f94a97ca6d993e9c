/* What the verdict says when sensors fall silent, send nothing, or disagree. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/support/drive.h"

#define MS    1000000
#define START ((int64_t)1700000000 * 1000000000)

static const char tank[] =
    "{\"tracks\": {\"tank\": {\"state\": {\"model\": \"random-walk\","
    " \"name\": \"T\", \"unit\": \"degC\", \"q\": \"1e-4 K2/s\"},"
    " \"lost\": {\"after\": \"2 s\"}}},"
    " \"sensors\": {\"a\": {\"reads\": \"T\", \"u\": \"0.1 K\","
    " \"rate\": \"10 Hz\"}, \"b\": {\"like\": \"a\"}%s}}";

static void init(struct drive *d, const char *more)
{
    char text[1024];
    snprintf(text, sizeof text, tank, more);
    drive_init(d, text);
    d->keeps_text = true;
    drive_start(d, START);
}

static void say(struct drive *d, int64_t at_ms, const char *sensor,
                const char *z)
{
    int64_t t_ns = START + at_ms * MS;
    drive_feed(d, t_ns, "{\"sensor\":\"%s\",\"ns\":%lld,\"z\":%s}", sensor,
               (long long)t_ns, z);
}

static bool has(const struct drive *d, const char *text)
{
    return strstr(d->all, text) != NULL;
}

/* The last verdict that was said in an event. */
static const char *last_verdict(const struct drive *d)
{
    static char word[16];
    const char *at = d->all, *next;
    word[0] = 0;
    while ((next = strstr(at, "\"event\":\"verdict\"")) != NULL) {
        const char *verdict = strstr(next, "\"verdict\":\"");
        sscanf(verdict + 11, "%15[a-z]", word);
        at = next + 1;
    }
    return word;
}

/* A null keeps the sensor alive, and the estimate is predicted all the same:
 * a lost track stays lost, and one that hears only nulls gets lost. */
START_TEST(nulls_are_no_news)
{
    struct drive d;
    init(&d, "");
    for (int i = 0; i < 20; i++) {
        say(&d, 100 * i, "a", "20.0");
        say(&d, 100 * i + 1, "b", "20.1");
    }
    ck_assert(!has(&d, "\"verdict\":\"coasting\""));
    for (int i = 20; i < 35; i++)
        say(&d, 100 * i, "a", "null");
    ck_assert_str_eq(last_verdict(&d), "coasting");
    for (int i = 35; i < 60; i++)
        say(&d, 100 * i, "a", "null");
    ck_assert_str_eq(last_verdict(&d), "lost");
    run_advance(d.run, START + 9000 * (int64_t)MS); /* a falls silent again */
    ck_assert_str_eq(last_verdict(&d), "lost");
    say(&d, 9100, "a", "20.0");
    ck_assert_str_ne(last_verdict(&d), "lost");
    drive_fini(&d);
}
END_TEST

/* One of two says another unit: both stay under suspicion, and it is named. */
START_TEST(of_two_that_disagree_neither_is_believed)
{
    struct drive d;
    init(&d, "");
    for (int i = 0; i < 50; i++) {
        say(&d, 100 * i, "a", i == 0 ? "20.0" : "20.05");
        say(&d, 100 * i + 1, "b", i < 10 ? "20.0" : "68.0");
    }
    ck_assert(has(&d, "\"event\":\"set-aside\""));
    ck_assert(has(&d, "\"set-aside:b\""));
    ck_assert_str_eq(last_verdict(&d), "doubtful");
    ck_assert(!has(&d, "\"event\":\"widened\""));
    for (int i = 50; i < 80; i++) { /* mended */
        say(&d, 100 * i, "a", "20.0");
        say(&d, 100 * i + 1, "b", "20.0");
    }
    ck_assert(has(&d, "\"event\":\"taken-back\""));
    ck_assert_str_eq(last_verdict(&d), "good");
    drive_fini(&d);
}
END_TEST

START_TEST(two_that_agree_are_believed_against_one)
{
    struct drive d;
    init(&d, ", \"c\": {\"like\": \"a\"}");
    for (int i = 0; i < 60; i++) {
        say(&d, 100 * i, "a", "20.0");
        say(&d, 100 * i + 1, "b", i < 10 ? "20.0" : "68.0");
        say(&d, 100 * i + 2, "c", "20.1");
    }
    ck_assert(has(&d, "\"set-aside:b\""));
    ck_assert_str_eq(last_verdict(&d), "good");
    drive_fini(&d);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("verdict");
    TCase *t = tcase_create("verdict");
    tcase_add_test(t, nulls_are_no_news);
    tcase_add_test(t, of_two_that_disagree_neither_is_believed);
    tcase_add_test(t, two_that_agree_are_believed_against_one);
    suite_add_tcase(s, t);
    return s;
}
