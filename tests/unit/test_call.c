/* The command line of the tool: rows in, options and arguments out. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/suite.h"

#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "tools/call.h"
#include "tools/csv.h"
#include "tools/import.h"
#include "tools/instant.h"

static int do_nothing(const struct call *call)
{
    (void)call;
    return EXIT_FINE;
}

static const struct option_row rows[] = {
    {"seed", "N", "a number", false},
    {"map", "A=B", "a pair", true},
    {"json", NULL, "a flag", false},
    {NULL, NULL, NULL, false},
};

static const struct verb verb = {
    .name = "try",
    .summary = "tries",
    .arguments = "A [B]",
    .min_args = 1,
    .max_args = 2,
    .text = "Tries.",
    .examples = "ropewalk try a",
    .options = rows,
    .run = do_nothing,
};

static struct call call;
static char said[4096];

/* Parses words split at blanks; what goes to stderr stands in `said`. */
static int parse(const char *line)
{
    static char words[512];
    static char *argv[64];
    int argc = 0;
    snprintf(words, sizeof words, "ropewalk try %s", line);
    for (char *word = words, *rest; word != NULL; word = rest) {
        rest = strchr(word, ' ');
        if (rest != NULL)
            *rest++ = '\0';
        if (*word != '\0')
            argv[argc++] = word;
    }
    fflush(stderr);
    int kept = dup(STDERR_FILENO);
    FILE *into = tmpfile();
    dup2(fileno(into), STDERR_FILENO);
    int code = call_parse(&call, &verb, argc, argv);
    fflush(stderr);
    dup2(kept, STDERR_FILENO);
    close(kept);
    rewind(into);
    said[fread(said, 1, sizeof said - 1, into)] = '\0';
    fclose(into);
    return code;
}

static void forget(void)
{
    call_fini(&call);
}

START_TEST(options_may_stand_before_between_and_after_arguments)
{
    ck_assert_int_eq(parse("--seed 7 a --json b"), EXIT_FINE);
    ck_assert_int_eq(call_n_args(&call), 2);
    ck_assert_str_eq(call_arg(&call, 0), "a");
    ck_assert_str_eq(call_arg(&call, 1), "b");
    ck_assert_ptr_null(call_arg(&call, 2));
    ck_assert_str_eq(call_option(&call, "seed"), "7");
    ck_assert_str_eq(call_option(&call, "json"), "");
    ck_assert_ptr_null(call_option(&call, "map"));
}
END_TEST

START_TEST(an_equals_sign_gives_the_value_too)
{
    ck_assert_int_eq(parse("a --map=x=1 --map y=2"), EXIT_FINE);
    ck_assert_str_eq(call_option_at(&call, "map", 0), "x=1");
    ck_assert_str_eq(call_option_at(&call, "map", 1), "y=2");
    ck_assert_ptr_null(call_option_at(&call, "map", 2));
}
END_TEST

START_TEST(a_negative_number_is_an_argument)
{
    ck_assert_int_eq(parse("laser -1.25"), EXIT_FINE);
    ck_assert_str_eq(call_arg(&call, 1), "-1.25");
    forget();
    ck_assert_int_eq(parse("laser -.5"), EXIT_FINE);
    ck_assert_str_eq(call_arg(&call, 1), "-.5");
}
END_TEST

START_TEST(two_dashes_end_the_options)
{
    ck_assert_int_eq(parse("-- --json -x"), EXIT_FINE);
    ck_assert_str_eq(call_arg(&call, 0), "--json");
    ck_assert_ptr_null(call_option(&call, "json"));
}
END_TEST

START_TEST(help_is_taken_without_any_argument)
{
    ck_assert_int_eq(parse("--help"), EXIT_FINE);
    ck_assert(call.wants_help);
    forget();
    ck_assert_int_eq(parse("-h"), EXIT_FINE);
    ck_assert(call.wants_help);
}
END_TEST

static const struct {
    const char *line, *says;
} wrong[] = {
    {"a --sede 7", "ropewalk try: --sede: no such option; did you mean "
                   "--seed?\n"},
    {"a --jsom", "ropewalk try: --jsom: no such option; did you mean "
                 "--json?\n"},
    {"a --colour", "ropewalk try: --colour: no such option; see the list in "
                   "ropewalk try --help\n"},
    {"a --seed", "ropewalk try: --seed: needs a value; write --seed N\n"},
    {"a --seed --json", "ropewalk try: --seed: needs a value; write --seed "
                        "N\n"},
    {"a --json=1", "ropewalk try: --json: takes no value; write it alone\n"},
    {"a --seed 1 --seed 2", "ropewalk try: --seed: given twice; leave one "
                            "out\n"},
    {"", "ropewalk try: 0 arguments given, 1 needed\nusage: ropewalk try A "
         "[B] [options]\n"},
    {"a b c", "ropewalk try: argument 'c' is one too many\nusage: ropewalk try "
              "A [B] [options]\n"},
};

