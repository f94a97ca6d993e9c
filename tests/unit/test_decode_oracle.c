/* The decoder against independent witnesses: the same random content as JSON
 * that cJSON reads, and as MessagePack that msgpack-c packs and reads. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <cjson/cJSON.h>
#include <math.h>
#include <msgpack.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "core/math/random.h"
#include "core/wire/decode_form.h"
#include "tests/suite.h"

enum { TEXT_MAX = 4000, KEYS_MAX = 9 };

/* What one element says, before it is any encoding. */
struct content {
    char sensor[64], track[64], note[64];
    int n_z, n_u, time; /* time: 0 none, 1 seconds, 2 ns, 3 RFC 3339 text */
    bool is_scalar, has_seq, has_track, has_note, has_unknown;
    double z[READS_MAX], u, t; /* z NaN: null */
    int64_t ns;
    char stamp[80];
    uint64_t seq;
    int order[KEYS_MAX];
};

static struct wire_decoder d;

static void random_id(struct random *r, char out[64])
{
    static const char first[] = "abcXYZ019", more[] = "abcXYZ019_.:-";
    size_t len = 1 + random_below(r, 63);
    out[0] = first[random_below(r, sizeof first - 1)];
    for (size_t i = 1; i < len; i++)
        out[i] = more[random_below(r, sizeof more - 1)];
    out[len] = 0;
}

static double random_number(struct random *r)
{
    double x = random_normal(r) * pow(10, 30 * random_uniform(r) - 15);
    switch (random_below(r, 4)) {
    case 0:
        return (double)((int64_t)random_below(r, 2000001) - 1000000);
    case 1: /* few decimals, as sensors print */
        return (double)((int64_t)random_below(r, 2000001) - 1000000) / 1000;
    default:
        return x;
    }
}

static void shuffle(struct random *r, int *order, int n)
{
    for (int i = 0; i < n; i++)
        order[i] = i;
    for (int i = n - 1; i > 0; i--) {
        int k = (int)random_below(r, (uint64_t)i + 1), kept = order[i];
        order[i] = order[k];
        order[k] = kept;
    }
}

static void random_content(struct random *r, struct content *c)
{
    memset(c, 0, sizeof *c);
    random_id(r, c->sensor);
    random_id(r, c->track);
    snprintf(c->note, sizeof c->note,
             "\"\\/\b\f\n\r\t\x01 \xc3\xa9 "
             "\xf0\x9f\x98\x80 %d",
             (int)random_below(r, 1000));
    c->n_z = 1 + (int)random_below(r, READS_MAX);
    c->is_scalar = c->n_z == 1 && random_below(r, 2);
    for (int i = 0; i < c->n_z; i++)
        c->z[i] = !c->is_scalar && random_below(r, 8) == 0 ? (double)NAN
                                                           : random_number(r);
    c->n_u = (int)random_below(r, 2);
    c->u = fabs(random_number(r));
    c->time = (int)random_below(r, 4);
    c->t = 1.6e9 + 2e8 * random_uniform(r);
    c->ns = (int64_t)(random_bits(r) >> 2);
    snprintf(c->stamp, sizeof c->stamp, "20%02d-%02d-%02dT%02d:%02d:%02d.%09dZ",
             (int)random_below(r, 100), 1 + (int)random_below(r, 12),
             1 + (int)random_below(r, 28), (int)random_below(r, 24),
             (int)random_below(r, 60), (int)random_below(r, 60),
             (int)random_below(r, 1000000000));
    c->has_seq = random_below(r, 2);
    c->seq = random_bits(r) >> random_below(r, 64);
    c->has_track = random_below(r, 2);
    c->has_note = random_below(r, 4) == 0;
    c->has_unknown = random_below(r, 3) == 0;
    shuffle(r, c->order, KEYS_MAX);
}

/* Key k of the content, or NULL when it is not there. */
static const char *key_of(const struct content *c, int k)
{
    static const char *const times[] = {NULL, "t", "ns", "t"};
    switch (k) {
    case 0:
        return "sensor";
    case 1:
        return "z";
    case 2:
        return times[c->time];
    case 3:
        return c->has_seq ? "seq" : NULL;
    case 4:
        return c->has_track ? "track" : NULL;
    case 5:
        return c->n_u ? "u" : NULL;
    case 6:
        return c->has_note ? "text" : NULL;
    case 7:
        return c->has_unknown ? "unknown" : NULL;
    default:
        return "v";
    }
}

/* --- as JSON -------------------------------------------------------------- */

static cJSON *exact(const char *digits)
{
    return cJSON_CreateRaw(digits);
}

