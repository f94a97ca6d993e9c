/* Mutated datagrams among good ones: nothing breaks, nothing good is lost,
 * every one is counted.  The long form (CAMPAIGN=mutants) takes a million. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <inttypes.h>
#include <msgpack.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/random.h"
#include "tests/suite.h"
#include "tests/support/drive.h"

#define MS 1000000
#define T0 ((int64_t)1700000000 * 1000000000)

enum { BYTES_MAX = 600 };

static const char rig[] =
    "{\"order\": {\"horizon\": \"100 ms\"},"
    " \"tracks\": {\"carriage\": {\"state\": [{\"model\":"
    "   \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\","
    "   \"q\": \"0.02 m2/s3\"}]},"
    "  \"raft-*\": {\"state\": [{\"model\": \"random-walk\","
    "   \"name\": \"x\", \"unit\": \"m\", \"q\": \"0.02 m2/s\"}]}},"
    " \"sensors\": {\"laser\": {\"track\": \"carriage\", \"reads\": \"x\","
    "   \"unit\": \"m\", \"u\": \"0.01 m\", \"rate\": \"1 kHz\"},"
    "  \"tower\": {\"track\": \"raft-*\", \"reads\": \"x\","
    "   \"unit\": \"m\", \"u\": \"0.01 m\", \"rate\": \"1 kHz\"}}}";

/* What is mutated names a sensor that no few changed bytes turn into ours. */
static const char ghost[] = "ghost-of-a-sensor-that-nobody-declared";

static size_t json(struct random *r, int64_t t_ns, char *out)
{
    int len = snprintf(
        out, BYTES_MAX,
        "[{\"sensor\":\"%s\",\"z\":[%.17g,null,-0.0],\"ns\":%" PRId64
        ",\"seq\":%u,\"u\":[0.1,2e-3],\"extra\":{\"a\":[1,{\"b\":null}]}},"
        "{\"sensor\":\"%s\",\"t\":\"2023-11-14T22:13:20.123456789Z\","
        "\"z\":%g},{\"mark\":\"note\",\"name\":\"n\",\"text\":\"\\u00e9\"}]",
        ghost, random_normal(r), t_ns, (unsigned)random_below(r, 1000), ghost,
        random_normal(r) * 1e30);
    return (size_t)len;
}

static void pack_text(msgpack_packer *p, const char *text)
{
    msgpack_pack_str(p, strlen(text));
    msgpack_pack_str_body(p, text, strlen(text));
}

static size_t packed(struct random *r, int64_t t_ns, char *out)
{
    msgpack_sbuffer buf;
    msgpack_packer p;
    msgpack_sbuffer_init(&buf);
    msgpack_packer_init(&p, &buf, msgpack_sbuffer_write);
    msgpack_pack_array(&p, 2);
    for (int i = 0; i < 2; i++) {
        msgpack_pack_map(&p, 5);
        pack_text(&p, "sensor");
        pack_text(&p, ghost);
        pack_text(&p, "z");
        msgpack_pack_array(&p, 2);
        msgpack_pack_double(&p, random_normal(r));
        msgpack_pack_nil(&p);
        pack_text(&p, "ns");
        msgpack_pack_int64(&p, t_ns);
        pack_text(&p, "seq");
        msgpack_pack_uint64(&p, random_bits(r));
        pack_text(&p, "other");
        msgpack_pack_map(&p, 1);
        msgpack_pack_true(&p);
        msgpack_pack_float(&p, 1.5f);
    }
    size_t len = buf.size;
    memcpy(out, buf.data, len);
    msgpack_sbuffer_destroy(&buf);
    return len;
}

static size_t mutate(struct random *r, char *bytes, size_t len)
{
    int n = 1 + (int)random_below(r, 6);
    for (int i = 0; i < n && len > 1; i++) {
        size_t at = random_below(r, len);
        switch (random_below(r, 5)) {
        case 0:
            bytes[at] = (char)random_bits(r);
            break;
        case 1:
            bytes[at] ^= (char)(1 << random_below(r, 8));
            break;
        case 2: /* cut off the end */
            len = at + 1;
            break;
        case 3: /* a byte less */
            memmove(bytes + at, bytes + at + 1, len - at - 1);
            len--;
            break;
        default: /* a byte twice */
            if (len < BYTES_MAX) {
                memmove(bytes + at + 1, bytes + at, len - at);
                len++;
            }
        }
    }
    return len;
}

