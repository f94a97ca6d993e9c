/* Who listens: what is asked, what is answered, and what is told to the slow.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/system/daemon_case.h"

/* --- what a subscriber gets
 * ------------------------------------------------------ */

START_TEST(a_datagram_becomes_an_estimate_for_who_asks_for_nothing)
{
    int tcp = connect_tcp(d.tcp);
    read_until(tcp, "{\"type\":\"description\"", 2000);
    send_text("{\"sensor\":\"laser\",\"z\":1.25}");
    send_text("{\"sensor\":\"laser\",\"z\":1.25}");
    char *text = read_until(tcp, "\"n\":2", 2000);
    ck_assert_ptr_nonnull(strstr(text, "\"track\":\"carriage\""));
    ck_assert_ptr_null(strstr(text, "\"stream\":\"settled\""));
    read_until(tcp, "{\"type\":\"counts\"", 4000);
    stop();
    read_until(tcp, "{\"type\":\"bye\"", 2000);
    ck_assert_int_eq(read(tcp, (char[1]){0}, 1), 0);
    close(tcp);
}
END_TEST

START_TEST(who_speaks_MessagePack_gets_maps_with_the_same_keys)
{
    int tcp = connect_tcp(d.tcp);
    dprintf(tcp, "{\"form\":\"msgpack\",\"mode\":\"every\"}\n");
    unsigned char first;
    ck_assert_int_eq(read(tcp, &first, 1), 1);
    ck_assert(first >> 4 == 8 || first == 0xde); /* a map */
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    stop();
    static char bytes[1 << 20];
    size_t n = 0;
    for (ssize_t got; (got = read(tcp, bytes + n, sizeof bytes - n)) > 0;)
        n += (size_t)got;
    ck_assert_ptr_nonnull(memmem(bytes, n,
                                 "\xa8"
                                 "estimate",
                                 9));
    ck_assert_ptr_nonnull(memmem(bytes, n,
                                 "\xa3"
                                 "bye",
                                 4));
    ck_assert_ptr_null(memmem(bytes, n, "{\"type\"", 7));
    close(tcp);
}
END_TEST

START_TEST(tracks_that_were_not_asked_for_are_left_out)
{
    int other = ask("{\"tracks\":[\"raft-*\"],\"mode\":\"every\"}");
    int one = ask("{\"tracks\":[\"car*\",\"x\"],\"mode\":\"every\"}");
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    stop();
    ck_assert_int_eq(count(read_all(other), "\"track\":\"carriage\""), 0);
    ck_assert_int_ge(count(read_all(one), "{\"type\":\"estimate\""), 1);
    close(other);
    close(one);
}
END_TEST

START_TEST(each_gets_the_stream_that_it_asked_for)
{
    int live = ask("{\"stream\":\"live\",\"mode\":\"every\"}");
    int settled = ask("{\"stream\":\"settled\",\"mode\":\"every\"}");
    int both = ask("{\"stream\":\"both\",\"mode\":\"every\"}");
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    stop();
    char *text = read_all(live);
    ck_assert_int_eq(count(text, "\"stream\":\"live\""), 1);
    ck_assert_int_eq(count(text, "\"stream\":\"settled\""), 0);
    text = read_all(settled);
    ck_assert_int_eq(count(text, "\"stream\":\"live\""), 0);
    ck_assert_int_eq(count(text, "\"stream\":\"settled\""), 1);
    text = read_all(both);
    ck_assert_int_eq(count(text, "\"stream\":\"live\""), 1);
    ck_assert_int_eq(count(text, "\"stream\":\"settled\""), 1);
    close(live);
    close(settled);
    close(both);
}
END_TEST

