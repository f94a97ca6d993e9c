/* Places in the text of a rig file, and the reports that show them. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cJSON.h>
#include <stdio.h>
#include <string.h>

#include "config/syntax.h"
#include "config/textpos.h"
#include "tests/suite.h"

START_TEST(comments_become_blanks_of_the_same_length)
{
    char text[] = "{ // one \"\n \"a//b\": /* x\n * / y */ \"\\\"/*\" }//";
    const char *want = "{         \n \"a//b\":     \n          \"\\\"/*\" }  ";
    ck_assert_int_eq(textpos_strip(text, strlen(text)), TEXTPOS_NONE);
    ck_assert_str_eq(text, want);
}
END_TEST

START_TEST(a_comment_without_an_end_is_found)
{
    char text[] = "{} /* x *", slash[] = "{} /*/";
    ck_assert_int_eq(textpos_strip(text, strlen(text)), 3);
    ck_assert_int_eq(textpos_strip(slash, strlen(slash)), 3);
}
END_TEST

/* RFC 3629: overlong forms, surrogates, beyond U+10FFFF, cut sequences. */
START_TEST(bytes_that_are_not_utf8_are_found)
{
    static const char *const wrong[] = {"ab\x80",
                                        "ab\xc0\xaf",
                                        "ab\xc1\xbf",
                                        "ab\xe0\x9f\xbf",
                                        "ab\xed\xa0\x80",
                                        "ab\xf0\x8f\xbf\xbf",
                                        "ab\xf4\x90\x80\x80",
                                        "ab\xf5\x80\x80\x80",
                                        "ab\xc3",
                                        "ab\xe2\x82",
                                        "ab\xff"};
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++)
        ck_assert_int_eq(textpos_bad_utf8(wrong[i], strlen(wrong[i])), 2);
    const char *good = "\xc2\x80\xe0\xa0\x80\xed\x9f\xbf\xf0\x90\x80\x80"
                       "\xf4\x8f\xbf\xbf";
    ck_assert_int_eq(textpos_bad_utf8(good, strlen(good)), TEXTPOS_NONE);
    ck_assert_int_eq(textpos_bad_utf8("a\0b", 3), 1);
}
END_TEST

/* The text that begins where the tree says a value is. */
static const char *at(const char *text, const cJSON *node)
{
    ck_assert_ptr_nonnull(node);
    return text + node->valueint;
}

START_TEST(every_value_knows_its_place)
{
    const char *text = " {\"a\" : [1, {\"b\": \"]}\\\",\"}, [], {}, true],\n"
                       "\"c\":{\"d\": -2.5 } , \"e\": null}";
    cJSON *tree = cJSON_Parse(text);
    textpos_mark(tree, text);
    const cJSON *a = cJSON_GetObjectItem(tree, "a");
    const cJSON *c = cJSON_GetObjectItem(tree, "c");
    const cJSON *b = cJSON_GetObjectItem(cJSON_GetArrayItem(a, 1), "b");
    const cJSON *d = cJSON_GetObjectItem(c, "d");
    ck_assert_int_eq(tree->valueint, 1);
    ck_assert_int_eq(strncmp(at(text, a), "[1, {", 5), 0);
    ck_assert_int_eq(strncmp(at(text, cJSON_GetArrayItem(a, 0)), "1, ", 3), 0);
    ck_assert_int_eq(strncmp(at(text, b), "\"]}\\\"", 5), 0);
    ck_assert_int_eq(strncmp(at(text, cJSON_GetArrayItem(a, 2)), "[]", 2), 0);
    ck_assert_int_eq(strncmp(at(text, cJSON_GetArrayItem(a, 4)), "true", 4), 0);
    ck_assert_int_eq(strncmp(at(text, c), "{\"d\"", 4), 0);
    ck_assert_int_eq(strncmp(at(text, d), "-2.5", 4), 0);
    ck_assert_int_eq(
        strncmp(at(text, cJSON_GetObjectItem(tree, "e")), "null}", 5), 0);
    const char *key = text + textpos_key(text, (size_t)d->valueint);
    ck_assert_int_eq(strncmp(key, "\"d\"", 3), 0);
    key = text + textpos_key(text, (size_t)a->valueint);
    ck_assert_int_eq(strncmp(key, "\"a\" :", 5), 0);
    ck_assert_uint_eq(textpos_key(text, 1), 1);
    cJSON_Delete(tree);
}
END_TEST

static void count(void *ctx, size_t offset, const char *name)
{
    char *said = ctx;
    size_t n = strlen(said);
    snprintf(said + n, 200 - n, "%zu:%s ", offset, name);
}

START_TEST(a_key_that_stands_twice_is_found_in_its_own_object_only)
{
    char said[200] = "";
    textpos_duplicates("{\"a\":{\"a\":1},\"b\":[{\"a\":1},{\"a\":2}]}", count,
                       said);
    ck_assert_str_eq(said, "");
    textpos_duplicates("{\"a\":{\"x\":1,\"x\":2},\"b\":\"a\",\"\\u0061\":1}",
                       count, said);
    ck_assert_str_eq(said, "27:a 12:x ");
}
END_TEST

