/* Arrival order, drains and wake times must not show in what is settled. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "tests/suite.h"
#include "tests/support/drive.h"

#define MS 1000000
#define T0 ((int64_t)1700000000 * 1000000000)

enum { DATAGRAMS = 240, TEXT = 700 };

static const char rig[] =
    "{\"order\": {\"hold\": \"%d ms\", \"horizon\": \"200 ms\","
    "             \"ahead\": \"50 ms\"},"
    " \"tracks\": {"
    "  \"carriage\": {\"state\": [{\"model\": \"constant-velocity\","
    "    \"name\": \"x\", \"unit\": \"m\", \"q\": \"0.5 m2/s3\"}]},"
    "  \"tilt\": {\"state\": ["
    "    {\"model\": \"constant-acceleration\", \"name\": \"a\","
    "     \"unit\": \"m\", \"q\": \"1 m2/s5\"},"
    "    {\"model\": \"constant-acceleration\", \"name\": \"b\","
    "     \"unit\": \"m\", \"q\": \"1 m2/s5\"},"
    "    {\"model\": \"random-walk\", \"name\": \"c\", \"unit\": \"m\","
    "     \"q\": \"0.1 m2/s\"}]},"
    "  \"raft-*\": {\"state\": [{\"model\": \"constant-velocity\","
    "    \"name\": \"x\", \"unit\": \"m\", \"q\": \"0.1 m2/s3\"}]}},"
    " \"sensors\": {"
    "  \"laser\": {\"track\": \"carriage\", \"reads\": \"x\","
    "    \"unit\": \"m\", \"u\": \"0.05 m\", \"rate\": \"400 Hz\"},"
    "  \"wheel\": {\"track\": \"carriage\", \"reads\": \"x.rate\","
    "    \"unit\": \"m/s\", \"u\": \"0.2 m/s\", \"rate\": \"400 Hz\"},"
    "  \"level\": {\"track\": \"tilt\","
    "    \"reads\": [\"a\", {\"b\": 1, \"c\": -1}, \"c\"],"
    "    \"unit\": \"m\", \"u\": \"0.1 m\", \"rate\": \"400 Hz\"},"
    "  \"tower\": {\"track\": \"raft-*\", \"reads\": \"x\", \"unit\": \"m\","
    "    \"u\": \"0.1 m\", \"rate\": \"400 Hz\"}}}";

struct datagram {
    int64_t first_ns, last_ns; /* stamps                                  */
    int64_t a_ns;
    char text[TEXT];
};

/* An element for one of the four sensors, now and then an outlier. */
static int element(struct random *r, int i, int64_t t_ns, char *out,
                   size_t size)
{
    double z = (double)(t_ns - T0) * 1e-9 + 0.1 * random_normal(r);
    if (random_below(r, 25) == 0)
        z += 40;
    switch (random_below(r, 4)) {
    case 0:
        return snprintf(out, size,
                        "{\"sensor\":\"laser\",\"z\":%.4f,\"ns\":%lld,"
                        "\"seq\":%d}",
                        z, (long long)t_ns, i);
    case 1:
        return snprintf(out, size,
                        "{\"sensor\":\"wheel\",\"z\":%.4f,\"ns\":%lld}",
                        1 + 0.2 * random_normal(r), (long long)t_ns);
    case 2:
        return snprintf(out, size,
                        "{\"sensor\":\"level\",\"z\":[%.3f,null,%.3f],"
                        "\"ns\":%lld}",
                        z, -z, (long long)t_ns);
    default:
        return snprintf(out, size,
                        "{\"sensor\":\"tower\",\"track\":\"raft-%d\","
                        "\"z\":%.3f,\"ns\":%lld}",
                        (int)random_below(r, 3), z, (long long)t_ns);
    }
}

static void make(struct random *r, struct datagram *list)
{
    int64_t t_ns = T0 + 100 * MS;
    for (int i = 0; i < DATAGRAMS; i++) {
        struct datagram *d = &list[i];
        int n = 1 + (int)random_below(r, 4), len = 0;
        t_ns += (int64_t)random_below(r, 12) * MS; /* equal stamps too */
        d->first_ns = d->last_ns = t_ns;
        len += snprintf(d->text, TEXT, "[");
        for (int k = 0; k < n; k++) {
            int64_t at_ns = t_ns + (int64_t)random_below(r, 3) * 5 * MS;
            d->last_ns = at_ns > d->last_ns ? at_ns : d->last_ns;
            len += snprintf(d->text + len, TEXT - (size_t)len, "%s",
                            k > 0 ? "," : "");
            len +=
                element(r, 4 * i + k, at_ns, d->text + len, TEXT - (size_t)len);
        }
        snprintf(d->text + len, TEXT - (size_t)len, "]");
    }
}

static int by_arrival(const void *a, const void *b)
{
    const struct datagram *x = a, *y = b;
    if (x->a_ns != y->a_ns)
        return x->a_ns < y->a_ns ? -1 : 1;
    return strcmp(x->text, y->text);
}

/* Every element arrives within the horizon of its own stamp. */
static void shuffle(struct random *r, struct datagram *list, bool is_calm)
{
    for (int i = 0; i < DATAGRAMS; i++) {
        int64_t room_ns = list[i].first_ns + 200 * MS - list[i].last_ns;
        list[i].a_ns = list[i].last_ns;
        if (!is_calm)
            list[i].a_ns += (int64_t)random_below(r, (uint64_t)room_ns + 1);
    }
    qsort(list, DATAGRAMS, sizeof *list, by_arrival);
}

