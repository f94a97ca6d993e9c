/* The daemon as a process: its capture, its log, its end. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cjson/cJSON.h>
#include <errno.h>
#include <fcntl.h>
#include <netinet/in.h>
#include <sys/mount.h>
#include <sys/stat.h>

#include "daemon/capture.h"
#include "tests/system/daemon_case.h"

#ifndef UDP_SEGMENT
#define UDP_SEGMENT 103
#endif

struct kept {
    int n, n_start, n_stop, n_gap;
    uint64_t torn_bytes;
};

static struct kept read_capture(const char *path)
{
    struct kept t = {0};
    struct capture *c;
    struct pcap_record r;
    struct err err;
    ck_assert_msg(capture_open(&c, path, &err) == ST_OK, "%s", err.text);
    while (capture_next(c, &r)) {
        t.n += r.control == CONTROL_NONE;
        t.n_start += r.control == CONTROL_START;
        t.n_stop += r.control == CONTROL_STOP;
        t.n_gap += r.control == CONTROL_GAP;
    }
    t.torn_bytes = capture_tally(c)->torn_bytes;
    capture_close(c);
    return t;
}

START_TEST(a_clean_stop_leaves_a_capture_that_ends_with_stop)
{
    for (int i = 0; i < 1000; i++)
        send_text(
            "[{\"sensor\":\"laser\",\"z\":1},{\"sensor\":\"q\",\"z\":1}]");
    stop();
    struct kept t = read_capture(d.capture);
    ck_assert_int_eq(t.n, 1000);
    ck_assert_int_eq(t.n_start, 1);
    ck_assert_int_eq(t.n_stop, 1);
    ck_assert_uint_eq(t.torn_bytes, 0);
}
END_TEST

START_TEST(a_kill_leaves_every_whole_record_readable)
{
    for (int i = 0; i < 1000; i++)
        send_text("{\"sensor\":\"laser\",\"z\":1}");
    usleep(300000); /* the writer's turn comes every 20 ms */
    kill(d.pid, SIGKILL);
    process_wait(d.pid, 5);
    d.pid = 0;
    struct kept t = read_capture(d.capture);
    ck_assert_int_eq(t.n, 1000);
    ck_assert_int_eq(t.n_stop, 0);
}
END_TEST

/* Sends of 60 datagrams each, which arrive merged. */
static void send_merged(int n_sends)
{
    static const char one[] = "{\"sensor\":\"laser\",\"z\":1}";
    enum { EACH = sizeof one - 1, N = 60 };
    char text[EACH * N + 1];
    int size = EACH;
    for (int i = 0; i < N; i++)
        memcpy(text + i * EACH, one, EACH);
    setsockopt(udp, IPPROTO_UDP, UDP_SEGMENT, &size, sizeof size);
    for (int i = 0; i < n_sends; i++)
        send(udp, text, EACH * N, 0);
}

START_TEST(what_the_kernel_merged_is_taken_apart)
{
    send_merged(3);
    stop();
    ck_assert_int_eq(read_capture(d.capture).n, 180);
}
END_TEST

START_TEST(a_stop_comes_through_while_somebody_sends_without_pause)
{
    pid_t sender = fork();
    if (sender == 0) {
        send_merged(5000000); /* more than can be laid */
        _exit(0);
    }
    usleep(100000);
    kill(d.pid, SIGTERM);
    int code = process_wait(d.pid, 10);
    kill(sender, SIGKILL);
    process_wait(sender, 5);
    d.pid = 0;
    ck_assert_int_eq(code, 0);
    struct kept kept = read_capture(d.capture);
    ck_assert_int_eq(kept.n_stop, 1);
    ck_assert_int_gt(kept.n, 1000);
}
END_TEST

