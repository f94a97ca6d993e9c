/* The tool as a process: replay, send and follow. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/pcap.h"
#include "tests/suite.h"

#include <arpa/inet.h>
#include <cjson/cJSON.h>
#include <netinet/in.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <unistd.h>

#include "core/wire/decode.h"
#include "tests/support/tool.h"
#include "tools/call.h"

/* --- replay -------------------------------------------------------------- */

/* Lines of `tool_out` that hold `word`. */
static int lines_with(const char *word)
{
    int n = 0;
    for (const char *line = tool_out; *line != '\0';) {
        size_t len = strcspn(line, "\n");
        n += memmem(line, len, word, strlen(word)) != NULL;
        line += len + 1;
    }
    return n;
}

static const char *last_line(void)
{
    ck_assert_uint_gt(tool_out_len, 1);
    tool_out[tool_out_len - 1] = '\0';
    const char *newline = strrchr(tool_out, '\n');
    return newline == NULL ? tool_out : newline + 1;
}

static const char *make_capture(void)
{
    const char *rig = tool_write("rig.json", tool_rig);
    const char *table = tool_write("a.csv", tool_table);
    ck_assert_int_eq(TOOL("import", table, tool_path("a.pcap")), EXIT_FINE);
    return rig;
}

static const struct {
    const char *stream;
    bool has_live, has_settled;
} streams[] = {{"live", true, false},
               {"settled", false, true},
               {"both", true, true},
               {"none", false, false}};

START_TEST(replay_writes_the_chosen_streams_and_a_summary_last)
{
    const char *rig = make_capture();
    ck_assert_int_eq(TOOL("replay", rig, tool_path("a.pcap"), "--stream",
                          streams[_i].stream),
                     EXIT_FINE);
    ck_assert_int_eq(strncmp(tool_out, "{\"type\":\"description\"", 21), 0);
    ck_assert_int_eq(lines_with("\"stream\":\"live\"") > 0,
                     streams[_i].has_live);
    ck_assert_int_eq(lines_with("\"stream\":\"settled\""),
                     streams[_i].has_settled ? 4 : 0);
    cJSON *summary = cJSON_Parse(last_line());
    ck_assert_str_eq(
        cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(summary, "type")),
        "summary");
    cJSON_Delete(summary);
    ck_assert_ptr_nonnull(strstr(tool_said, "a foreign capture"));
}
END_TEST

START_TEST(a_summary_counts_every_measurement_once)
{
    const char *rig = make_capture();
    ck_assert_int_eq(
        TOOL("replay", rig, tool_path("a.pcap"), "--stream", "none"),
        EXIT_FINE);
    cJSON *summary = cJSON_Parse(last_line());
    const cJSON *counts = cJSON_GetObjectItemCaseSensitive(summary, "counts");
    const cJSON *total = cJSON_GetObjectItemCaseSensitive(
        cJSON_GetObjectItemCaseSensitive(counts, "measurements"), "total");
    double sum = 0;
    const cJSON *outcome;
    cJSON_ArrayForEach(outcome, total) sum += outcome->valuedouble;
    ck_assert_double_eq_tol(sum, 5, 1e-15);
    ck_assert_double_eq_tol(
        cJSON_GetObjectItemCaseSensitive(total, "unknown-sensor")->valuedouble,
        1, 1e-15);
    cJSON_Delete(summary);
}
END_TEST

START_TEST(replay_twice_gives_the_same_bytes)
{
    static char first[TOOL_OUTPUT_MAX];
    const char *rig = make_capture();
    ck_assert_int_eq(TOOL("replay", rig, tool_path("a.pcap")), EXIT_FINE);
    memcpy(first, tool_out, tool_out_len + 1);
    ck_assert_int_eq(
        TOOL("replay", rig, tool_path("a.pcap"), "--out", tool_path("b.jsonl")),
        EXIT_FINE);
    ck_assert_str_eq(tool_out, "");
    tool_read(tool_path("b.jsonl"), tool_out);
    ck_assert_str_eq(tool_out, first);
}
END_TEST

static size_t size_of(const char *path)
{
    return tool_read(path, tool_out);
}

