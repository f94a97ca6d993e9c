/* Messages against the size of their buffer, and wire_message_bound. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <float.h>

#include "tests/unit/encode_case.h"

/* Every size below the length gives 0, the length itself the whole; bytes
 * after `size` stay as they were. */
static void check_sizes(enum wire_form form)
{
    size_t whole = wire_encode(&rig, &m.head, form, packed, sizeof packed);
    for (size_t size = 0; size <= whole; size++) {
        memset(line, '#', whole + 8);
        size_t len = wire_encode(&rig, &m.head, form, line, size);
        ck_assert_uint_eq(len, size < whole ? 0 : whole);
        for (size_t i = size; i < whole + 8; i++)
            ck_assert_int_eq(line[i], '#');
    }
    ck_assert_mem_eq(line, packed, whole);
}

START_TEST(a_message_that_does_not_fit_is_not_written_past_the_end)
{
    some_estimate();
    check_sizes(WIRE_JSON);
    check_sizes(WIRE_MSGPACK);
    memset(&m, 0, sizeof m);
    some_counts();
    check_sizes(WIRE_JSON);
    check_sizes(WIRE_MSGPACK);
    memset(&m, 0, sizeof m);
    some_event(EVENT_MARK);
    memset(m.event.note, 'n', 100);
    check_sizes(WIRE_JSON);
    check_sizes(WIRE_MSGPACK);
}
END_TEST

/* n control bytes, or as many as fit: each is six characters in JSON. */
static void fill_name(char *name, size_t size, size_t n)
{
    memset(name, 1, n < size ? n : size - 1);
}

/* The worst that fits into the structs with names of this length. */
static void set_up_largest(int n_kinds, int n_sensors, size_t n)
{
    memset(&rig, 0, sizeof rig);
    memset(&m, 0, sizeof m);
    fill_name(rig.name, sizeof rig.name, n);
    fill_name(rig.file_hash, sizeof rig.file_hash, n);
    rig.n_kinds = n_kinds;
    rig.n_sensors = n_sensors;
    for (int k = 0; k < n_kinds; k++) {
        struct rig_kind *kind = &rig.kind[k];
        fill_name(kind->id, sizeof kind->id, n);
        kind->is_prefix = true;
        kind->n = RIG_STATES_MAX;
        for (int i = 0; i < kind->n; i++) {
            fill_name(kind->state[i].name, RIG_ID_SIZE, n);
            fill_name(kind->state[i].unit, RIG_UNIT_SIZE, n);
        }
        fill_name(kind->state[0].name, RIG_ID_SIZE, RIG_ID_SIZE);
    }
    for (int k = 0; k < n_sensors; k++) {
        struct rig_sensor *sensor = &rig.sensor[k];
        fill_name(sensor->name, RIG_ID_SIZE, n);
        sensor->reads.m = READS_MAX;
        for (int i = 0; i < READS_MAX; i++)
            fill_name(sensor->unit[i], RIG_UNIT_SIZE, n);
    }
}

static void fill_reasons(struct reason *why, uint8_t *n_why)
{
    *n_why = MESSAGE_REASONS_MAX;
    for (int i = 0; i < MESSAGE_REASONS_MAX; i++)
        why[i] = (struct reason){REASON_UNDETERMINED, 0};
}

/* P_ij = a_i a_j d with both signs: about 1e-6, where texts are longest. */
static void fill_longest_covariance(double *ud)
{
    int last = RIG_STATES_MAX - 1;
    memset(ud, 0, UD_SIZE(RIG_STATES_MAX) * sizeof *ud);
    for (int i = 0; i < last; i++)
        ud[UD_AT(i, last)] = (i % 2 == 0 ? -1 : 1) * (1 + i / 3000.0);
    ud[UD_AT(last, last)] = 2.3456789012345678e-6;
}