START_TEST(wrong_use_is_64_with_one_sentence_and_a_remedy)
{
    ck_assert_int_eq(parse(wrong[_i].line), EXIT_WRONG_USE);
    ck_assert_str_eq(said, wrong[_i].says);
}
END_TEST

START_TEST(numbers_and_times_are_read_or_refused)
{
    bool bad = false;
    ck_assert_int_eq(parse("a --seed 12.5"), EXIT_FINE);
    ck_assert_double_eq_tol(call_number(&call, "seed", 1, &bad), 12.5, 1e-15);
    ck_assert_double_eq_tol(call_number(&call, "none", 3, &bad), 3, 1e-15);
    ck_assert(!bad);
    forget();
    ck_assert_int_eq(parse("a --seed twelve"), EXIT_FINE);
    ck_assert_double_eq_tol(call_number(&call, "seed", 1, &bad), 1, 1e-15);
    ck_assert(bad);
}
END_TEST

static const char *fruit(const void *ctx, int i)
{
    static const char *const names[] = {"apple", "pear", "plum", "fig", NULL};
    (void)ctx;
    return names[i];
}

START_TEST(the_nearest_name_allows_two_letters_and_a_swap)
{
    ck_assert_str_eq(call_nearest("aplpe", fruit, NULL), "apple");
    ck_assert_str_eq(call_nearest("paer", fruit, NULL), "pear");
    ck_assert_str_eq(call_nearest("pllums", fruit, NULL), "plum");
    ck_assert_str_eq(call_nearest("fgi", fruit, NULL), "fig");
    ck_assert_ptr_null(call_nearest("cherry", fruit, NULL));
    ck_assert_ptr_null(call_nearest("", fruit, NULL));
}
END_TEST

START_TEST(every_verb_has_a_summary_text_and_examples)
{
    for (int i = 0; verb_list[i] != NULL; i++) {
        ck_assert_int_gt((int)strlen(verb_list[i]->summary), 10);
        ck_assert_int_gt((int)strlen(verb_list[i]->text), 20);
        ck_assert_int_eq(strncmp(verb_list[i]->examples, "ropewalk ", 9), 0);
        ck_assert_ptr_eq(verb_find(verb_list[i]->name), verb_list[i]);
    }
}
END_TEST

static const struct {
    const char *text;
    bool is_time;
    int64_t t_ns;
} instants[] = {
    {"1000000000", true, 1000000000000000000},
    {"1000000000.123456789", true, 1000000000123456789},
    {"0.1", true, 100000000},
    {"-0.5", true, -500000000},
    {"2001-09-09T01:46:40Z", true, 1000000000000000000},
    {"2001-09-09T01:46:40.000000001Z", true, 1000000000000000001},
    {"9223372036.854775807", true, INT64_MAX},
    {"9223372036.854775808", false, 0},
    {"", false, 0},
    {"-", false, 0},
    {"1.", false, 0},
    {"12 s", false, 0},
    {"yesterday", false, 0},
};

START_TEST(an_instant_is_exact_to_the_nanosecond)
{
    int64_t t_ns = 0;
    const char *text = instants[_i].text;
    ck_assert_int_eq(instant_parse(text, strlen(text), &t_ns),
                     instants[_i].is_time);
    if (instants[_i].is_time)
        ck_assert_int_eq(t_ns, instants[_i].t_ns);
}
END_TEST

/* One heading and one row; returns the status, fills *row. */
static status one_row(const char *text, struct import_row *row, struct err *err)
{
    static struct csv_line line;
    struct csv csv;
    struct import_columns columns;
    csv_init(&csv, text, strlen(text));
    ck_assert(csv_next(&csv, &line));
    status code = import_heading(&columns, &line, NULL, 0, false, err);
    if (code != ST_OK)
        return code;
    ck_assert(csv_next(&csv, &line));
    return import_parse(&columns, &line, row, err);
}