static char *settle(const struct datagram *list, int hold_ms)
{
    static char text[sizeof rig + 20];
    struct drive d;
    snprintf(text, sizeof text, rig, hold_ms);
    drive_init(&d, text);
    drive_start(&d, T0);
    for (int i = 0; i < DATAGRAMS; i++)
        drive_feed(&d, list[i].a_ns, "%s", list[i].text);
    run_stop(d.run, list[DATAGRAMS - 1].a_ns + 1000 * MS);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_TOO_LATE), 0);
    ck_assert_uint_eq(drive_total(&d, OUTCOME_OVER_QUOTA), 0);
    ck_assert_uint_gt(drive_total(&d, OUTCOME_GATED), 3);
    ck_assert_uint_gt(drive_total(&d, OUTCOME_USED), DATAGRAMS);
    char *settled = d.settled;
    d.settled = NULL;
    drive_fini(&d);
    return settled;
}

START_TEST(any_arrival_order_within_the_horizon_settles_the_same_bytes)
{
    static struct datagram list[DATAGRAMS];
    struct random r;
    int hold_ms = _i % 2 == 0 ? 0 : 30;
    random_init(&r, 71 + (uint64_t)_i, 0);
    make(&r, list);
    shuffle(&r, list, true);
    char *expected = settle(list, hold_ms);
    for (int k = 0; k < 50; k++) {
        shuffle(&r, list, false);
        char *got = settle(list, hold_ms);
        size_t at = 0;
        while (expected[at] && expected[at] == got[at])
            at++;
        while (at > 0 && expected[at - 1] != '\n')
            at--;
        ck_assert_msg(strcmp(expected, got) == 0,
                      "seed %d, order %d, byte %zu:\n%.250s\n%.250s", 71 + _i,
                      k, at, expected + at, got + at);
        free(got);
    }
    free(expected);
}
END_TEST

/* --- drains and wake times --------------------------------------------------
 */

/* A live driver that wakes and stalls at random, as daemon/receive does it:
 * the clock is read before the socket, an empty socket lets time pass. */
static char *drain(struct random *r, const struct datagram *list,
                   int64_t *recorded)
{
    static char text[sizeof rig + 20];
    struct drive d;
    snprintf(text, sizeof text, rig, 10);
    drive_init(&d, text);
    drive_start(&d, T0);
    struct sender from = {.family = 4, .address = {127, 0, 0, 1}, .port = 9};
    int64_t clock_ns = T0, end_ns = list[DATAGRAMS - 1].a_ns + 500 * MS;
    int i = 0;
    while (clock_ns < end_ns) {
        static const double stall[] = {0.05, 0.5, 5, 60};
        clock_ns +=
            (int64_t)(random_exponential(r) * stall[random_below(r, 4)] * MS);
        for (;;) {
            int64_t reading_ns = clock_ns;
            int n = 0, most = 1 << (2 * random_below(r, 4));
            clock_ns += 1000 + (int64_t)random_below(r, 30000);
            for (; i < DATAGRAMS && n < most; i++, n++) {
                if (list[i].a_ns > reading_ns)
                    break;
                recorded[i] = run_feed(d.run, list[i].a_ns, &from,
                                       (const uint8_t *)list[i].text,
                                       strlen(list[i].text));
            }
            if (n == 0) {
                run_advance(d.run, reading_ns - 5 * MS);
                break;
            }
            if (random_below(r, 10) == 0)
                break; /* budget of one turn used up */
        }
    }
    run_stop(d.run, end_ns + 1000 * MS);
    char *all = d.all;
    d.all = NULL;
    drive_fini(&d);
    return all;
}

static char *replay(const struct datagram *list, const int64_t *recorded)
{
    static char text[sizeof rig + 20];
    struct drive d;
    snprintf(text, sizeof text, rig, 10);
    drive_init(&d, text);
    drive_start(&d, T0);
    for (int i = 0; i < DATAGRAMS; i++)
        drive_feed(&d, recorded[i], "%s", list[i].text);
    run_stop(d.run, list[DATAGRAMS - 1].a_ns + 1500 * MS);
    char *all = d.all;
    d.all = NULL;
    drive_fini(&d);
    return all;
}

START_TEST(drains_and_wake_times_do_not_show_in_anything_said)
{
    static struct datagram list[DATAGRAMS];
    static int64_t recorded[DATAGRAMS];
    struct random r;
    const char *campaign = getenv("CAMPAIGN");
    int n = campaign && strcmp(campaign, "drains") == 0 ? 1000 : 100;
    random_init(&r, 4000, 0);
    make(&r, list);
    shuffle(&r, list, false);
    for (int k = 0; k < n; k++) {
        char *live = drain(&r, list, recorded);
        char *again = replay(list, recorded);
        ck_assert_msg(strcmp(live, again) == 0, "partition %d", k);
        free(live);
        free(again);
    }
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("order");
    TCase *t = tcase_create("order");
    tcase_set_timeout(t, 250);
    tcase_add_loop_test(
        t, any_arrival_order_within_the_horizon_settles_the_same_bytes, 0, 4);
    tcase_add_test(t, drains_and_wake_times_do_not_show_in_anything_said);
    suite_add_tcase(s, t);
    return s;
}