static void fill_largest_estimate(void)
{
    const double longest = -1.2345678901234567e-6;
    struct estimate *e = some_estimate();
    memset(e->head.track, 1, sizeof e->head.track - 1);
    e->head.kind = 0;
    e->n = UINT64_MAX;
    e->t_ns = e->arrived_ns = INT64_MIN;
    e->nis = longest;
    e->rerun = UINT32_MAX;
    e->dof = UINT8_MAX;
    e->sensor = 0;
    e->accepted = 0;
    e->verdict = VERDICT_STARTING;
    fill_reasons(e->why, &e->n_why);
    e->n_states = RIG_STATES_MAX;
    for (int i = 0; i < RIG_STATES_MAX; i++)
        e->v[i] = longest;
    fill_longest_covariance(e->v + RIG_STATES_MAX);
}

static void fill_largest_event(void)
{
    struct event *e = some_event(EVENT_VERDICT);
    memset(e->head.track, 1, sizeof e->head.track - 1);
    e->head.kind = 0;
    e->sensor = 0;
    fill_reasons(e->why, &e->n_why);
    memset(e->name, 1, sizeof e->name - 1);
    memset(e->note, 1, sizeof e->note - 1);
}

static void fill_largest_counts(void)
{
    struct counts *c = some_counts();
    c->n_sensors = (uint32_t)rig.n_sensors;
    for (int i = 0; i < DATAGRAM_OUTCOME_COUNT; i++)
        c->datagrams[i] = UINT64_MAX;
    c->datagrams[0] = UINT64_MAX - 5;
    c->marks = c->bad_elements = UINT64_MAX;
    memset(&c->total, 0xff, sizeof c->total);
    memset(c->sensor, 0xff, c->n_sensors * sizeof *c->sensor);
}

/* The last two: an estimate, then counts, is the largest of all. */
static const struct {
    int n_kinds, n_sensors;
    size_t name_len;
} sizes[] = {
    {1, 1, RIG_ID_SIZE},
    {1, 0, RIG_ID_SIZE},
    {RIG_KINDS_MAX, RIG_SENSORS_MAX, RIG_ID_SIZE},
    {1, 0, 0},
    {1, RIG_SENSORS_MAX, 0},
};

static void check_largest_pieces(size_t bound)
{
    static char text[WIRE_TEXT_MAX + 1];
    memset(text, 1, WIRE_TEXT_MAX);
    size_t len[5] = {
        wire_encode_description(&rig, text, WIRE_JSON, line, bound),
        wire_encode_description(&rig, text, WIRE_MSGPACK, line, bound),
        wire_encode_host(INT64_MIN, text, text, UINT64_MAX, WIRE_JSON, line,
                         bound),
        wire_encode_bye(text, WIRE_JSON, line, bound),
        wire_summary_begin(&rig, &m.counts, line, bound),
    };
    for (int i = 0; i < 5; i++)
        ck_assert_msg(len[i] > 0, "piece %d does not fit the bound", i);

    static struct sensor_summary sensor[RIG_SENSORS_MAX];
    for (int i = 0; i < RIG_SENSORS_MAX; i++)
        sensor[i] =
            (struct sensor_summary){UINT64_MAX, UINT64_MAX, -DBL_MAX, -DBL_MAX};
    struct track_summary t = {"", 0, -DBL_MAX, UINT64_MAX, sensor};
    memset(t.id, 1, sizeof t.id - 1);
    ck_assert_uint_gt(wire_summary_track(&rig, &t, false, line, bound), 0);
}

START_TEST(the_bound_holds_the_largest_message_of_each_type)
{
    set_up_largest(sizes[_i].n_kinds, sizes[_i].n_sensors, sizes[_i].name_len);
    size_t bound = wire_message_bound(&rig);
    ck_assert_uint_lt(bound, sizeof line);
    fill_largest_estimate();
    check_message(NULL);
    memset(&m, 0, sizeof m);
    fill_largest_event();
    check_message(NULL);
    m.event.event = EVENT_MARK;
    m.event.mark = MARK_START;
    check_message(NULL);
    memset(&m, 0, sizeof m);
    fill_largest_counts();
    check_message(NULL);
    check_largest_pieces(bound);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("encode_bound");
    TCase *t = tcase_create("encode_bound");
    tcase_add_checked_fixture(t, set_up, NULL);
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_message_that_does_not_fit_is_not_written_past_the_end);
    tcase_add_loop_test(t, the_bound_holds_the_largest_message_of_each_type, 0,
                        sizeof sizes / sizeof *sizes);
    suite_add_tcase(s, t);
    return s;
}
