/* Late measurements through a whole run: after every arrival the state is the
 * one that all accepted measurements in order of time give.
 *
 * Source: one-step-lag cases after Bar-Shalom, IEEE TAES 38(3), 2002; exact
 * answers by batch Gaussian conditioning in 40-digit arithmetic, without any
 * filter recursion. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/kf.h"
#include "core/run/run.h"
#include "tests/checks/values.h"
#include "tests/suite.h"

#define ORIGIN_NS ((int64_t)1700000000 * 1000000000)

static const double near = 1e-12;

struct lane {
    struct rig rig;
    struct run *run;
    void *memory;
    uint64_t n_live, n_settled;
    double x[2], P[4]; /* of the newest live estimate         */
    double settled_x[2], settled_P[4];
    int64_t t_ns, settled_t_ns;
    double ud[UD_SIZE(2)];
};

static void say(void *ctx, const struct message *m)
{
    struct lane *l = ctx;
    if (m->type != MESSAGE_ESTIMATE)
        return;
    const struct estimate *e = (const void *)m;
    ck_assert_int_eq(e->n_states, 2);
    bool is_live = e->stream == STREAM_LIVE;
    memcpy(is_live ? l->x : l->settled_x, e->v, sizeof l->x);
    ud_covariance(2, e->v + 2, is_live ? l->P : l->settled_P);
    *(is_live ? &l->t_ns : &l->settled_t_ns) = e->t_ns;
    *(is_live ? &l->n_live : &l->n_settled) += 1;
    if (is_live)
        memcpy(l->ud, e->v + 2, sizeof l->ud);
}

/* One constant-velocity axis, prior (mean, variance) of both states at 0 s, or
 * none (NULL); sensors A and B read the place, C the rate. */
static void make_rig(struct rig *rig, double q, const double *x0,
                     const double *var0, const double *r)
{
    static const char *const names[] = {"A", "B", "C"};
    struct rig_kind *kind = &rig->kind[0];
    rig->ahead_ns = rig->horizon_ns = 1000000000;
    rig->max_tracks = 1;
    rig->max_ids_per_sender = 1;
    rig->max_steps = 1e6;
    rig->max_pending = 64;
    rig->n_kinds = 1;
    rig->n_sensors = 3;
    snprintf(kind->id, RIG_ID_SIZE, "cart");
    kind->n_blocks = 1;
    kind->n = 2;
    kind->block[0] = (struct block){
        .model = BLOCK_CONSTANT_VELOCITY, .at = 0, .n = 2, .q = q};
    kind->has_start_at = x0 != NULL;
    kind->start_at_ns = ORIGIN_NS;
    kind->lost_after_ns = 10000000000;
    kind->recover_refused = 5;
    for (int i = 0; i < 2; i++) {
        snprintf(kind->state[i].name, RIG_ID_SIZE, "x%d", i);
        if (x0 == NULL)
            continue;
        kind->state[i].has_prior = true;
        kind->state[i].prior_mean = x0[i];
        kind->state[i].prior_u = sqrt(var0[i]);
    }
    for (int i = 0; i < 3; i++) {
        struct rig_sensor *s = &rig->sensor[i];
        snprintf(s->name, RIG_ID_SIZE, "%s", names[i]);
        s->reads.m = 1;
        s->reads.row[0].kind = READS_LINEAR;
        s->reads.row[0].n_terms = 1;
        s->reads.row[0].term[0] = (struct reads_term){i == 2, 1};
        s->scale[0] = 1;
        s->r[0] = r[i];
        s->rate_hz = 100;
        s->silent_after_ns = 10000000000;
        s->stamp = RIG_STAMP_SENSOR;
    }
    rig_prepare(rig);
}

static struct lane *lane_new(double q, const double *x0, const double *var0,
                             const double *r, int64_t horizon_ns)
{
    struct lane *l = calloc(1, sizeof *l);
    ck_assert_ptr_nonnull(l);
    make_rig(&l->rig, q, x0, var0, r);
    l->rig.horizon_ns = horizon_ns;
    size_t bytes = run_bytes(&l->rig);
    l->memory = aligned_alloc(64, bytes);
    l->run = run_init(l->memory, bytes, &l->rig,
                      (struct message_sink){say, l, NULL});
    ck_assert_ptr_nonnull(l->run);
    run_start(l->run, ORIGIN_NS);
    return l;
}

static void lane_free(struct lane *l)
{
    free(l->memory);
    free(l);
}

static void feed(struct lane *l, const char *sensor, double t_s, double z,
                 double arrival_s)
{
    static const struct sender from = {4, {127, 0, 0, 1}, 40000};
    char text[160];
    int len = snprintf(text, sizeof text,
                       "{\"sensor\":\"%s\",\"z\":%.17g,\"ns\":%lld}", sensor, z,
                       (long long)(ORIGIN_NS + values_ns(t_s)));
    run_feed(l->run, ORIGIN_NS + values_ns(arrival_s), &from,
             (const uint8_t *)text, (size_t)len);
}

