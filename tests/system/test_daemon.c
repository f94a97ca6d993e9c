/* The daemon as a process: its sockets, its capture, its end. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <errno.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mount.h>
#include <sys/socket.h>
#include <sys/stat.h>
#include <unistd.h>

#include "daemon/capture.h"
#include "tests/suite.h"
#include "tests/support/process.h"

static char folder[64];
static struct daemon_ports d;
static int udp;

static void begin(void)
{
    folder_make(folder, sizeof folder);
    d = daemon_start("tests/data/rigs/one.json", folder);
    udp = connect_udp(d.udp);
}

static void end(void)
{
    if (d.pid > 0) {
        kill(d.pid, SIGKILL);
        process_wait(d.pid, 5);
    }
    close(udp);
    folder_remove(folder);
}

static void stop(void)
{
    kill(d.pid, SIGTERM);
    ck_assert_int_eq(process_wait(d.pid, 2), 0);
    d.pid = 0;
}

static void send_text(const char *text)
{
    ck_assert_int_eq(send(udp, text, strlen(text), 0), (int)strlen(text));
}

/* What comes within the time, NUL-terminated, until `wanted` stands in it. */
static char *read_until(int fd, const char *wanted, int ms)
{
    static char text[1 << 20];
    size_t n = 0;
    for (text[0] = 0; ms > 0 && !strstr(text, wanted); ms -= 10) {
        struct pollfd p = {fd, POLLIN, 0};
        if (poll(&p, 1, 10) <= 0)
            continue;
        if (n > sizeof text / 2) { /* the newest half is enough */
            memmove(text, text + n / 2, n - n / 2);
            n -= n / 2;
        }
        ssize_t got = read(fd, text + n, sizeof text - 1 - n);
        if (got <= 0)
            break;
        n += (size_t)got;
        ms += 10; /* it is coming: only silence counts */
        text[n] = 0;
    }
    ck_assert_msg(strstr(text, wanted) != NULL, "no %s in: %.2000s", wanted,
                  text);
    return text;
}

START_TEST(a_datagram_becomes_an_estimate_for_who_asks_for_nothing)
{
    int tcp = connect_tcp(d.tcp);
    read_until(tcp, "{\"type\":\"description\"", 1000);
    send_text("{\"sensor\":\"laser\",\"z\":1.25}");
    send_text("{\"sensor\":\"laser\",\"z\":1.25}");
    char *text = read_until(tcp, "\"n\":2", 1000);
    ck_assert_ptr_nonnull(strstr(text, "\"track\":\"carriage\""));
    read_until(tcp, "{\"type\":\"counts\"", 2500);
    stop();
    read_until(tcp, "{\"type\":\"bye\"", 1000);
    close(tcp);
}
END_TEST

START_TEST(a_request_line_chooses_and_a_wrong_one_is_explained)
{
    int settled = connect_tcp(d.tcp), wrong = connect_tcp(d.tcp);
    dprintf(settled, "{\"stream\":\"settled\",\"mode\":\"every\",\"tracks\":"
                     "[\"carriage\"]}\n");
    dprintf(wrong, "{\"streams\":\"live\"}\n");
    char *text = read_until(wrong, "no such key", 1000);
    ck_assert_ptr_nonnull(strstr(text, "{\"type\":\"host\""));
    ck_assert_int_eq(read(wrong, (char[1]){0}, 1), 0); /* closed */
    read_until(settled, "{\"type\":\"description\"", 1000);
    send_text("{\"sensor\":\"laser\",\"z\":2}");
    text = read_until(settled, "\"stream\":\"settled\"", 2000);
    ck_assert_ptr_null(strstr(text, "\"stream\":\"live\""));
    close(settled);
    close(wrong);
}
END_TEST

START_TEST(a_clean_stop_leaves_a_capture_that_ends_with_stop)
{
    for (int i = 0; i < 1000; i++)
        send_text("[{\"sensor\":\"laser\",\"z\":1},{\"sensor\":\"q\",\"z\":1}]");
    usleep(100000);
    stop();
    struct capture *c;
    struct pcap_record r;
    struct err err;
    int n = 0, n_start = 0, n_stop = 0;
    ck_assert_msg(capture_open(&c, d.capture, &err) == ST_OK, "%s", err.text);
    while (capture_next(c, &r)) {
        n += r.control == CONTROL_NONE;
        n_start += r.control == CONTROL_START;
        n_stop += r.control == CONTROL_STOP;
    }
    ck_assert_int_eq(n, 1000);
    ck_assert_int_eq(n_start, 1);
    ck_assert_int_eq(n_stop, 1);
    ck_assert_uint_eq(capture_tally(c)->torn_bytes, 0);
    capture_close(c);
}
END_TEST

START_TEST(a_kill_leaves_every_whole_record_readable)
{
    for (int i = 0; i < 1000; i++)
        send_text("{\"sensor\":\"laser\",\"z\":1}");
    usleep(200000); /* the writer's turn comes every 20 ms */
    kill(d.pid, SIGKILL);
    process_wait(d.pid, 5);
    d.pid = 0;
    struct capture *c;
    struct pcap_record r;
    int n = 0;
    ck_assert_int_eq(capture_open(&c, d.capture, NULL), ST_OK);
    while (capture_next(c, &r))
        n += r.control == CONTROL_NONE;
    ck_assert_int_eq(n, 1000);
    capture_close(c);
}
END_TEST

