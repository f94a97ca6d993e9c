/* Captures as files: whole, torn, several, and of another kind. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "daemon/capture.h"
#include "tests/suite.h"
#include "tests/support/process.h"

static char folder[64];
static char path[128];
static const struct sender from = {4, {127, 0, 0, 1}, 5000};
static const struct sender to = {4, {127, 0, 0, 1}, 8410};

static void begin(void)
{
    folder_make(folder, sizeof folder);
    snprintf(path, sizeof path, "%s/a.pcap", folder);
}

static void end(void)
{
    folder_remove(folder);
}

static FILE *open_new(const char *name)
{
    uint8_t head[PCAP_FILE_HEAD_SIZE];
    char at[160];
    snprintf(at, sizeof at, "%s/%s", folder, name);
    FILE *f = fopen(at, "wb");
    ck_assert_ptr_nonnull(f);
    pcap_write_file_head(head);
    fwrite(head, 1, sizeof head, f);
    return f;
}

/* A record whose payload is its number. */
static void add(FILE *f, int number)
{
    uint8_t head[PCAP_RECORD_HEAD_MAX];
    char text[32];
    int len = snprintf(text, sizeof text, "%d", number);
    size_t n = pcap_write_record_head(head, 1000000000ll * number, &from, &to,
                                      (const uint8_t *)text, (size_t)len);
    fwrite(head, 1, n, f);
    fwrite(text, 1, (size_t)len, f);
}

static void write_segment(const char *name, int first, int last)
{
    FILE *f = open_new(name);
    for (int i = first; i <= last; i++)
        add(f, i);
    fclose(f);
}

/* Reads to the end: how many records, in order of their numbers from `first`.
 */
static int read_on(struct capture *c, int first)
{
    struct pcap_record r;
    int n = 0;
    while (capture_next(c, &r)) {
        char text[32];
        int len = snprintf(text, sizeof text, "%d", first + n);
        ck_assert_uint_eq(r.len, (size_t)len);
        ck_assert_mem_eq(r.payload, text, r.len);
        ck_assert_int_eq(r.a_ns, 1000000000ll * (first + n));
        ck_assert_int_eq(r.to.port, 8410);
        n++;
    }
    return n;
}

static struct capture *open_good(const char *at)
{
    struct capture *c;
    struct err err;
    ck_assert_msg(capture_open(&c, at, &err) == ST_OK, "%s", err.text);
    return c;
}

START_TEST(a_file_is_read_record_by_record)
{
    write_segment("a.pcap", 1, 20);
    struct capture *c = open_good(path);
    ck_assert_int_eq(read_on(c, 1), 20);
    ck_assert_uint_eq(capture_tally(c)->n_records, 20);
    ck_assert_uint_eq(capture_tally(c)->torn_bytes, 0);
    struct pcap_record r;
    ck_assert(!capture_next(c, &r)); /* the end stays the end */
    capture_close(c);
    capture_close(NULL);
}
END_TEST

START_TEST(a_folder_is_read_in_order_of_its_names)
{
    write_segment("20260504T100000Z-000010.pcap", 21, 30);
    write_segment("20260504T100000Z-000002.pcap", 11, 20);
    write_segment("20260504T100000Z-000001.pcap", 1, 10);
    write_segment("20260504T100000Z-000001.rig.json", 90, 99);
    struct capture *c = open_good(folder);
    ck_assert_int_eq(read_on(c, 1), 30);
    ck_assert_uint_eq(capture_tally(c)->n_files, 3);
    capture_close(c);
}
END_TEST

/* Cut at every length: whole records are given, the rest is stated. */
START_TEST(a_torn_tail_is_stated_in_bytes)
{
    struct stat whole;
    write_segment("a.pcap", 1, 3);
    ck_assert_int_eq(stat(path, &whole), 0);
    int each = (int)(whole.st_size - PCAP_FILE_HEAD_SIZE) / 3;
    for (int len = (int)whole.st_size; len >= PCAP_FILE_HEAD_SIZE; len--) {
        ck_assert_int_eq(truncate(path, len), 0);
        struct capture *c = open_good(path);
        int left = len - PCAP_FILE_HEAD_SIZE;
        ck_assert_int_eq(read_on(c, 1), left / each);
        ck_assert_uint_eq(capture_tally(c)->torn_bytes,
                          (uint64_t)(left % each));
        capture_close(c);
    }
}
END_TEST

