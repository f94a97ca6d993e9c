/* encode_case.h - a small rig, one message of each type, and the check that
 * both forms say the same.  For the test_encode programs alone. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_UNIT_ENCODE_CASE_H
#define TESTS_UNIT_ENCODE_CASE_H

#include <cjson/cJSON.h>
#include <msgpack.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/encode.h"
#include "tests/suite.h"

enum { BUFFER_SIZE = 1 << 22 };

static struct rig rig;
static char line[BUFFER_SIZE], packed[BUFFER_SIZE];

/* Room for the largest message of each type. */
static union {
    struct message head;
    struct estimate estimate;
    struct event event;
    struct counts counts;
    char bytes[1 << 17];
} m;

static void add_sensor(int i, const char *name, const char *unit)
{
    struct rig_sensor *s = &rig.sensor[i];
    snprintf(s->name, sizeof s->name, "%s", name);
    snprintf(s->unit[0], sizeof s->unit[0], "%s", unit);
    s->reads.m = 1;
    s->kind = 0;
}

static void add_state(struct rig_kind *kind, const char *name, const char *unit)
{
    struct rig_state *s = &kind->state[kind->n++];
    snprintf(s->name, sizeof s->name, "%s", name);
    snprintf(s->unit, sizeof s->unit, "%s", unit);
}

static void set_up(void)
{
    memset(&rig, 0, sizeof rig);
    memset(&m, 0, sizeof m);
    snprintf(rig.name, sizeof rig.name, "carriage \"day\"");
    snprintf(rig.file_hash, sizeof rig.file_hash, "00ff");
    rig.n_kinds = 2;
    snprintf(rig.kind[0].id, sizeof rig.kind[0].id, "carriage");
    add_state(&rig.kind[0], "x", "m");
    add_state(&rig.kind[0], "x.rate", "m/s");
    snprintf(rig.kind[1].id, sizeof rig.kind[1].id, "raft-");
    rig.kind[1].is_prefix = true;
    add_state(&rig.kind[1], "heading", "°");
    rig.n_sensors = 2;
    add_sensor(0, "laser", "mm");
    add_sensor(1, "wheel", "m/s");
    rig.sensor[1].reads.m = 2;
    snprintf(rig.sensor[1].unit[1], RIG_UNIT_SIZE, "rad");
}

/* x = (1.5, -0.25), P = U D U' = [4 + 0.5^2 2^2, 0.5 * 4; 0.5 * 4, 4]. */
__attribute__((unused)) static struct estimate *some_estimate(void)
{
    struct estimate *e = &m.estimate;
    e->head.type = MESSAGE_ESTIMATE;
    snprintf(e->head.track, sizeof e->head.track, "carriage");
    e->n = 7;
    e->t_ns = 1000000000123456789;
    e->arrived_ns = 1000000000130000000;
    e->nis = 0.75;
    e->rerun = 3;
    e->sensor = 1;
    e->dof = 1;
    e->accepted = 1;
    e->stream = STREAM_LIVE;
    e->verdict = VERDICT_GOOD;
    e->n_states = 2;
    e->v[0] = 1.5;
    e->v[1] = -0.25;
    e->v[2] = 8;   /* D_0                                                 */
    e->v[3] = 0.5; /* U_01                                                */
    e->v[4] = 4;   /* D_1                                                 */
    return e;
}

__attribute__((unused)) static struct event *some_event(enum event_kind kind)
{
    m.event.head.type = MESSAGE_EVENT;
    m.event.head.kind = 0xffff;
    m.event.event = (uint8_t)kind;
    m.event.t_ns = 1000000000000000000;
    m.event.sensor = -1;
    return &m.event;
}

__attribute__((unused)) static struct counts *some_counts(void)
{
    struct counts *c = &m.counts;
    c->head.type = MESSAGE_COUNTS;
    c->t_ns = 1000000000000000000;
    for (int i = 0; i < DATAGRAM_OUTCOME_COUNT; i++)
        c->datagrams[i] = (uint64_t)i + 1;
    c->marks = 2;
    c->bad_elements = 4;
    c->n_sensors = 2;
    for (int i = 0; i < OUTCOME_COUNT; i++) {
        c->sensor[0].outcome[i] = (uint64_t)i;
        c->total.outcome[i] = (uint64_t)i;
    }
    c->sensor[1].tally[TALLY_LATE] = 5;
    c->total.tally[TALLY_LATE] = 5;
    return c;
}