START_TEST(a_row_with_empty_fields_has_fewer_components)
{
    struct import_row row;
    struct err err;
    ck_assert_int_eq(one_row("time_ns,arrival_ns,sensor,z0,z1,z2,z3\r\n"
                             "# a remark\n\n"
                             "5,9,\"a-1\",1.5,,-2e-3,\r\n",
                             &row, &err),
                     ST_OK);
    ck_assert_int_eq(row.m.t_ns, 5);
    ck_assert_int_eq(row.arrival_ns, 9);
    ck_assert_int_eq(row.m.n_z, 3);
    ck_assert_double_eq_tol(row.m.z[0], 1.5, 1e-15);
    ck_assert(row.m.z[1] != row.m.z[1]);
    ck_assert_double_eq_tol(row.m.z[2], -2e-3, 1e-15);
    ck_assert_int_eq(row.m.sensor.len, 3);
}
END_TEST

START_TEST(an_empty_arrival_is_the_stamp)
{
    struct import_row row;
    struct err err;
    ck_assert_int_eq(one_row("t,arrival,sensor,z0\n12.5,,a,1\n", &row, &err),
                     ST_OK);
    ck_assert_int_eq(row.arrival_ns, 12500000000);
    ck_assert(!row.has_arrival);
}
END_TEST

static const struct {
    const char *text, *says;
} bad_tables[] = {
    {"sensor,z0\na,1\n", "no column of time; name one time_ns, t, arrival_ns "
                         "or arrival, or rename one with --map"},
    {"t,z0\n1,1\n", "no column 'sensor'; add one, rename one with --map, or "
                    "give --sensor NAME"},
    {"t,sensor\n1,a\n", "no column 'z0'; name the readings z0, z1 .., or "
                        "rename one with --map"},
    {"t,sensor,z0,z9\n", "column 'z9': a sensor reads 8 components at most, 0 "
                         "to 7"},
    {"t,t,sensor,z0\n", "column 't' stands twice; leave one out"},
    {"t,sensor,z0\n1,a\n", "2 fields, the heading has 3; a decimal comma needs "
                           "quotes or a point"},
    {"t,sensor,z0\n,a,1\n", "no time; fill the stamp or the arrival"},
    {"t,sensor,z0\n1,a b,1\n", "'a b' is no name; use letters, digits and "
                               "_.:- only, 63 at most"},
    {"t,sensor,z0\n1,a,one\n", "'one' is no number; write it as 1.25 with a "
                               "point"},
    {"time_ns,sensor,z0\n1.5,a,1\n", "'1.5' is no whole number of nanoseconds; "
                                     "seconds belong into a column 't'"},
    {"t,sensor,z0,seq\n1,a,1,-2\n", "'-2' is no counter; seq is a whole number "
                                    "from 0"},
};

START_TEST(a_bad_table_says_what_is_wrong_and_what_to_do)
{
    struct import_row row;
    struct err err;
    ck_assert_int_eq(one_row(bad_tables[_i].text, &row, &err), ST_PARSE);
    ck_assert_str_eq(err.text, bad_tables[_i].says);
}
END_TEST

#define COUNT(a) ((int)(sizeof(a) / sizeof(a)[0]))

Suite *suite(void)
{
    Suite *s = suite_create("call");
    TCase *t = tcase_create("command line");
    tcase_add_checked_fixture(t, NULL, forget);
    tcase_add_test(t, options_may_stand_before_between_and_after_arguments);
    tcase_add_test(t, an_equals_sign_gives_the_value_too);
    tcase_add_test(t, a_negative_number_is_an_argument);
    tcase_add_test(t, two_dashes_end_the_options);
    tcase_add_test(t, help_is_taken_without_any_argument);
    tcase_add_loop_test(t, wrong_use_is_64_with_one_sentence_and_a_remedy, 0,
                        COUNT(wrong));
    tcase_add_test(t, numbers_and_times_are_read_or_refused);
    tcase_add_test(t, the_nearest_name_allows_two_letters_and_a_swap);
    tcase_add_test(t, every_verb_has_a_summary_text_and_examples);
    suite_add_tcase(s, t);
    t = tcase_create("tables");
    tcase_add_loop_test(t, an_instant_is_exact_to_the_nanosecond, 0,
                        COUNT(instants));
    tcase_add_test(t, a_row_with_empty_fields_has_fewer_components);
    tcase_add_test(t, an_empty_arrival_is_the_stamp);
    tcase_add_loop_test(t, a_bad_table_says_what_is_wrong_and_what_to_do, 0,
                        COUNT(bad_tables));
    suite_add_tcase(s, t);
    return s;
}
