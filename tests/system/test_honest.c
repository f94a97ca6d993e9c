/* Rehearsals of a rig whose sensors all err, through the tool's own commands:
 * is the truth inside U (k = 2) as often as it should be?
 *
 * `tools/dev campaign honest` takes 1,000 runs and one instant of each; CI
 * takes 60.  Each state is judged alone, against the 99.9 % range of a
 * binomial of 95.45 %. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>

#include "core/math/random.h"
#include "core/wire/decode.h"
#include "tests/checks/replay.h"
#include "tests/suite.h"

#define RIG "tests/data/rigs/errors.json"

enum { STATES = 6, RUNS = 60, RUNS_LONG = 1000, ROWS_MAX = 4000 };

/* In the order of the track's blocks, then of the sensors in the file. */
static const char *const names[STATES] = {
    "x", "x.rate", "laser.offset", "tape.noise", "wheel.scale", "slow.lag"};

/* Rows of the truth, 10 ms apart; columns as the description has them. */
static struct truth {
    int n;
    int64_t t_ns[ROWS_MAX];
    double x[ROWS_MAX][STATES];
} truth;

static void read_truth(const char *path)
{
    char *text = values_text(path), *line = strchr(text, '\n');
    truth.n = 0;
    while (line != NULL && line[1] != '\0' && truth.n < ROWS_MAX) {
        char *at = line + 1;
        truth.t_ns[truth.n] = strtoll(at, &at, 10);
        at = strchr(at + 1, ',');
        for (int i = 0; i < STATES; i++)
            truth.x[truth.n][i] = strtod(at + 1, &at);
        truth.n++;
        line = strchr(at, '\n');
    }
    free(text);
}

/* The state at the last instant before `until_ns`. */
struct instant {
    int64_t until_ns, t_ns;
    double x[STATES], u[STATES];
};

static int64_t time_of(const cJSON *line)
{
    int64_t t_ns;
    const char *text = values_at(line, "t")->valuestring;
    ck_assert(wire_parse_time(text, strlen(text), &t_ns));
    return t_ns;
}

static void take(void *ctx, const cJSON *line)
{
    struct instant *at = ctx;
    if (!replay_is_settled(line) || time_of(line) > at->until_ns)
        return;
    const cJSON *x = values_at(line, "x"), *one;
    cJSON_ArrayForEach(one, x)
    {
        if (!cJSON_IsNumber(one))
            return; /* not determined yet */
    }
    at->t_ns = time_of(line);
    ck_assert_int_eq(values_list(line, "x", at->x, STATES), STATES);
    values_list(line, "u", at->u, STATES);
}

/* Between two rows of the truth. */
static double truth_at(int64_t t_ns, int state)
{
    int k = 0;
    while (k + 2 < truth.n && truth.t_ns[k + 1] <= t_ns)
        k++;
    double part = (double)(t_ns - truth.t_ns[k]) /
                  (double)(truth.t_ns[k + 1] - truth.t_ns[k]);
    return truth.x[k][state] +
           part * (truth.x[k + 1][state] - truth.x[k][state]);
}

/* One run; counts the states that lie within U. */
static void run(uint64_t seed, double when_s, int *inside)
{
    char text[24];
    struct instant at = {0};
    const char *capture = tool_path("honest.pcap");
    const char *lines = tool_path("honest.jsonl");
    snprintf(text, sizeof text, "%llu", (unsigned long long)seed);
    ck_assert_int_eq(TOOL("rehearse", RIG, "--out", capture, "--seed", text),
                     0);
    ck_assert_int_eq(
        TOOL("replay", RIG, capture, "--stream", "settled", "--out", lines), 0);
    read_truth(tool_path("honest.truth.csv"));
    at.until_ns = truth.t_ns[0] + (int64_t)(when_s * 1e9);
    cJSON_Delete(replay_lines(lines, take, &at));
    for (int i = 0; i < STATES; i++)
        inside[i] += fabs(at.x[i] - truth_at(at.t_ns, i)) <= 2 * at.u[i];
}

START_TEST(the_truth_lies_within_U_as_often_as_it_says)
{
    const char *campaign = getenv("CAMPAIGN");
    bool is_long = campaign != NULL && strcmp(campaign, "honest") == 0;
    int n = is_long ? RUNS_LONG : RUNS, inside[STATES] = {0};
    struct random r;
    random_init(&r, 71, 0);
    for (int i = 0; i < n; i++)
        run(1000 + (uint64_t)i, 5 + 14 * random_uniform(&r), inside);
    double p = 0.9545, spread = 3.29 * sqrt(n * p * (1 - p));
    for (int i = 0; i < STATES; i++) {
        printf("honest: %s inside U in %d of %d\n", names[i], inside[i], n);
        /* Noise jumps between two rows of the truth. */
        if (strcmp(names[i], "tape.noise") == 0)
            continue;
        ck_assert_double_ge(inside[i], n * p - spread - 1);
        ck_assert_double_le(inside[i], n * p + spread + 1);
    }
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("honest");
    TCase *t = tcase_create("honest");
    tcase_set_timeout(t, 200);
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_add_test(t, the_truth_lies_within_U_as_often_as_it_says);
    suite_add_tcase(s, t);
    return s;
}