static cJSON *json_number(double x)
{
    char text[40];
    snprintf(text, sizeof text, "%.17g", x);
    return isnan(x) ? cJSON_CreateNull() : exact(text);
}

static cJSON *json_value(const struct content *c, int k)
{
    char text[40];
    cJSON *list;
    switch (k) {
    case 0:
        return cJSON_CreateString(c->sensor);
    case 1:
        if (c->is_scalar)
            return json_number(c->z[0]);
        list = cJSON_CreateArray();
        for (int i = 0; i < c->n_z; i++)
            cJSON_AddItemToArray(list, json_number(c->z[i]));
        return list;
    case 2:
        snprintf(text, sizeof text, "%lld", (long long)c->ns);
        return c->time == 1   ? json_number(c->t)
               : c->time == 2 ? exact(text)
                              : cJSON_CreateString(c->stamp);
    case 3:
        snprintf(text, sizeof text, "%llu", (unsigned long long)c->seq);
        return exact(text);
    case 4:
        return cJSON_CreateString(c->track);
    case 5:
        return json_number(c->u);
    case 6:
        return cJSON_CreateString(c->note);
    case 7:
        return exact(
            "{\"a\": [1, {\"b\": \"\\u00e9\"}, [null, false]], \"\": 1e9}");
    default:
        return exact("1");
    }
}

/* Spaced or tight, as chance has it. */
static char *json_text(struct random *r, const struct content *c)
{
    cJSON *tree = cJSON_CreateObject();
    for (int i = 0; i < KEYS_MAX; i++) {
        const char *key = key_of(c, c->order[i]);
        if (key)
            cJSON_AddItemToObject(tree, key, json_value(c, c->order[i]));
    }
    char *text =
        random_below(r, 2) ? cJSON_Print(tree) : cJSON_PrintUnformatted(tree);
    cJSON_Delete(tree);
    return text;
}

/* --- as MessagePack ------------------------------------------------------- */

static void pack_text(msgpack_packer *p, const char *text)
{
    msgpack_pack_str_with_body(p, text, strlen(text));
}

/* As an integer where it is one, else as a double; NaN as nil or as NaN. */
static void pack_number(msgpack_packer *p, double x, bool is_nil)
{
    if (isnan(x) && is_nil)
        msgpack_pack_nil(p);
    else if (x == rint(x) && fabs(x) < 1e6 && !signbit(x))
        msgpack_pack_int64(p, (int64_t)x);
    else
        msgpack_pack_double(p, x);
}

static void pack_unknown(msgpack_packer *p)
{
    msgpack_pack_map(p, 2);
    msgpack_pack_array(p, 1); /* a key that no JSON could have */
    msgpack_pack_nil(p);
    msgpack_pack_bin_with_body(p, "\xff\0\xff", 3);
    msgpack_pack_int(p, -7);
    msgpack_pack_ext_with_body(p, "12345678901234567", 17, 5);
}

static void pack_value(msgpack_packer *p, const struct content *c, int k)
{
    struct timespec stamp = {(time_t)(c->ns / 1000000000),
                             (long)(c->ns % 1000000000)};
    msgpack_timestamp ts = {stamp.tv_sec, (uint32_t)stamp.tv_nsec};
    switch (k) {
    case 0:
        pack_text(p, c->sensor);
        break;
    case 1:
        if (!c->is_scalar)
            msgpack_pack_array(p, (size_t)c->n_z);
        for (int i = 0; i < c->n_z; i++)
            pack_number(p, c->z[i], i % 2);
        break;
    case 2:
        if (c->time == 1)
            msgpack_pack_double(p, c->t);
        else if (c->time == 2 && c->order[0] % 2)
            msgpack_pack_int64(p, c->ns);
        else if (c->time == 2)
            msgpack_pack_timestamp(p, &ts); /* under `t`, see pack */
        else
            pack_text(p, c->stamp);
        break;
    case 3:
        msgpack_pack_uint64(p, c->seq);
        break;
    case 4:
        pack_text(p, c->track);
        break;
    case 5:
        msgpack_pack_double(p, c->u);
        break;
    case 6:
        pack_text(p, c->note);
        break;
    case 7:
        pack_unknown(p);
        break;
    default:
        msgpack_pack_int(p, 1);
    }
}

