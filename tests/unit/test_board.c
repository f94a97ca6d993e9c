/* The table of newest estimates: what it shows after messages. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "tests/suite.h"
#include "tools/board.h"

#define ESTIMATE                                                                \
    "{\"type\":\"estimate\",\"track\":\"tank\",\"t\":\"2026-05-04T10:00:00Z\"," \
    "\"x\":[20.5],\"u\":[0.1],\"verdict\":\"good\",\"why\":[]}"

/* What a terminal without styles would get; the caller frees it. */
static char *drawn(struct board *b)
{
    char *text = NULL;
    size_t len;
    FILE *to = open_memstream(&text, &len);
    board_draw(b, to, false);
    fclose(to);
    return text;
}

static void expect(struct board *b, const char *has, const char *lacks)
{
    char *text = drawn(b);
    ck_assert_msg(strstr(text, has) != NULL, "%s", text);
    ck_assert_msg(lacks == NULL || strstr(text, lacks) == NULL, "%s", text);
    free(text);
}

START_TEST(a_verdict_that_changes_is_shown_without_an_estimate)
{
    struct board *b = board_new();
    board_take(b, ESTIMATE);
    expect(b, "tank                 good", NULL);
    board_take(b,
               "{\"type\":\"event\",\"event\":\"verdict\",\"track\":\"tank\","
               "\"t\":\"2026-05-04T10:00:05Z\",\"verdict\":\"lost\","
               "\"was\":\"good\",\"why\":[\"silent:ntc\"]}");
    expect(b, "tank                 lost", "good");
    expect(b, "silent:ntc", NULL);
    expect(b, "verdict tank lost", NULL);
    board_free(b);
}
END_TEST

START_TEST(after_the_connection_nothing_counts_as_current)
{
    struct board *b = board_new();
    board_take(b, ESTIMATE);
    board_close(b);
    expect(b, "(old)", "good");
    expect(b, "nothing above is current", NULL);
    board_take(b, ESTIMATE);
    expect(b, "tank                 good", "(old)");
    board_free(b);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("board");
    TCase *t = tcase_create("board");
    tcase_add_test(t, a_verdict_that_changes_is_shown_without_an_estimate);
    tcase_add_test(t, after_the_connection_nothing_counts_as_current);
    suite_add_tcase(s, t);
    return s;
}