START_TEST(the_log_ends_with_the_ledger_and_takes_no_bytes_off_the_wire)
{
    char path[128];
    send_text("{\"sensor\":\"laser\",\"z\":1}");
    send_text("{\"sensor\":\"\x1b[2J\",\"z\":1}");
    usleep(100000);
    stop();
    snprintf(path, sizeof path, "%s/daemon.log", folder);
    char *text = file_read(path, NULL);
    ck_assert_ptr_null(strchr(text, '\x1b'));
    ck_assert_ptr_nonnull(strstr(text, "level=info msg=\"receiving on udp "));
    char *summary = strstr(text, "{\"type\":\"summary\"");
    ck_assert_ptr_nonnull(summary);
    cJSON *root = cJSON_Parse(summary);
    ck_assert_ptr_nonnull(root);
    cJSON *counts = cJSON_GetObjectItem(root, "counts");
    cJSON *datagrams = cJSON_GetObjectItem(counts, "datagrams");
    double n = 0;
    for (cJSON *row = datagrams->child; row; row = row->next)
        if (strcmp(row->string, "received") != 0)
            n += row->valuedouble;
    ck_assert(n == 2);
    cJSON_Delete(root);
    free(text);
}
END_TEST

START_TEST(a_log_that_nobody_reads_stops_nothing)
{
    char ports[128], capture[160];
    int log[2];
    stop();
    ck_assert_int_eq(pipe(log), 0);
    snprintf(ports, sizeof ports, "%s/ports2.json", folder);
    snprintf(capture, sizeof capture, "capture.folder=\"%s/c2\"", folder);
    d.pid = fork();
    if (d.pid == 0) {
        static char full[1 << 20];
        dup2(log[1], STDERR_FILENO);
        fcntl(log[1], F_SETFL, O_NONBLOCK);
        while (write(log[1], full, sizeof full) > 0) {
        }
        fcntl(log[1], F_SETFL, 0);
        execl(DAEMON_PATH, "ropewalkd", "tests/data/rigs/one.json", "--set",
              "receive.udp=\"127.0.0.1:0\"", "--set",
              "serve.tcp=\"127.0.0.1:0\"", "--set", capture, "--set",
              "capture.floor=\"0 B\"", "--port-file", ports, NULL);
        _exit(127);
    }
    for (int i = 0; i < 500 && access(ports, R_OK) != 0; i++)
        usleep(10000);
    char *text = file_read(ports, NULL);
    int udp_port = 0, tcp_port = 0;
    ck_assert_int_eq(
        sscanf(text, "{\"udp\":%d,\"tcp\":%d", &udp_port, &tcp_port), 2);
    free(text);
    close(udp);
    udp = connect_udp(udp_port);
    int tcp = connect_tcp(tcp_port);
    read_until(tcp, "{\"type\":\"description\"", 2000);
    send_text("not a measurement");
    send_text("{\"sensor\":\"laser\",\"z\":1}");
    read_until(tcp, "{\"type\":\"estimate\"", 2000);
    close(tcp);
    close(log[0]); /* what is still said goes nowhere */
    close(log[1]);
    stop();
}
END_TEST

START_TEST(two_daemons_on_one_port_are_explained)
{
    char set[80], out[128], err[128];
    snprintf(set, sizeof set, "receive.udp=\"127.0.0.1:%d\"", d.udp);
    snprintf(out, sizeof out, "%s/out", folder);
    snprintf(err, sizeof err, "%s/err", folder);
    char *argv[] = {DAEMON_PATH,
                    "tests/data/rigs/one.json",
                    "--no-capture",
                    "--set",
                    set,
                    "--set",
                    "serve.tcp=\"127.0.0.1:0\"",
                    NULL};
    ck_assert_int_eq(process_run(argv, out, err), 69);
    char *text = file_read(err, NULL);
    ck_assert_ptr_nonnull(strstr(text, "another ropewalkd"));
    free(text);
}
END_TEST