static void pack(msgpack_sbuffer *buf, const struct content *c)
{
    msgpack_packer p;
    size_t n = 0;
    msgpack_packer_init(&p, buf, msgpack_sbuffer_write);
    for (int k = 0; k < KEYS_MAX; k++)
        n += key_of(c, k) != NULL;
    msgpack_pack_map(&p, n);
    for (int i = 0; i < KEYS_MAX; i++) {
        const char *key = key_of(c, c->order[i]);
        if (!key)
            continue;
        bool is_timestamp =
            c->order[i] == 2 && c->time == 2 && c->order[0] % 2 == 0;
        pack_text(&p, is_timestamp ? "t" : key);
        pack_value(&p, c, c->order[i]);
    }
}

/* --- what must have come out ---------------------------------------------- */

static void same_text(const struct text *t, const char *wanted, bool is_there)
{
    ck_assert_int_eq(t->len, is_there ? (int)strlen(wanted) : 0);
    ck_assert(!is_there || memcmp(t->at, wanted, (size_t)t->len) == 0);
}

static void same_measurement(const struct measurement *m,
                             const struct content *c)
{
    same_text(&m->sensor, c->sensor, true);
    same_text(&m->track, c->track, c->has_track);
    same_text(&m->note, c->note, c->has_note);
    ck_assert_int_eq(m->mark, MARK_NONE);
    ck_assert_int_eq(m->n_z, c->n_z);
    for (int i = 0; i < c->n_z; i++)
        ck_assert(isnan(c->z[i]) ? isnan(m->z[i]) : m->z[i] == c->z[i]);
    ck_assert_int_eq(m->n_u, c->n_u);
    ck_assert(c->n_u == 0 || m->u[0] == c->u);
    ck_assert_int_eq(m->has_seq, c->has_seq);
    ck_assert(!c->has_seq || m->seq == c->seq);
    ck_assert_int_eq(m->has_t, c->time != 0);
    if (c->time == 1) { /* t = n 2^-22 exactly */
        unsigned __int128 ns = (unsigned __int128)(uint64_t)ldexp(c->t, 22);
        ns = (ns * 1000000000 + (1 << 21)) >> 22;
        ck_assert_int_eq(m->t_ns, (int64_t)ns);
    } else if (c->time == 2) {
        ck_assert_int_eq(m->t_ns, c->ns);
    } else if (c->time == 3) { /* glibc's calendar as the witness */
        struct tm tm = {0};
        char *rest = strptime(c->stamp, "%Y-%m-%dT%H:%M:%S", &tm);
        ck_assert_int_eq(m->t_ns, (int64_t)timegm(&tm) * 1000000000 +
                                      strtol(rest + 1, NULL, 10));
    }
}

START_TEST(random_content_comes_out_of_json_as_it_went_in)
{
    struct random r;
    random_init(&r, (uint64_t)_i, 1);
    for (int i = 0; i < 4000; i++) {
        struct content c;
        random_content(&r, &c);
        char *text = json_text(&r, &c);
        ck_assert_msg(wire_decode(&d, (uint8_t *)text, strlen(text)) ==
                          DATAGRAM_DECODED,
                      "%s: %s", text, d.reason);
        same_measurement(&d.element[0], &c);
        cJSON *tree = cJSON_Parse(text); /* what cJSON gets right */
        cJSON *z = cJSON_GetObjectItemCaseSensitive(tree, "z");
        for (int k = 0; k < c.n_z; k++) {
            cJSON *item = cJSON_IsArray(z) ? cJSON_GetArrayItem(z, k) : z;
            ck_assert_int_eq(cJSON_IsNull(item), isnan(d.element[0].z[k]) != 0);
            ck_assert(cJSON_IsNull(item) ||
                      item->valuedouble == d.element[0].z[k]);
        }
        cJSON_Delete(tree);
        cJSON_free(text);
    }
}
END_TEST

START_TEST(random_content_comes_out_of_messagepack_as_it_went_in)
{
    struct random r;
    random_init(&r, (uint64_t)_i, 2);
    for (int i = 0; i < 4000; i++) {
        struct content c;
        msgpack_sbuffer buf;
        random_content(&r, &c);
        msgpack_sbuffer_init(&buf);
        pack(&buf, &c);
        ck_assert_msg(wire_decode(&d, (uint8_t *)buf.data, buf.size) ==
                          DATAGRAM_DECODED,
                      "%s", d.reason);
        same_measurement(&d.element[0], &c);
        msgpack_sbuffer_destroy(&buf);
    }
}
END_TEST

/* Mutated bytes: what we accept msgpack-c reads as one whole object.  (The
 * other way round does not hold: it knows no UTF-8 and no sensor.) */