START_TEST(a_new_request_takes_the_place_of_the_old_one)
{
    int tcp = connect_tcp(d.tcp);
    dprintf(tcp, "{\"stream\":\"live\"}\n{\"stream\":\"settled\"}\n");
    usleep(300000);
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    stop();
    char *text = read_all(tcp);
    ck_assert_int_eq(count(text, "{\"type\":\"description\""), 2);
    ck_assert_int_eq(count(text, "\"stream\":\"settled\""), 1);
    ck_assert_int_eq(count(text, "\"stream\":\"live\""), 0);
    close(tcp);
}
END_TEST

/* 50 estimates a second for 0.8 s thinned to 2 a second; the bound leaves room
 * for a machine under load.  The last one is not due when the end comes. */
START_TEST(a_rate_thins_out_and_the_newest_comes_last)
{
    int tcp = ask("{\"rate\":2,\"mode\":\"every\"}");
    for (int i = 1; i <= 40; i++) {
        char text[80];
        snprintf(text, sizeof text, "{\"sensor\":\"laser\",\"z\":%d}", i);
        send_text(text);
        usleep(20000);
    }
    stop();
    char *text = read_all(tcp);
    int n = count(text, "{\"type\":\"estimate\"");
    ck_assert_int_ge(n, 2);
    ck_assert_int_le(n, 20);
    ck_assert_ptr_nonnull(strstr(text, "\"n\":40,"));
    close(tcp);
}
END_TEST

/* --- what it may ask
 * -------------------------------------------------------------- */

static const struct {
    const char *line, *answer;
} wrong[] = {{"{\"streams\":\"live\"}", "no such key"},
             {"{\"stream\":\"both", "not one JSON object"},
             {"[1,2]", "not one JSON object"},
             {"{\"stream\":\"live\"} x", "not one JSON object"},
             {"{\"stream\":\"all\"}", "one of live, settled, both"},
             {"{\"mode\":1}", "one of newest, every"},
             {"{\"form\":\"xml\"}", "one of json, msgpack"},
             {"{\"rate\":0}", "above 0"},
             {"{\"tracks\":\"carriage\"}", "give a list of ids"},
             {"", "not one JSON object"}};

START_TEST(a_wrong_request_is_explained_and_closed)
{
    int tcp = connect_tcp(d.tcp);
    dprintf(tcp, "%s\nmore that nobody reads\n", wrong[_i].line);
    char *text = read_all(tcp);
    ck_assert_msg(strncmp(text, "{\"type\":\"host\"", 14) == 0, "%s", text);
    ck_assert_ptr_nonnull(strstr(text, "\"what\":\"request\""));
    ck_assert_msg(strstr(text, wrong[_i].answer) != NULL, "%s", text);
    ck_assert_int_eq(count(text, "\n"), 1);
    close(tcp);
}
END_TEST

START_TEST(a_request_without_end_is_explained_and_closed)
{
    char text[5000];
    memset(text, ' ', sizeof text);
    int tcp = connect_tcp(d.tcp);
    ck_assert_int_eq(write(tcp, text, sizeof text), sizeof text);
    ck_assert_ptr_nonnull(strstr(read_all(tcp), "longer than 4096 bytes"));
    close(tcp);
}
END_TEST

START_TEST(a_request_that_ends_with_the_input_counts)
{
    int tcp = connect_tcp(d.tcp);
    dprintf(tcp, "{\"stream\":\"settled\"}");
    shutdown(tcp, SHUT_WR);
    read_until(tcp, "{\"type\":\"description\"", 2000);
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    stop();
    ck_assert_int_eq(count(read_all(tcp), "\"stream\":\"settled\""), 1);
    close(tcp);
}
END_TEST

START_TEST(more_subscribers_than_the_limit_are_told_so)
{
    enum { LIMIT = 64 }; /* default of limits.subscribers */
    int fd[LIMIT];
    for (int i = 0; i < LIMIT; i++)
        fd[i] = ask("{}");
    int late = connect_tcp(d.tcp);
    ck_assert_ptr_nonnull(strstr(read_all(late), "limits.subscribers"));
    close(late);
    /* A place is free again when a message could not be delivered. */
    close(fd[0]);
    sleep(3);
    fd[0] = ask("{}");
    for (int i = 0; i < LIMIT; i++)
        close(fd[i]);
}
END_TEST