START_TEST(a_slow_listener_is_told_what_it_missed_and_slows_nobody)
{
    int slow = connect_tcp(d.tcp), size = 4096;
    setsockopt(slow, SOL_SOCKET, SO_RCVBUF, &size, sizeof size);
    dprintf(slow, "{\"stream\":\"both\",\"mode\":\"every\"}\n");
    read_until(slow, "{\"type\":\"description\"", 1000);
    for (int i = 0; i < 60000; i++) {
        send_text("{\"sensor\":\"laser\",\"z\":1}");
        if (i % 20 == 0)
            usleep(100);
    }
    int other = connect_tcp(d.tcp);
    read_until(other, "{\"type\":\"counts\"", 2500);
    close(other);
    read_until(slow, "\"what\":\"skipped\"", 20000);
    close(slow);
}
END_TEST

START_TEST(two_daemons_on_one_port_are_explained)
{
    char set[80], out[128], err[128];
    snprintf(set, sizeof set, "receive.udp=\"127.0.0.1:%d\"", d.udp);
    snprintf(out, sizeof out, "%s/out", folder);
    snprintf(err, sizeof err, "%s/err", folder);
    char *argv[] = {DAEMON_PATH, "tests/data/rigs/one.json", "--no-capture",
                    "--set", set, "--set", "serve.tcp=\"127.0.0.1:0\"", NULL};
    ck_assert_int_eq(process_run(argv, out, err), 69);
    char *text = file_read(err, NULL);
    ck_assert_ptr_nonnull(strstr(text, "another ropewalkd"));
    free(text);
}
END_TEST

/* Needs root for a mount of its own: a file system of 256 KiB. */
START_TEST(a_full_disk_stops_the_capture_but_not_the_fusion)
{
    char small[64], at[80], capture[128];
    if (geteuid() != 0) {
        printf("skipped: a small file system needs root\n");
        return;
    }
    folder_make(small, sizeof small);
    snprintf(at, sizeof at, "%s/disk", small);
    mkdir(at, 0755);
    if (mount("tmpfs", at, "tmpfs", 0, "size=256k") != 0) {
        printf("skipped: cannot mount: %s\n", strerror(errno));
        folder_remove(small);
        return;
    }
    snprintf(capture, sizeof capture, "capture.folder=\"%s\"", at);
    stop();
    char ports[128], log[128];
    snprintf(ports, sizeof ports, "%s/ports2.json", folder);
    snprintf(log, sizeof log, "%s/log2", folder);
    char *argv[] = {DAEMON_PATH, "tests/data/rigs/one.json", "--set",
                    "receive.udp=\"127.0.0.1:0\"", "--set",
                    "serve.tcp=\"127.0.0.1:0\"", "--set", capture, "--set",
                    "capture.floor=\"0 B\"", "--port-file", ports, NULL};
    d.pid = process_start(argv, NULL, log);
    for (int i = 0; i < 500 && access(ports, R_OK) != 0; i++)
        usleep(10000);
    char *text = file_read(ports, NULL);
    int udp_port = 0, tcp_port = 0;
    ck_assert_int_eq(sscanf(text, "{\"udp\":%d,\"tcp\":%d", &udp_port,
                            &tcp_port),
                     2);
    free(text);
    close(udp);
    udp = connect_udp(udp_port);
    int tcp = connect_tcp(tcp_port);
    read_until(tcp, "{\"type\":\"description\"", 1000);
    for (int i = 0; i < 6000; i++) {
        send_text("{\"sensor\":\"laser\",\"z\":1}");
        if (i % 20 == 0)
            usleep(1000);
    }
    read_until(tcp, "\"what\":\"gap\"", 3000);
    send_text("{\"sensor\":\"laser\",\"z\":1,\"seq\":77}");
    read_until(tcp, "{\"type\":\"estimate\"", 2000);
    close(tcp);
    stop();
    umount(at);
    folder_remove(small);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("daemon");
    TCase *t = tcase_create("daemon");
    tcase_set_timeout(t, 60);
    tcase_add_checked_fixture(t, begin, end);
    tcase_add_test(t,
                   a_datagram_becomes_an_estimate_for_who_asks_for_nothing);
    tcase_add_test(t, a_request_line_chooses_and_a_wrong_one_is_explained);
    tcase_add_test(t, a_clean_stop_leaves_a_capture_that_ends_with_stop);
    tcase_add_test(t, a_kill_leaves_every_whole_record_readable);
    tcase_add_test(t, a_slow_listener_is_told_what_it_missed_and_slows_nobody);
    tcase_add_test(t, two_daemons_on_one_port_are_explained);
    tcase_add_test(t, a_full_disk_stops_the_capture_but_not_the_fusion);
    suite_add_tcase(s, t);
    return s;
}