START_TEST(what_is_accepted_of_mutated_messagepack_is_messagepack)
{
    struct random r;
    int n_accepted = 0;
    random_init(&r, 5, 3);
    for (int i = 0; i < 40000; i++) {
        struct content c;
        msgpack_sbuffer buf;
        random_content(&r, &c);
        msgpack_sbuffer_init(&buf);
        pack(&buf, &c);
        buf.data[random_below(&r, buf.size)] = (char)random_bits(&r);
        if (wire_decode(&d, (uint8_t *)buf.data, buf.size) ==
            DATAGRAM_DECODED) {
            msgpack_unpacked got;
            size_t at = 0;
            msgpack_unpacked_init(&got);
            ck_assert_int_eq(msgpack_unpack_next(&got, buf.data, buf.size, &at),
                             MSGPACK_UNPACK_SUCCESS);
            while (at < buf.size && strchr("\n\r", buf.data[at]))
                at++; /* NUL too: it is the end of that string */
            ck_assert_uint_eq(at, buf.size);
            msgpack_unpacked_destroy(&got);
            n_accepted++;
        }
        msgpack_sbuffer_destroy(&buf);
    }
    ck_assert_int_gt(n_accepted, 4000);
}
END_TEST

/* `code` in n bytes, whether or not UTF-8 allows it. */
static void put_code(uint8_t *out, uint32_t code, int n)
{
    static const uint8_t lead[] = {0, 0, 0xc0, 0xe0, 0xf0};
    for (int i = n - 1; i > 0; i--, code >>= 6)
        out[i] = (uint8_t)(0x80 | (code & 0x3f));
    out[0] = (uint8_t)(lead[n] | code);
}

/* RFC 3629: U+0000..U+10FFFF without surrogates, each in its shortest form. */
START_TEST(utf8_is_every_code_point_in_its_shortest_form_and_nothing_else)
{
    static const uint32_t end[] = {0, 0x80, 0x800, 0x10000, 0x200000};
    for (int n = 1; n <= 4; n++)
        for (uint32_t code = 0; code < end[n]; code++) {
            uint8_t s[24];
            bool is_good = code >= end[n - 1] && code <= 0x10ffff &&
                           (code < 0xd800 || code > 0xdfff);
            size_t before = code % 11, after = code % 9;
            memset(s, 'x', sizeof s);
            put_code(s + before, code, n);
            size_t len = before + (size_t)n + after;
            ck_assert_msg(decode_is_utf8(s, len) == is_good, "%x in %d", code,
                          n);
            /* cut inside the character */
            ck_assert(n == 1 || !decode_is_utf8(s, before + (size_t)n - 1));
        }
    for (size_t len = 1; len <= 20; len++)
        for (size_t i = 0; i < len; i++) {
            uint8_t s[20];
            memset(s, 'x', sizeof s);
            ck_assert(decode_is_utf8(s, len));
            s[i] = 0x80; /* a continuation of nothing */
            ck_assert(!decode_is_utf8(s, len));
        }
}
END_TEST

START_TEST(decimal_texts_read_as_strtod_reads_them)
{
    struct random r;
    random_init(&r, 13, 0);
    for (int i = 0; i < 200000; i++) {
        char text[64];
        uint64_t bits = random_bits(&r);
        double x, got;
        memcpy(&x, &bits, sizeof x);
        if (!isfinite(x) || i % 2 == 0)
            x = random_normal(&r) * pow(10, (double)random_below(&r, 40) - 20);
        int n = snprintf(text, sizeof text, "%.*g",
                         1 + (int)random_below(&r, 19), x);
        if (!isfinite(strtod(text, NULL)))
            continue;
        ck_assert(wire_parse_number(text, (size_t)n, &got));
        ck_assert_msg(got == strtod(text, NULL), "%s", text);
    }
    double v;
    ck_assert(!wire_parse_number("0x10", 4, &v));
    ck_assert(!wire_parse_number("inf", 3, &v));
    ck_assert(!wire_parse_number("1e400", 5, &v));
    ck_assert(!wire_parse_number("", 0, &v));
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("decode oracle");
    TCase *t = tcase_create("decode oracle");
    tcase_set_timeout(t, 120);
    tcase_add_loop_test(t, random_content_comes_out_of_json_as_it_went_in, 1,
                        4);
    tcase_add_loop_test(
        t, random_content_comes_out_of_messagepack_as_it_went_in, 1, 4);
    tcase_add_test(t, what_is_accepted_of_mutated_messagepack_is_messagepack);
    tcase_add_test(
        t, utf8_is_every_code_point_in_its_shortest_form_and_nothing_else);
    tcase_add_test(t, decimal_texts_read_as_strtod_reads_them);
    suite_add_tcase(s, t);
    return s;
}