/* What is read, and what ropewalkd recorded, stays as it is. */
START_TEST(nothing_that_counts_is_written_over)
{
    uint8_t record[256], head[PCAP_FILE_HEAD_SIZE];
    const char *rig = make_capture(), *capture = tool_path("a.pcap");
    size_t before = size_of(capture), n;
    ck_assert_int_eq(TOOL("replay", rig, capture, "--out", capture),
                     EXIT_NOT_THERE);
    ck_assert_ptr_nonnull(strstr(tool_said, "is read as well"));
    ck_assert_int_eq(TOOL("replay", rig, capture, "--out", rig),
                     EXIT_NOT_THERE);
    ck_assert_uint_eq(size_of(capture), before);
    ck_assert_int_eq(TOOL("replay", capture, rig), EXIT_BAD_SETTINGS);
    ck_assert_ptr_nonnull(strstr(tool_said, "the rig file comes first"));

    const char *ours = tool_path("ours.pcap");
    FILE *file = fopen(ours, "wb");
    pcap_write_file_head(head);
    n = pcap_write_control(record, sizeof record, CONTROL_START, 1, 1,
                           "build hash");
    ck_assert_uint_gt(n, 0);
    fwrite(head, sizeof head, 1, file);
    fwrite(record, n, 1, file);
    fclose(file);
    before = size_of(ours);
    ck_assert_int_eq(TOOL("replay", rig, capture, "--out", ours),
                     EXIT_NOT_THERE);
    ck_assert_ptr_nonnull(strstr(tool_said, "ropewalkd made"));
    ck_assert_uint_eq(size_of(ours), before);
    /* Its start names another rig file than this. */
    ck_assert_int_eq(TOOL("replay", rig, ours), EXIT_FINE);
    ck_assert_ptr_nonnull(strstr(tool_said, "another rig file"));
}
END_TEST

START_TEST(a_port_that_cannot_be_is_refused)
{
    ck_assert_int_eq(TOOL("send", "laser", "1", "--to", "127.0.0.1:99999"),
                     EXIT_WRONG_USE);
    ck_assert_ptr_nonnull(strstr(tool_said, "up to 65535"));
}
END_TEST

START_TEST(datagrams_to_another_port_are_counted_and_said)
{
    const char *rig = make_capture();
    ck_assert_int_eq(TOOL("replay", rig, tool_path("a.pcap"), "--port", "9"),
                     EXIT_FINE);
    ck_assert_ptr_nonnull(
        strstr(tool_said, "5 datagrams to other ports than 9"));
    ck_assert_int_eq(TOOL("replay", rig, tool_path("none.pcap")),
                     EXIT_NOT_THERE);
    ck_assert_int_eq(
        TOOL("replay", rig, tool_path("a.pcap"), "--stream", "smooth"),
        EXIT_WRONG_USE);
}
END_TEST

/* --- send and follow ----------------------------------------------------- */

/* A socket on a port of the system's choice; its address as text. */
static int listen_at(int type, char *address, size_t size)
{
    struct sockaddr_in at = {.sin_family = AF_INET};
    socklen_t len = sizeof at;
    at.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
    int fd = socket(AF_INET, type | SOCK_CLOEXEC, 0);
    ck_assert_int_eq(bind(fd, (struct sockaddr *)&at, sizeof at), 0);
    ck_assert_int_eq(getsockname(fd, (struct sockaddr *)&at, &len), 0);
    if (type == SOCK_STREAM)
        ck_assert_int_eq(listen(fd, 4), 0);
    snprintf(address, size, "127.0.0.1:%d", ntohs(at.sin_port));
    return fd;
}

static void receive(int fd, struct wire_decoder *d)
{
    static uint8_t bytes[65536];
    ssize_t got = recv(fd, bytes, sizeof bytes, MSG_DONTWAIT);
    ck_assert_int_gt(got, 0);
    ck_assert_int_eq(wire_decode(d, bytes, (size_t)got), DATAGRAM_DECODED);
}

START_TEST(send_puts_one_measurement_on_the_wire_and_shows_it)
{
    static struct wire_decoder d;
    char address[64];
    int fd = listen_at(SOCK_DGRAM, address, sizeof address);
    ck_assert_int_eq(TOOL("send", "laser", "-1.25", "--t", "1000000000.5",
                          "--u", "0.002", "--to", address),
                     EXIT_FINE);
    ck_assert_str_eq(tool_out, "");
    ck_assert_str_eq(tool_said,
                     "{\"sensor\":\"laser\",\"t\":\"2001-09-09T01:46:40."
                     "500000000Z\",\"z\":-1.25,\"u\":0.002}\n");
    receive(fd, &d);
    ck_assert_int_eq(d.element[0].t_ns, 1000000000500000000);
    ck_assert_double_eq_tol(d.element[0].z[0], -1.25, 1e-15);
    ck_assert_double_eq_tol(d.element[0].u[0], 0.002, 1e-15);
    close(fd);
}
END_TEST