START_TEST(what_is_asked_wrongly_ends_with_its_own_exit_code)
{
    char *nothing[] = {DAEMON_PATH, NULL};
    char *unknown[] = {DAEMON_PATH, "tests/data/rigs/one.json", "--fly", NULL};
    char *no_file[] = {DAEMON_PATH, "tests/data/rigs/none.json", NULL};
    char *no_key[] = {DAEMON_PATH, "tests/data/rigs/one.json",
                      "--set",     "recieve.udp=\"127.0.0.1:0\"",
                      "--check",   NULL};
    char *good[] = {DAEMON_PATH, "tests/data/rigs/one.json", "--check", NULL};
    ck_assert_int_eq(process_run(nothing, NULL, NULL), 64);
    ck_assert_int_eq(process_run(unknown, NULL, NULL), 64);
    ck_assert_int_eq(process_run(no_file, NULL, NULL), 78);
    ck_assert_int_eq(process_run(no_key, NULL, NULL), 78);
    ck_assert_int_eq(process_run(good, NULL, NULL), 0);
}
END_TEST

/* Needs root for a mount of its own: a file system of 256 KiB. */
START_TEST(a_full_disk_stops_the_capture_but_not_the_fusion)
{
    char small[64], at[80], capture[128], filler[100];
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
    snprintf(filler, sizeof filler, "%s/filler", at);
    stop();
    char ports[128], log[128];
    snprintf(ports, sizeof ports, "%s/ports2.json", folder);
    snprintf(log, sizeof log, "%s/log2", folder);
    char *argv[] = {DAEMON_PATH,   "tests/data/rigs/one.json",
                    "--set",       "receive.udp=\"127.0.0.1:0\"",
                    "--set",       "serve.tcp=\"127.0.0.1:0\"",
                    "--set",       capture,
                    "--set",       "capture.floor=\"0 B\"",
                    "--port-file", ports,
                    NULL};
    FILE *f = fopen(filler, "w");
    for (int i = 0; i < 128 * 1024; i++)
        fputc(0, f);
    fclose(f);
    d.pid = process_start(argv, NULL, log);
    for (int i = 0; i < 500 && access(ports, R_OK) != 0; i++)
        usleep(10000);
    char *text = file_read(ports, NULL);
    int udp_port = 0, tcp_port = 0;
    ck_assert_int_eq(
        sscanf(text, "{\"udp\":%d,\"tcp\":%d", &udp_port, &tcp_port), 2);
    free(text);
    close(udp);
    udp = connect_udp(udp_port);
    int tcp = connect_tcp(tcp_port);
    read_until(tcp, "{\"type\":\"description\"", 2000);
    send_many("{\"sensor\":\"laser\",\"z\":1}", 6000);
    read_until(tcp, "capture interrupted, fusion goes on", 5000);
    send_text("{\"sensor\":\"laser\",\"z\":1,\"seq\":77}");
    read_until(tcp, "{\"type\":\"estimate\"", 2000);
    unlink(filler); /* there is room again: the capture goes on by itself */
    for (int i = 0; i < 25; i++) {
        send_text("{\"sensor\":\"laser\",\"z\":1}");
        usleep(100000);
    }
    read_until(tcp, "the capture goes on", 5000);
    close(tcp);
    stop();
    struct kept t = read_capture(at);
    ck_assert_int_ge(t.n_gap, 1);
    ck_assert_int_eq(t.n_stop, 1);
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
    tcase_add_test(t, a_clean_stop_leaves_a_capture_that_ends_with_stop);
    tcase_add_test(t, a_kill_leaves_every_whole_record_readable);
    tcase_add_test(t, what_the_kernel_merged_is_taken_apart);
    tcase_add_test(t, a_stop_comes_through_while_somebody_sends_without_pause);
    tcase_add_test(
        t, the_log_ends_with_the_ledger_and_takes_no_bytes_off_the_wire);
    tcase_add_test(t, a_log_that_nobody_reads_stops_nothing);
    tcase_add_test(t, two_daemons_on_one_port_are_explained);
    tcase_add_test(t, what_is_asked_wrongly_ends_with_its_own_exit_code);
    tcase_add_test(t, a_full_disk_stops_the_capture_but_not_the_fusion);
    suite_add_tcase(s, t);
    return s;
}