/* --- both forms say the same ------------------------------------------------
 */

static bool same(const msgpack_object *o, const cJSON *j);

static bool same_text(const msgpack_object_str *s, const char *text)
{
    return s->size == strlen(text) && memcmp(s->ptr, text, s->size) == 0;
}

static bool same_time(const msgpack_object *o, const cJSON *j)
{
    msgpack_timestamp t;
    char text[31];
    if (!cJSON_IsString(j) || !msgpack_object_to_timestamp(o, &t))
        return false;
    wire_print_time((int64_t)((uint64_t)t.tv_sec * 1000000000 + t.tv_nsec),
                    text);
    return strcmp(text, j->valuestring) == 0;
}

static bool same_list(const msgpack_object *o, const cJSON *j)
{
    const cJSON *child = j->child;
    uint32_t n =
        o->type == MSGPACK_OBJECT_MAP ? o->via.map.size : o->via.array.size;
    for (uint32_t i = 0; i < n; i++, child = child->next) {
        if (child == NULL)
            return false;
        if (o->type == MSGPACK_OBJECT_ARRAY) {
            if (!same(&o->via.array.ptr[i], child))
                return false;
            continue;
        }
        const msgpack_object_kv *kv = &o->via.map.ptr[i];
        if (kv->key.type != MSGPACK_OBJECT_STR ||
            !same_text(&kv->key.via.str, child->string) ||
            !same(&kv->val, child))
            return false;
    }
    return child == NULL;
}

static bool same(const msgpack_object *o, const cJSON *j)
{
    switch ((int)o->type) {
    case MSGPACK_OBJECT_NIL:
        return cJSON_IsNull(j);
    case MSGPACK_OBJECT_BOOLEAN:
        return cJSON_IsBool(j) && cJSON_IsTrue(j) == o->via.boolean;
    case MSGPACK_OBJECT_POSITIVE_INTEGER:
        return cJSON_IsNumber(j) && j->valuedouble == (double)o->via.u64;
    case MSGPACK_OBJECT_FLOAT64:
        return cJSON_IsNumber(j) &&
               memcmp(&j->valuedouble, &o->via.f64, sizeof(double)) == 0;
    case MSGPACK_OBJECT_STR:
        return cJSON_IsString(j) && same_text(&o->via.str, j->valuestring);
    case MSGPACK_OBJECT_EXT:
        return same_time(o, j);
    case MSGPACK_OBJECT_ARRAY:
        return cJSON_IsArray(j) && same_list(o, j);
    case MSGPACK_OBJECT_MAP:
        return cJSON_IsObject(j) && same_list(o, j);
    }
    return false;
}

/* line (len bytes) and packed (packed_len) are one message in two forms. */
static void check_same(size_t len, size_t packed_len)
{
    ck_assert_uint_gt(len, 0);
    ck_assert_uint_gt(packed_len, 0);
    ck_assert_int_eq(line[len - 1], '\n');
    ck_assert_ptr_null(memchr(line, '\n', len - 1));

    const char *end;
    cJSON *j = cJSON_ParseWithLengthOpts(line, len, &end, false);
    ck_assert_ptr_nonnull(j);
    ck_assert_ptr_eq(end, line + len - 1);
    msgpack_unpacked u;
    msgpack_unpacked_init(&u);
    size_t used = 0;
    ck_assert_int_eq(msgpack_unpack_next(&u, packed, packed_len, &used),
                     MSGPACK_UNPACK_SUCCESS);
    ck_assert_uint_eq(used, packed_len);
    ck_assert_msg(same(&u.data, j), "the forms differ: %.*s", (int)len, line);
    msgpack_unpacked_destroy(&u);
    cJSON_Delete(j);
}

/* One whole line, and the same as MessagePack, within the bound, and nothing
 * at all in a smaller buffer. */
static void check_message(const char *want)
{
    size_t len = wire_encode(&rig, &m.head, WIRE_JSON, line, sizeof line);
    size_t n = wire_encode(&rig, &m.head, WIRE_MSGPACK, packed, sizeof packed);
    line[len] = '\0';
    if (want != NULL)
        ck_assert_str_eq(line, want);
    check_same(len, n);
    ck_assert_uint_le(len, wire_message_bound(&rig));
    ck_assert_uint_le(n, wire_message_bound(&rig));
}

#endif