static void check_state(const double *x, const double *P, const cJSON *want)
{
    double want_x[2], want_P[4];
    values_list(want, "x", want_x, 2);
    values_list(want, "P", want_P, 4);
    CHECK_NEAR(2, x, want_x, near);
    CHECK_COVARIANCE(2, P, want_P, near);
}

/* --- one step late ----------------------------------------------------------
 */

static const char *const one_step[] = {"one-step-lag OOSM q=0.1",
                                       "one-step-lag OOSM q=4",
                                       "one-step-lag OOSM q=1"};

START_TEST(one_step_late_gives_the_exact_state)
{
    static const double var0[] = {1, 1};
    cJSON *all = values_load("05-out-of-sequence");
    const cJSON *c = values_case(all, one_step[_i]);
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    double x0[2], r[3] = {values_number(in, "R"), 1, 1};
    values_list(in, "x0", x0, 2);
    struct lane *l = lane_new(values_number(in, "q"), x0, var0, r, 1000000000);
    double arrival_s = 0;
    const cJSON *m;
    cJSON_ArrayForEach(m, values_at(in, "arrival_order"))
    {
        double t_s = values_number(m, "t");
        arrival_s = fmax(arrival_s, t_s) + 0.003;
        feed(l, "A", t_s, values_number(m, "z"), arrival_s);
        if (l->n_live == 2)
            check_state(l->x, l->P, values_at(out, "after_second"));
    }
    ck_assert_uint_eq(l->n_live, 3);
    ck_assert_int_eq(l->t_ns,
                     ORIGIN_NS + values_ns(values_number(in, "output_time")));
    check_state(l->x, l->P, values_at(out, "exact"));
    lane_free(l);
    cJSON_Delete(all);
}
END_TEST

/* --- the log of 48 events ---------------------------------------------------
 */

static struct lane *log_lane(const cJSON *in, int64_t horizon_ns)
{
    static const double var0[] = {4, 1}, r[] = {0.25, 1, 0.04};
    double x0[2];
    values_list(in, "x0", x0, 2);
    return lane_new(values_number(in, "q"), x0, var0, r, horizon_ns);
}

static void feed_event(struct lane *l, const cJSON *event)
{
    feed(l, values_at(event, "sensor")->valuestring, values_number(event, "t"),
         values_number(event, "z"), values_number(event, "arrival"));
}

START_TEST(after_every_arrival_the_state_is_the_exact_one)
{
    cJSON *all = values_load("05-out-of-sequence");
    const cJSON *c = values_case(all, "48-event log");
    const cJSON *events =
        values_at(values_at(c, "inputs"), "events_in_arrival_order");
    const cJSON *steps =
        values_at(values_at(values_at(c, "expected"), "horizon_1s"), "steps");
    struct lane *l = log_lane(values_at(c, "inputs"), 1000000000);
    uint64_t n_used = 0, n_late = 0;
    int64_t newest_ns = 0;
    ck_assert_int_eq(cJSON_GetArraySize(events), 48);
    ck_assert_int_eq(cJSON_GetArraySize(steps), 48);
    for (int i = 0; i < 48; i++) {
        const cJSON *event = cJSON_GetArrayItem(events, i);
        const cJSON *want = cJSON_GetArrayItem(steps, i);
        int64_t t_ns = values_ns(values_number(event, "t"));
        bool is_used = cJSON_IsTrue(values_at(want, "used"));
        feed_event(l, event);
        n_used += is_used;
        n_late += is_used && t_ns < newest_ns;
        newest_ns = is_used && t_ns > newest_ns ? t_ns : newest_ns;
        ck_assert_uint_eq(l->n_live, n_used);
        ck_assert_int_eq(l->t_ns,
                         ORIGIN_NS + values_ns(values_number(want, "t_out")));
        check_state(l->x, l->P, want);
    }
    const struct counts *counts = run_counts(l->run);
    ck_assert_uint_eq(counts->total.outcome[OUTCOME_TOO_LATE], 2);
    ck_assert_uint_eq(counts->total.tally[TALLY_LATE], n_late);
    lane_free(l);
    cJSON_Delete(all);
}
END_TEST

/* With a horizon that nothing exceeds: the same as in order of time, and the
 * likelihood of the whole log. */