static void good(struct drive *d, int i, int64_t a_ns)
{
    if (i % 2 == 0)
        drive_feed(d, a_ns,
                   "{\"sensor\":\"laser\",\"z\":%d.25,\"ns\":%" PRId64
                   ",\"seq\":%d}",
                   i % 3, a_ns - 20 * MS + (i % 5) * MS, i);
    else
        drive_feed(d, a_ns,
                   "{\"sensor\":\"tower\",\"track\":\"raft-%d\","
                   "\"z\":%d,\"ns\":%" PRId64 "}",
                   i % 4, i % 2, a_ns - 10 * MS);
}

START_TEST(mutants_change_nothing_and_are_all_counted)
{
    const char *campaign = getenv("CAMPAIGN");
    int n = campaign && strcmp(campaign, "mutants") == 0 ? 1000000 : 60000;
    struct drive alone, among;
    struct random r;
    random_init(&r, 20260, 0);
    drive_init(&alone, rig);
    drive_init(&among, rig);
    drive_start(&alone, T0);
    drive_start(&among, T0);
    uint64_t n_datagrams = 0, n_good = 0;
    char bytes[BYTES_MAX + 8];
    for (int i = 0; i < n; i++) {
        int64_t a_ns = T0 + (int64_t)(i + 1) * MS / 4;
        size_t len =
            i % 2 == 0 ? json(&r, a_ns, bytes) : packed(&r, a_ns, bytes);
        len = mutate(&r, bytes, len);
        /* its own block, so that a read past the end is seen */
        char *exact = malloc(len);
        memcpy(exact, bytes, len);
        drive_feed_bytes(&among, a_ns, exact, len);
        free(exact);
        n_datagrams++;
        if (i % 50 == 0) {
            good(&alone, i / 50, a_ns);
            good(&among, i / 50, a_ns);
            n_good++;
            n_datagrams++;
        }
    }
    run_stop(alone.run, T0 + (int64_t)n * MS);
    run_stop(among.run, T0 + (int64_t)n * MS);

    ck_assert_uint_eq(drive_total(&alone, OUTCOME_USED) +
                          drive_total(&alone, OUTCOME_GATED),
                      n_good);
    ck_assert_uint_eq(drive_total(&among, OUTCOME_USED),
                      drive_total(&alone, OUTCOME_USED));
    ck_assert_uint_eq(alone.n_settled, among.n_settled);
    ck_assert_int_eq(memcmp(alone.settled, among.settled, alone.n_settled), 0);
    ck_assert_ptr_null(strstr(among.all, "nan"));
    ck_assert_ptr_null(strstr(among.all, "inf"));
    const struct counts *c = run_counts(among.run);
    uint64_t total = 0, datagrams = 0;
    for (int o = 0; o < OUTCOME_COUNT; o++)
        total += c->total.outcome[o];
    for (int o = 0; o < DATAGRAM_OUTCOME_COUNT; o++)
        datagrams += c->datagrams[o];
    ck_assert_uint_eq(datagrams, n_datagrams);
    ck_assert_uint_eq(total - n_good,
                      c->total.outcome[OUTCOME_UNKNOWN_SENSOR] +
                          c->total.outcome[OUTCOME_UNKNOWN_TRACK]);
    printf("mutants: seed 20260, %d, of which decoded %" PRIu64
           ", malformed %" PRIu64 "\n",
           n, c->datagrams[DATAGRAM_DECODED] - n_good,
           c->datagrams[DATAGRAM_MALFORMED]);
    drive_fini(&alone);
    drive_fini(&among);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("mutants");
    TCase *t = tcase_create("mutants");
    tcase_set_timeout(t, 900);
    tcase_add_test(t, mutants_change_nothing_and_are_all_counted);
    suite_add_tcase(s, t);
    return s;
}
