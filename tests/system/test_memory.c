/* An hour on the rig needs the memory that `check` names, no byte more: the
 * run stands before a page that nobody may touch, and nothing is allocated. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cjson/cJSON.h>
#include <malloc.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <unistd.h>

#include "config/load.h"
#include "core/run/run.h"
#include "daemon/capture.h"
#include "tests/suite.h"
#include "tests/support/process.h"

static void count(void *ctx, const struct message *m)
{
    uint64_t *n = ctx;
    *n += m->type == MESSAGE_ESTIMATE;
}

static char *arg(const char *text)
{
    return (char *)(size_t)text;
}

static size_t printed_bytes(const char *folder)
{
    char out[128];
    snprintf(out, sizeof out, "%s/check.json", folder);
    char *argv[] = {arg(TOOL_PATH), arg("check"), arg("config/rigs/rafts.json"),
                    arg("--json"), NULL};
    ck_assert_int_eq(process_run(argv, out, NULL), 0);
    char *text = file_read(out, NULL);
    cJSON *root = cJSON_Parse(text);
    double bytes = cJSON_GetObjectItem(root, "memory_bytes")->valuedouble;
    cJSON_Delete(root);
    free(text);
    return (size_t)bytes;
}

/* Memory of exactly this size that ends where a forbidden page begins. */
static char *before_a_wall(size_t bytes, void **mapping, size_t *len)
{
    size_t page = (size_t)sysconf(_SC_PAGESIZE);
    size_t whole = (bytes + page - 1) / page * page;
    *len = whole + page;
    *mapping = mmap(NULL, *len, PROT_READ | PROT_WRITE,
                    MAP_PRIVATE | MAP_ANONYMOUS, -1, 0);
    ck_assert_ptr_ne(*mapping, MAP_FAILED);
    mprotect((char *)*mapping + whole, page, PROT_NONE);
    return (char *)*mapping + whole - bytes;
}

START_TEST(an_hour_takes_the_memory_that_check_prints)
{
    char folder[64], pcap[128];
    folder_make(folder, sizeof folder);
    snprintf(pcap, sizeof pcap, "%s/hour.pcap", folder);
    char *rehearse[] = {arg(TOOL_PATH),
                        arg("rehearse"),
                        arg("config/rigs/rafts.json"),
                        arg("--lasts"),
                        arg("1 h"),
                        arg("--out"),
                        pcap,
                        NULL};
    ck_assert_int_eq(process_run(rehearse, NULL, NULL), 0);

    struct settings *s;
    struct problems problems;
    problems_init(&problems);
    ck_assert_int_eq(
        settings_load(&s, "config/rigs/rafts.json", NULL, 0, &problems), ST_OK);
    problems_fini(&problems);
    size_t bytes = run_bytes(&s->rig);
    ck_assert_uint_eq(bytes, printed_bytes(folder));

    void *mapping;
    size_t len;
    uint64_t n_estimates = 0, n = 0;
    char *memory = before_a_wall(bytes, &mapping, &len);
    struct run *run =
        run_init(memory, bytes, &s->rig,
                 (struct message_sink){count, &n_estimates, NULL});
    struct capture *c;
    struct pcap_record r;
    ck_assert_int_eq(capture_open(&c, pcap, NULL), ST_OK);
    size_t before = mallinfo2().uordblks;
    while (capture_next(c, &r)) {
        if (n++ == 0)
            run_start(run, r.a_ns);
        run_feed(run, r.a_ns, &r.from, r.payload, r.len);
    }
    run_stop(run, r.a_ns + 1000000000);
    ck_assert_uint_eq(mallinfo2().uordblks, before);
    ck_assert_uint_gt(n, 180000);
    ck_assert_uint_gt(n_estimates, 2 * 180000);
    printf("memory: %zu bytes for %llu datagrams of one hour\n", bytes,
           (unsigned long long)n);
    capture_close(c);
    settings_free(s);
    munmap(mapping, len);
    folder_remove(folder);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("memory");
    TCase *t = tcase_create("memory");
    tcase_set_timeout(t, 200);
    tcase_add_test(t, an_hour_takes_the_memory_that_check_prints);
    suite_add_tcase(s, t);
    return s;
}
