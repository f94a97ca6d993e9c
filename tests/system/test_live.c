/* Replay is live: what the running daemon said over TCP is what a replay of
 * its capture says, byte for byte.  The long form (CAMPAIGN=live) takes 60 s.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include <pthread.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "tests/suite.h"
#include "tests/support/process.h"

static char *arg(const char *text)
{
    return (char *)(size_t)text;
}

/* Reads a socket to its end into a file, as fast as it comes. */
struct listener {
    int fd;
    const char *path;
};

static void *listen_to_end(void *ctx)
{
    struct listener *l = ctx;
    static char buf[1 << 20];
    FILE *f = fopen(l->path, "wb");
    for (ssize_t n; (n = read(l->fd, buf, sizeof buf)) > 0;)
        fwrite(buf, 1, (size_t)n, f);
    fclose(f);
    return NULL;
}

static size_t first_difference(const char *a, const char *b)
{
    size_t i = 0;
    while (a[i] && a[i] == b[i])
        i++;
    while (i > 0 && a[i - 1] != '\n')
        i--;
    return i;
}

START_TEST(a_replay_of_the_capture_says_what_was_said_live)
{
    const char *campaign = getenv("CAMPAIGN");
    bool is_long = campaign && strcmp(campaign, "live") == 0;
    char folder[64], to[64], live[128], again[128], log[128];
    folder_make(folder, sizeof folder);
    snprintf(live, sizeof live, "%s/live.jsonl", folder);
    snprintf(again, sizeof again, "%s/again.jsonl", folder);
    snprintf(log, sizeof log, "%s/log", folder);
    struct daemon_ports d = daemon_start("tests/data/rigs/fast.json", folder);
    struct listener l = {connect_tcp(d.tcp), live};
    static const char ask[] = "{\"stream\":\"both\",\"mode\":\"every\"}\n";
    ck_assert_int_eq(write(l.fd, ask, sizeof ask - 1), sizeof ask - 1);
    pthread_t thread;
    pthread_create(&thread, NULL, listen_to_end, &l);
    usleep(300000);

    snprintf(to, sizeof to, "127.0.0.1:%d", d.udp);
    char *rehearse[] = {arg(TOOL_PATH),
                        arg("rehearse"),
                        arg("tests/data/rigs/fast.json"),
                        arg("--to"),
                        to,
                        arg("--lasts"),
                        arg(is_long ? "60 s" : "8 s"),
                        NULL};
    ck_assert_int_eq(process_run(rehearse, NULL, log), 0);
    usleep(700000);
    kill(d.pid, SIGTERM);
    ck_assert_int_eq(process_wait(d.pid, 5), 0);
    pthread_join(thread, NULL);
    close(l.fd);

    char *replay[] = {arg(TOOL_PATH),
                      arg("replay"),
                      arg("tests/data/rigs/fast.json"),
                      d.capture,
                      arg("--stream"),
                      arg("both"),
                      arg("--out"),
                      again,
                      arg("--port"),
                      to + strlen("127.0.0.1:"),
                      NULL};
    ck_assert_int_eq(process_run(replay, NULL, log), 0);

    char *a = file_read(live, NULL), *b = file_read(again, NULL);
    ck_assert_ptr_nonnull(strstr(b, "{\"type\":\"summary\""));
    ck_assert_ptr_null(strstr(a, "\"what\":\"skipped\""));
    ck_assert_ptr_null(strstr(a, "\"what\":\"drops\""));
    lines_said(a);
    lines_said(b);
    size_t at = first_difference(a, b);
    ck_assert_msg(strcmp(a, b) == 0, "at byte %zu:\n%.300s\n%.300s", at, a + at,
                  b + at);
    printf("live: %zu bytes equal\n", strlen(a));
    ck_assert_uint_gt(strlen(a), 1000000);
    free(a);
    free(b);
    folder_remove(folder);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("live");
    TCase *t = tcase_create("live");
    tcase_set_timeout(t, 250);
    tcase_add_test(t, a_replay_of_the_capture_says_what_was_said_live);
    suite_add_tcase(s, t);
    return s;
}