START_TEST(send_takes_lines_in_batches_and_refuses_bad_ones)
{
    static struct wire_decoder d;
    char address[64];
    int fd = listen_at(SOCK_DGRAM, address, sizeof address);
    ck_assert_int_eq(tool_run("1.5\nnothing\n{\"sensor\":\"b\",\"z\":2}\n"
                              "{\"sensor\":\"b\",\"z\":1e999}\n"
                              "[{\"sensor\":\"b\",\"z\":1},{\"z\":2}]\n3,4\n",
                              "send", "a", "--batch", "2", "--to", address,
                              NULL),
                     EXIT_PROBLEM);
    ck_assert_ptr_nonnull(strstr(tool_said, "standard input:2: "));
    ck_assert_ptr_nonnull(strstr(tool_said, "standard input:4: "));
    ck_assert_ptr_nonnull(strstr(tool_said, "standard input:5: "));
    receive(fd, &d);
    ck_assert_int_eq(d.n, 2);
    ck_assert_int_eq(d.element[1].sensor.at[0], 'b');
    receive(fd, &d);
    ck_assert_int_eq(d.n, 1);
    ck_assert_int_eq(d.element[0].n_z, 2);
    close(fd);
}
END_TEST

START_TEST(send_to_nobody_says_so)
{
    char address[64];
    close(listen_at(SOCK_DGRAM, address, sizeof address));
    ck_assert_int_eq(TOOL("send", "a", "1", "--to", address), EXIT_NOT_THERE);
    ck_assert_ptr_nonnull(strstr(tool_said, "nobody listens there"));
}
END_TEST

/* Takes one subscriber, reads its request and answers with `text`. */
static void serve(int fd, char *request, size_t size, const char *text)
{
    int peer = accept(fd, NULL, NULL);
    ck_assert_int_ge(peer, 0);
    ssize_t got = recv(peer, request, size - 1, 0);
    ck_assert_int_gt(got, 0);
    request[got] = '\0';
    ck_assert_int_eq(send(peer, text, strlen(text), MSG_NOSIGNAL),
                     (int)strlen(text));
    close(peer);
}

START_TEST(follow_asks_prints_and_connects_again)
{
    char address[64], request[512];
    int fd = listen_at(SOCK_STREAM, address, sizeof address);
    const char *argv[] = {"ropewalk", "follow",   address,  "--stream",
                          "settled",  "--tracks", "tank,b", "--count",
                          "2",        NULL};
    pid_t pid = tool_start(argv, "");
    serve(fd, request, sizeof request,
          "{\"type\":\"description\"}\n{\"type\":\"estimate\",\"n\":1}\n"
          "{\"type\":\"esti");
    ck_assert_str_eq(request, "{\"tracks\":[\"tank\",\"b\"],\"stream\":"
                              "\"settled\",\"mode\":\"every\"}\n");
    serve(fd, request, sizeof request,
          "{\"type\":\"description\"}\n{\"type\":\"estimate\",\"n\":2}\n"
          "{\"type\":\"estimate\",\"n\":3}\n");
    ck_assert_int_eq(tool_end(pid), EXIT_FINE);
    ck_assert_str_eq(tool_out, "{\"type\":\"description\"}\n"
                               "{\"type\":\"estimate\",\"n\":1}\n"
                               "{\"type\":\"description\"}\n"
                               "{\"type\":\"estimate\",\"n\":2}\n");
    ck_assert_ptr_nonnull(strstr(tool_said, "the connection ended"));
    close(fd);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("tool data");
    TCase *t = tcase_create("replay");
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_set_timeout(t, 30);
    tcase_add_loop_test(t, replay_writes_the_chosen_streams_and_a_summary_last,
                        0, 4);
    tcase_add_test(t, a_summary_counts_every_measurement_once);
    tcase_add_test(t, replay_twice_gives_the_same_bytes);
    tcase_add_test(t, nothing_that_counts_is_written_over);
    tcase_add_test(t, a_port_that_cannot_be_is_refused);
    tcase_add_test(t, datagrams_to_another_port_are_counted_and_said);
    suite_add_tcase(s, t);
    t = tcase_create("network");
    tcase_add_checked_fixture(t, tool_folder_make, tool_folder_remove);
    tcase_set_timeout(t, 30);
    tcase_add_test(t, send_puts_one_measurement_on_the_wire_and_shows_it);
    tcase_add_test(t, send_takes_lines_in_batches_and_refuses_bad_ones);
    tcase_add_test(t, send_to_nobody_says_so);
    tcase_add_test(t, follow_asks_prints_and_connects_again);
    suite_add_tcase(s, t);
    return s;
}