START_TEST(a_wide_horizon_uses_everything_and_gives_the_likelihood)
{
    cJSON *all = values_load("05-out-of-sequence");
    const cJSON *c = values_case(all, "48-event log");
    const cJSON *out = values_at(c, "expected"), *event;
    struct lane *l = log_lane(values_at(c, "inputs"), 3000000000);
    cJSON_ArrayForEach(
        event, values_at(values_at(c, "inputs"), "events_in_arrival_order"))
        feed_event(l, event);
    const cJSON *last = cJSON_GetArrayItem(values_at(out, "reprocess_all"), 0);
    check_state(l->x, l->P, last);
    run_stop(l->run, ORIGIN_NS + values_ns(20));
    check_state(l->settled_x, l->settled_P, last);
    ck_assert_uint_eq(l->n_settled, 48);
    struct track_summary summary;
    ck_assert(run_track_summary(l->run, 0, &summary));
    ck_assert_uint_eq(summary.measurements, 48);
    ck_assert_double_le(
        fabs(summary.loglik - values_number(out, "loglik_total")), 1e-11);
    ck_assert_double_le(fabs(summary.loglik - -57.00552911737969), 1e-11);
    lane_free(l);
    cJSON_Delete(all);
}
END_TEST

/* After the log nothing is known but what the last state predicts. */
START_TEST(a_query_after_the_log_is_a_prediction)
{
    cJSON *all = values_load("05-out-of-sequence");
    const cJSON *c = values_case(all, "48-event log"), *event, *want = NULL;
    struct lane *l = log_lane(values_at(c, "inputs"), 3000000000);
    cJSON_ArrayForEach(
        event, values_at(values_at(c, "inputs"), "events_in_arrival_order"))
        feed_event(l, event);
    want = cJSON_GetArrayItem(
        values_at(values_case(all, "state queried"), "expected"), 4);
    const struct rig_kind *kind = &l->rig.kind[0];
    struct kf_work *work = calloc(1, sizeof *work);
    struct kf *f = calloc(1, kf_bytes(kind));
    double P[4];
    kf_birth(kind, l->t_ns, f);
    memcpy(kf_x(f), l->x, sizeof l->x);
    memcpy(kf_ud(f), l->ud, sizeof l->ud);
    kf_predict(kind, work, f, ORIGIN_NS + values_ns(values_number(want, "t")),
               f);
    ud_covariance(2, kf_ud(f), P);
    check_state(kf_x(f), P, want);
    free(f);
    free(work);
    lane_free(l);
    cJSON_Delete(all);
}
END_TEST

/* --- a certified straight line, out of order
 * ---------------------------------- */

/* NIST Statistical Reference Datasets, Norris: 36 points, x taken as time, in
 * the order of the file; the place at 0 s is B0, the rate B1. */
START_TEST(norris_in_any_order_has_its_certified_coefficients)
{
    static const double r[] = {1, 1, 1};
    double t_s[36], z[36];
    cJSON *all = values_load("10-initialisation");
    const cJSON *c = values_case(all, "NIST StRD Norris");
    const cJSON *in = values_at(c, "inputs"), *out = values_at(c, "expected");
    ck_assert_int_eq(values_list(in, "t", t_s, 36), 36);
    ck_assert_int_eq(values_list(in, "z", z, 36), 36);
    struct lane *l = lane_new(0, NULL, NULL, r, values_ns(2000));
    for (int i = 0; i < 36; i++) {
        int k = _i == 0 ? i : 35 - i;
        feed(l, "A", t_s[k], z[k], 1000 + 0.01 * i);
    }
    double B1 = l->x[1], B0 = l->x[0] - 999 * B1;
    ck_assert_int_eq(l->t_ns, ORIGIN_NS + values_ns(999));
    ck_assert_double_le(fabs(B0 / values_number(out, "B0") - 1), 1e-12);
    ck_assert_double_le(fabs(B1 / values_number(out, "B1") - 1), 1e-13);
    run_stop(l->run, ORIGIN_NS + values_ns(1001));
    struct track_summary summary;
    ck_assert(run_track_summary(l->run, 0, &summary));
    double sd = sqrt(summary.sensor[0].nis_sum / 34); /* 36 - 2 */
    ck_assert_double_le(
        fabs(sd / values_number(out, "certified_residual_sd") - 1), 1e-12);
    lane_free(l);
    cJSON_Delete(all);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("late");
    TCase *t = tcase_create("late");
    tcase_add_loop_test(t, one_step_late_gives_the_exact_state, 0, 3);
    tcase_add_test(t, after_every_arrival_the_state_is_the_exact_one);
    tcase_add_test(t, a_wide_horizon_uses_everything_and_gives_the_likelihood);
    tcase_add_test(t, a_query_after_the_log_is_a_prediction);
    tcase_add_loop_test(t, norris_in_any_order_has_its_certified_coefficients,
                        0, 2);
    suite_add_tcase(s, t);
    return s;
}