START_TEST(columns_count_characters_not_bytes)
{
    const char *text = "ab\n\xc3\xa4\xe2\x82\xac x";
    int line, column;
    textpos_place(text, strlen(text), 9, &line, &column);
    ck_assert_int_eq(line, 2);
    ck_assert_int_eq(column, 4);
}
END_TEST

START_TEST(a_report_shows_the_line_and_a_caret)
{
    const char *text = "{\n  \"\xc3\xa4\": 5\n}\n";
    struct problems p;
    problems_init(&p);
    const struct textpos_report r = {"rig.json", text, strlen(text),
                                     "five is odd", "give 4"};
    textpos_report(&p, &r, 10);
    ck_assert_int_eq(p.n, 1);
    ck_assert_str_eq(p.text, "rig.json:2:8: error: five is odd\n"
                             "     2 |   \"\xc3\xa4\": 5\n"
                             "       |        ^\n"
                             "       = give 4\n");
    problems_fini(&p);
}
END_TEST

START_TEST(reports_beyond_the_maximum_are_counted_and_said_once)
{
    struct problems p;
    problems_init(&p);
    for (int i = 0; i < 3 * PROBLEMS_MAX; i++)
        problems_append(&p, "x\n");
    ck_assert_int_eq(p.n, 3 * PROBLEMS_MAX);
    ck_assert_uint_lt(p.len, 2 * PROBLEMS_MAX + 200);
    ck_assert_ptr_nonnull(strstr(p.text, "more problems are not shown"));
    problems_fini(&p);
}
END_TEST

START_TEST(the_nearest_name_is_at_most_two_edits_away)
{
    static const char *const list[] = {"unit", "resolution", "u", "gate", NULL};
    ck_assert_str_eq(textpos_nearest("unti", list), "unit");
    ck_assert_str_eq(textpos_nearest("resoluton", list), "resolution");
    ck_assert_str_eq(textpos_nearest("rasoluton", list), "resolution");
    ck_assert_str_eq(textpos_nearest("gat", list), "gate");
    ck_assert_ptr_null(textpos_nearest("rasolutom", list));
    ck_assert_ptr_null(textpos_nearest("x", list));
}
END_TEST

/* RFC 8259, and what a parser behind it would have let pass. */
START_TEST(text_that_is_not_json_is_refused_at_its_place)
{
    static const struct {
        const char *text;
        int at; /* -1: sound */
    } cases[] = {{"{}", -1},         {" [ ] ", -1},   {"{\"a\":[{},[]]}", -1},
                 {"-0.5e+3", -1},    {"{\"a\":}", 5}, {"{\"a\":1,}", 7},
                 {"[1,]", 3},        {"[1 2]", 3},    {"{\"a\" 1}", 5},
                 {"{a:1}", 1},       {"01", 0},       {"1.", 0},
                 {"-", 0},           {"1e", 0},       {"1e999", 0},
                 {"\"a\nb\"", 2},    {"\"\\x\"", 2},  {"\"\\u12g4\"", 2},
                 {"\"\\u0000\"", 2}, {"[1}", 2},      {"{\"a\":1]", 6},
                 {"{\"a\":1", 6},    {"", 0},         {"tru", 0},
                 {"1 1", 2},         {"+1", 0},       {"NaN", 0},
                 {"\"abc", 4},       {"[[1],", 5},    {"{\"a\":1,,}", 7}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        size_t place = 0;
        const char *what = NULL;
        bool is_sound = syntax_check(cases[i].text, &place, &what);
        ck_assert_msg(is_sound == (cases[i].at < 0), "%s", cases[i].text);
        if (is_sound)
            continue;
        ck_assert_msg((int)place == cases[i].at, "%s at %zu: %s", cases[i].text,
                      place, what);
        ck_assert_ptr_nonnull(strstr(what, "; "));
    }
}
END_TEST

START_TEST(nesting_is_bounded)
{
    char text[200];
    size_t place;
    const char *what;
    memset(text, '[', sizeof text - 1);
    text[sizeof text - 1] = '\0';
    ck_assert(!syntax_check(text, &place, &what));
    ck_assert_uint_eq(place, TEXTPOS_DEPTH_MAX);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("textpos");
    TCase *t = tcase_create("textpos");
    tcase_add_test(t, comments_become_blanks_of_the_same_length);
    tcase_add_test(t, a_comment_without_an_end_is_found);
    tcase_add_test(t, bytes_that_are_not_utf8_are_found);
    tcase_add_test(t, every_value_knows_its_place);
    tcase_add_test(t, a_key_that_stands_twice_is_found_in_its_own_object_only);
    tcase_add_test(t, columns_count_characters_not_bytes);
    tcase_add_test(t, a_report_shows_the_line_and_a_caret);
    tcase_add_test(t, reports_beyond_the_maximum_are_counted_and_said_once);
    tcase_add_test(t, the_nearest_name_is_at_most_two_edits_away);
    tcase_add_test(t, text_that_is_not_json_is_refused_at_its_place);
    tcase_add_test(t, nesting_is_bounded);
    suite_add_tcase(s, t);
    return s;
}
