/* The Nile by the tool's own commands: import, then replay.
 *
 * Source: Durbin and Koopman, Time Series Analysis by State Space Methods,
 * 2nd ed. 2012, 2.2.5 and 2.7; likelihoods and last state in 50-digit
 * arithmetic, equal to R 4.2.2. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/checks/replay.h"
#include "tests/suite.h"

#define RIG   "tests/data/rigs/nile.json"
#define TABLE "tests/data/nile_meas.csv"

struct last {
    int n; /* settled estimates                                           */
    double level, u, variance;
};

static void take(void *ctx, const cJSON *line)
{
    struct last *last = ctx;
    if (!replay_is_settled(line))
        return;
    last->n++;
    values_list(line, "x", &last->level, 1);
    values_list(line, "u", &last->u, 1);
    values_list(line, "P", &last->variance, 1);
}

static cJSON *replay(const char *table, struct last *last)
{
    const char *capture = replay_import(NULL, table);
    const char *lines = tool_path("a.jsonl");
    int code = TOOL("replay", RIG, capture, "--out", lines);
    ck_assert_msg(code == 0, "replay: %s", tool_said);
    memset(last, 0, sizeof *last);
    return replay_lines(lines, take, last);
}

static void check_summary(const cJSON *summary, double loglik, int n)
{
    const cJSON *track = values_at(values_at(summary, "tracks"), "nile");
    const cJSON *used = values_at(
        values_at(values_at(values_at(summary, "counts"), "measurements"),
                  "total"),
        "used");
    ck_assert_double_le(fabs(values_number(track, "loglik") - loglik), 1e-9);
    ck_assert_int_eq((int)values_number(track, "measurements"), n);
    ck_assert_int_eq((int)used->valuedouble, n);
}

START_TEST(the_whole_record_has_the_published_likelihood_and_last_level)
{
    struct last last;
    cJSON *summary = replay(TABLE, &last);
    check_summary(summary, -641.5855784594153, 100);
    ck_assert_int_eq(last.n, 100);
    ck_assert_double_le(fabs(last.level - 798.3702926083641), 1e-9);
    ck_assert_double_le(fabs(last.variance - 4032.157941808476), 1e-8);
    ck_assert_double_le(fabs(last.u - sqrt(4032.157941808476)), 1e-10);
    cJSON_Delete(summary);
}
END_TEST

/* The table without the years 21-40 and 61-80. */
static const char *table_with_gaps(void)
{
    char *text = values_text(TABLE), *next = NULL;
    char *kept = calloc(1, strlen(text) + 1);
    size_t len = 0;
    int year = 0; /* 0 is the heading */
    for (char *line = text; *line != '\0'; line = next, year++) {
        next = strchr(line, '\n') + 1;
        if ((year > 20 && year <= 40) || (year > 60 && year <= 80))
            continue;
        memcpy(kept + len, line, (size_t)(next - line));
        len += (size_t)(next - line);
    }
    const char *path = tool_write("gaps.csv", kept);
    free(kept);
    free(text);
    return path;
}

START_TEST(missing_years_have_the_published_likelihood)
{
    struct last last;
    cJSON *summary = replay(table_with_gaps(), &last);
    check_summary(summary, -389.6269775255986, 60);
    ck_assert_int_eq(last.n, 60);
    cJSON_Delete(summary);
}
END_TEST

/* Any arrival within the horizon gives the same numbers: every third year
 * comes 1.5 s late. */
START_TEST(late_years_change_nothing)
{
    char *text = values_text(TABLE), *next = NULL, *out = NULL;
    size_t size = 0;
    FILE *to = open_memstream(&out, &size);
    ck_assert_ptr_nonnull(to);
    int year = 0;
    for (char *line = text; *line != '\0'; line = next, year++) {
        next = strchr(line, '\n') + 1;
        char *comma = strstr(line, ",,");
        long long t_ns = strtoll(line, NULL, 10);
        if (year == 0 || comma == NULL || year % 3 != 0)
            fprintf(to, "%.*s", (int)(next - line), line);
        else
            fprintf(to, "%lld,%lld,%.*s", t_ns, t_ns + 1500000000,
                    (int)(next - comma - 2), comma + 2);
    }
    fclose(to);
    struct last last;
    cJSON *summary = replay(tool_write("late.csv", out), &last);
    check_summary(summary, -641.5855784594153, 100);
    const cJSON *tallies = values_at(
        values_at(values_at(values_at(summary, "counts"), "measurements"),
                  "tallies"),
        "total");
    ck_assert_int_eq((int)values_number(tallies, "late"), 33);
    ck_assert_double_le(fabs(last.level - 798.3702926083641), 1e-9);
    cJSON_Delete(summary);
    free(text);
    free(out);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("nile by the tool");
    TCase *t = tcase_create("nile by the tool");
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_set_timeout(t, 30);
    tcase_add_test(
        t, the_whole_record_has_the_published_likelihood_and_last_level);
    tcase_add_test(t, missing_years_have_the_published_likelihood);
    tcase_add_test(t, late_years_change_nothing);
    suite_add_tcase(s, t);
    return s;
}