START_TEST(what_follows_a_torn_segment_is_read)
{
    FILE *f = open_new("a.pcap");
    for (int i = 1; i <= 5; i++)
        add(f, i);
    fwrite("torn!", 1, 5, f);
    fclose(f);
    write_segment("b.pcap", 6, 9);
    struct capture *c = open_good(folder);
    ck_assert_int_eq(read_on(c, 1), 9);
    ck_assert_uint_eq(capture_tally(c)->torn_bytes, 5);
    capture_close(c);
}
END_TEST

START_TEST(a_segment_that_is_no_capture_counts_as_torn_altogether)
{
    char at[160];
    write_segment("a.pcap", 1, 4);
    write_segment("c.pcap", 5, 6);
    snprintf(at, sizeof at, "%s/b.pcap", folder);
    FILE *f = fopen(at, "w");
    fputs("this is a text of forty bytes, no more..", f);
    fclose(f);
    struct capture *c = open_good(folder);
    ck_assert_int_eq(read_on(c, 1), 6);
    ck_assert_uint_eq(capture_tally(c)->torn_bytes, 40);
    capture_close(c);
}
END_TEST

START_TEST(a_record_that_holds_no_udp_is_counted)
{
    FILE *f = open_new("a.pcap");
    static const uint8_t tcp[16 + 20] = {1, 0,  0, 0,  0, 0, 0,  0,    20,
                                         0, 0,  0, 20, 0, 0, 0,  0x45, 0,
                                         0, 20, 0, 0,  0, 0, 64, 6};
    add(f, 1);
    fwrite(tcp, 1, sizeof tcp, f);
    add(f, 2);
    fclose(f);
    struct capture *c = open_good(path);
    ck_assert_int_eq(read_on(c, 1), 2);
    ck_assert_uint_eq(capture_tally(c)->n_skipped, 1);
    capture_close(c);
}
END_TEST

static void expect_error(const char *at, status want, const char *text)
{
    struct capture *c;
    struct err err;
    ck_assert_int_eq(capture_open(&c, at, &err), want);
    ck_assert_ptr_null(c);
    ck_assert_msg(strstr(err.text, text) != NULL, "%s", err.text);
    ck_assert_msg(strstr(err.text, at) != NULL, "%s", err.text);
}

static const struct {
    uint8_t linktype[2];
    const char *name;
} foreign[] = {{{0}, "0, NULL (loopback)"},
               {{1}, "1, EN10MB (Ethernet)"},
               {{113}, "113, LINUX_SLL"},
               {{20, 1}, "276, LINUX_SLL2"},
               {{99}, "99, unknown"}};

START_TEST(a_link_type_that_is_not_built_is_named)
{
    write_segment("a.pcap", 1, 1);
    FILE *f = fopen(path, "r+b");
    fseek(f, 20, SEEK_SET);
    fwrite(foreign[_i].linktype, 1, 2, f);
    fclose(f);
    expect_error(path, ST_LATER, foreign[_i].name);
}
END_TEST

START_TEST(what_is_no_capture_is_explained)
{
    char at[160];
    snprintf(at, sizeof at, "%s/none.pcap", folder);
    expect_error(at, ST_IO, "No such file");
    expect_error(folder, ST_IO, "no *.pcap file in this folder");
    FILE *f = fopen(path, "w");
    fputs("short", f);
    fclose(f);
    expect_error(path, ST_PARSE, "5 bytes, too short");
    f = fopen(path, "w");
    fputs("\n\r\r\n and so on, as pcapng begins", f);
    fclose(f);
    expect_error(path, ST_PARSE, "pcapng is not built yet");
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("capture");
    TCase *t = tcase_create("capture");
    tcase_add_checked_fixture(t, begin, end);
    tcase_add_test(t, a_file_is_read_record_by_record);
    tcase_add_test(t, a_folder_is_read_in_order_of_its_names);
    tcase_add_test(t, a_torn_tail_is_stated_in_bytes);
    tcase_add_test(t, what_follows_a_torn_segment_is_read);
    tcase_add_test(t, a_segment_that_is_no_capture_counts_as_torn_altogether);
    tcase_add_test(t, a_record_that_holds_no_udp_is_counted);
    tcase_add_loop_test(t, a_link_type_that_is_not_built_is_named, 0,
                        sizeof foreign / sizeof *foreign);
    tcase_add_test(t, what_is_no_capture_is_explained);
    suite_add_tcase(s, t);
    return s;
}