/* What it got up to the notice, and the number in it, make up what was sent:
 * the stream is whole but for the gap that it tells. */
START_TEST(a_slow_listener_is_told_what_it_missed_and_slows_nobody)
{
    enum { N = 60000 };
    static char text[1 << 16];
    int slow = connect_tcp(d.tcp);
    dprintf(slow, "{\"stream\":\"live\",\"mode\":\"every\"}\n");
    read_until(slow, "{\"type\":\"description\"", 2000);
    send_many("{\"sensor\":\"laser\",\"z\":1}", N);
    int other = ask("{}");
    send_text("{\"sensor\":\"laser\",\"z\":1}");
    read_until(other, "{\"type\":\"estimate\"", 4000);
    close(other);
    FILE *f = fdopen(slow, "r");
    long got = 0, skipped = 0, last = 0;
    while (skipped == 0 && fgets(text, sizeof text, f)) {
        char *at = strstr(text, "\"what\":\"skipped\"");
        if (at)
            skipped = strtol(strstr(at, "\"n\":") + 4, NULL, 10);
        got += strncmp(text, "{\"type\":\"estimate\"", 18) == 0;
    }
    while (fgets(text, sizeof text, f) && last == 0)
        if (strncmp(text, "{\"type\":\"estimate\"", 18) == 0)
            last = strtol(strstr(text, "\"n\":") + 4, NULL, 10);
        else if (strncmp(text, "{\"type\":\"heartbeat\"", 19) == 0)
            ck_assert_ptr_nonnull(strstr(text, "\"skipped\":"));
        else
            send_text("{\"sensor\":\"laser\",\"z\":1}");
    ck_assert_int_gt(skipped, 0);
    /* Some of what was skipped were events and counts. */
    ck_assert_int_ge(got + skipped, last - 1);
    ck_assert_int_le(got + skipped, last + 200);
    fclose(f);
}
END_TEST

START_TEST(a_slow_listener_of_the_newest_is_up_to_date_at_once)
{
    int slow = connect_tcp(d.tcp);
    dprintf(slow, "{\"mode\":\"newest\"}\n");
    read_until(slow, "{\"type\":\"description\"", 2000);
    send_many("{\"sensor\":\"laser\",\"z\":1}", 20000);
    static char text[1 << 16];
    FILE *f = fdopen(slow, "r");
    int n = 0;
    while (fgets(text, sizeof text, f) && !strstr(text, "\"n\":20000,"))
        n++;
    ck_assert_int_lt(n, 10000);
    fclose(f);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("subscribe");
    TCase *t = tcase_create("subscribe");
    tcase_set_timeout(t, 60);
    tcase_add_checked_fixture(t, begin, end);
    tcase_add_test(t, a_datagram_becomes_an_estimate_for_who_asks_for_nothing);
    tcase_add_test(t, who_speaks_MessagePack_gets_maps_with_the_same_keys);
    tcase_add_test(t, tracks_that_were_not_asked_for_are_left_out);
    tcase_add_test(t, each_gets_the_stream_that_it_asked_for);
    tcase_add_test(t, a_new_request_takes_the_place_of_the_old_one);
    tcase_add_test(t, a_rate_thins_out_and_the_newest_comes_last);
    tcase_add_loop_test(t, a_wrong_request_is_explained_and_closed, 0,
                        sizeof wrong / sizeof *wrong);
    tcase_add_test(t, a_request_without_end_is_explained_and_closed);
    tcase_add_test(t, a_request_that_ends_with_the_input_counts);
    tcase_add_test(t, more_subscribers_than_the_limit_are_told_so);
    tcase_add_test(t, a_slow_listener_is_told_what_it_missed_and_slows_nobody);
    tcase_add_test(t, a_slow_listener_of_the_newest_is_up_to_date_at_once);
    suite_add_tcase(s, t);
    return s;
}
