/* A rig file to settings: good files, `like`, braces, changes. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/unit/load_case.h"

static const struct rig_sensor *sensor(const struct rig *rig, const char *name)
{
    int i = rig_find_sensor(rig, name, strlen(name));
    ck_assert_msg(i >= 0, "%s", name);
    return &rig->sensor[i];
}

static const struct rig_kind *kind(const struct rig *rig, const char *id)
{
    int i = rig_find_kind(rig, id, strlen(id));
    ck_assert_msg(i >= 0, "%s", id);
    return &rig->kind[i];
}

static void near(double got, double want)
{
    ck_assert_double_eq_tol(got, want, 1e-12 * (1 + fabs(want)));
}

START_TEST(a_complete_file_fills_what_the_daemon_needs)
{
    struct settings *s = load_file();
    const struct rig *r = &s->rig;
    const char *folder = "/tests/data/rigs/captures";
    size_t n = strlen(s->folder);
    ck_assert_str_eq(r->name, "carriage speed day");
    ck_assert_uint_eq(strlen(r->file_hash), 64);
    ck_assert_str_eq(s->udp, "127.0.0.1:8410");
    ck_assert_str_eq(s->tcp, "[::1]:8411");
    ck_assert_int_eq(s->folder[0], '/');
    ck_assert_str_eq(s->folder + n - strlen(folder), folder);
    ck_assert_int_eq(s->udp_buffer_bytes, 4194304);
    ck_assert_int_eq(s->segment_bytes, 67108864);
    ck_assert_int_eq(s->floor_bytes, 1073741824);
    ck_assert_int_eq(s->segment_every_ns, 1800000000000);
    ck_assert_int_eq(s->clock_wait_ns, 5000000000);
    ck_assert_int_eq(s->sync, SYNC_ALWAYS);
    ck_assert_int_eq(s->max_subscribers, 8);
    ck_assert_int_eq(r->hold_ns, 20000000);
    ck_assert_int_eq(r->horizon_ns, 400000000);
    ck_assert_int_eq(r->ahead_ns, 2000000000);
    ck_assert_int_eq(r->max_tracks, 20);
    ck_assert_int_eq(r->max_pending, 500);
    ck_assert_int_eq(r->max_ids_per_sender, 4);
    ck_assert_double_eq(r->max_steps, 5000);
    ck_assert_int_eq(r->n_senders, 2);
    ck_assert_int_eq(r->sender[0].family, 4);
    ck_assert_int_eq(r->sender[0].bits, 8);
    ck_assert_int_eq(r->sender[0].address[0], 127);
    ck_assert_int_eq(r->sender[1].family, 6);
    ck_assert_int_eq(r->sender[1].bits, 128);
    ck_assert_int_eq(r->sender[1].address[15], 1);
    settings_free(s);
}
END_TEST

START_TEST(a_complete_file_fills_the_tracks)
{
    struct settings *s = load_file();
    const struct rig_kind *k = kind(&s->rig, "carriage");
    ck_assert_int_eq(s->rig.n_kinds, 5);
    ck_assert_int_eq(k->n_blocks, 3);
    ck_assert_int_eq(k->n, 5);
    ck_assert_int_eq(k->block[0].model, BLOCK_CONSTANT_ACCELERATION);
    near(k->block[0].q, 0.8); /* (2 m/s3)^2 0.2 s */
    ck_assert_int_eq(k->block[2].at, 4);
    near(k->block[2].q, 0.4); /* 2 (2 mm)^2 / 20 s */
    near(k->block[2].tau_s, 20);
    near(k->block[2].mean, 10);
    ck_assert_str_eq(k->state[2].name, "x.accel");
    ck_assert_str_eq(k->state[2].unit, "m/s2");
    ck_assert(!k->state[0].has_prior && !k->state[0].is_constant);
    ck_assert(k->state[3].has_prior && k->state[3].is_constant);
    near(k->state[3].prior_mean, 1);
    near(k->state[3].prior_u, 0.003);
    ck_assert(k->state[4].has_prior);
    near(k->state[4].prior_mean, 10);
    near(k->state[4].prior_u, 2);
    near(k->state[1].good_u, 0.005);
    near(k->state[0].lost_u, 0.2);
    ck_assert(k->has_good && k->has_start_at);
    ck_assert_int_eq(k->start_at_ns, 1777888800500000000);
    ck_assert_int_eq(k->lost_after_ns, 2000000000);
    ck_assert_int_eq(k->recover_refused, 6);
    ck_assert_int_eq(k->recover_for_ns, 500000000);
    k = kind(&s->rig, "boat-7");
    ck_assert(k->is_prefix && !k->has_good);
    ck_assert_str_eq(k->id, "boat-");
    ck_assert_int_eq(k->lost_after_ns, 9000000000);
    near(k->block[0].q, 1e-4);
    near(k->block[1].q, 0.5);
    near(k->state[2].prior_mean, 2);
    settings_free(s);
}
END_TEST

START_TEST(a_complete_file_fills_the_sensors)
{
    struct settings *s = load_file();
    const struct rig_sensor *q = sensor(&s->rig, "laser");
    ck_assert_int_eq(s->rig.n_sensors, 7);
    for (int i = 1; i < s->rig.n_sensors; i++)
        ck_assert_int_lt(
            strcmp(s->rig.sensor[i - 1].name, s->rig.sensor[i].name), 0);
    near(q->scale[0], 0.001);
    near(q->r[0], 12e-6); /* (12 mm)^2 / 12, more than (2 mm)^2 */
    near(q->rate_hz, 50);
    near(q->gate_p, 0.99);
    ck_assert_double_gt(q->gate[1], 6.6); /* chi2(0.99, 1) = 6.635 */
    ck_assert_int_eq(q->silent_after_ns, 120000000);
    ck_assert_int_eq(q->stamp, RIG_STAMP_SENSOR);
    ck_assert_int_eq(q->delay_ns, 12000000);
    q = sensor(&s->rig, "frame");
    ck_assert_int_eq(q->reads.m, 2);
    ck_assert_str_eq(q->unit[1], "km/h");
    near(q->scale[0], 9.80665);
    near(q->scale[1], 1 / 3.6);
    near(q->r[0], 0.9604);
    near(q->r[1], 1);
    ck_assert_int_eq(q->silent_after_ns, 250000000); /* 5 periods */
    ck_assert_int_eq(q->stamp, RIG_STAMP_ANY);
    q = sensor(&s->rig, "tower2");
    ck_assert_str_eq(s->rig.kind[q->kind].id, "raft2");
    ck_assert_int_eq(q->reads.row[0].kind, READS_RANGE);
    ck_assert_int_eq(q->reads.row[1].kind, READS_BEARING);
    ck_assert_int_eq(q->reads.row[1].term[1].state, 2);
    near(q->reads.row[1].from[0], 0.01);
    near(q->reads.row[1].from[1], 2);
    near(q->reads.row[1].zero_rad, 1.5707963267948966);
    near(q->reads.row[1].turn, -1);
    near(q->r[1], pow(0.1 * 0.017453292519943295, 2));
    q = sensor(&s->rig, "mast");
    ck_assert_int_eq(q->reads.row[0].n_terms, 3);
    ck_assert_int_eq(q->reads.row[0].term[2].state, -1);
    near(q->reads.row[0].term[2].value, 1);
    near(q->reads.row[0].from[2], 1.97);
    settings_free(s);
}
END_TEST

START_TEST(like_copies_absent_keys_whole)
{
    struct settings *s = load_file();
    const struct rig_sensor *q = sensor(&s->rig, "second");
    near(q->r[0], 12e-6);
    near(q->rate_hz, 50);
    ck_assert(!q->has_gate);
    ck_assert_int_eq(q->stamp, RIG_STAMP_ARRIVAL);
    ck_assert_int_eq(q->delay_ns, 0); /* "time" is its own, whole */
    ck_assert_int_eq(q->reads.row[0].n_terms, 2);
    near(q->reads.row[0].term[1].value, 0.002); /* 2 bias, mm to m */
    settings_free(s);
}
END_TEST

START_TEST(what_is_absent_has_its_default)
{
    struct settings *s;
    free(load_text(&s, load_small, NULL, 0));
    ck_assert_ptr_nonnull(s);
    const struct rig *r = &s->rig;
    ck_assert_str_eq(s->folder, "");
    ck_assert_str_eq(s->udp, "");
    ck_assert_int_eq(s->segment_bytes, 268435456);
    ck_assert_int_eq(s->segment_every_ns, 3600000000000);
    ck_assert_int_eq(s->sync, SYNC_EVERY_SECOND);
    ck_assert_int_eq(s->floor_bytes, 5368709120);
    ck_assert_int_eq(s->clock_wait_ns, 60000000000);
    ck_assert_int_eq(s->max_subscribers, 64);
    ck_assert_int_eq(r->hold_ns, 0);
    ck_assert_int_eq(r->horizon_ns, 500000000);
    ck_assert_int_eq(r->ahead_ns, 1000000000);
    ck_assert_int_eq(r->max_tracks, 1);
    ck_assert_int_eq(r->max_ids_per_sender, 1);
    ck_assert_double_eq(r->max_steps, 1e6);
    ck_assert_int_eq(r->kind[0].lost_after_ns, 5000000000);
    ck_assert_int_eq(r->kind[0].recover_refused, 5);
    ck_assert_int_eq(r->kind[0].recover_for_ns, 200000000);
    ck_assert_double_eq(r->sensor[0].rate_hz, 100);
    ck_assert_int_eq(r->sensor[0].silent_after_ns, 50000000);
    ck_assert(r->sensor[0].has_gate);
    near(r->sensor[0].gate_p, 0.999);
    near(r->sensor[0].r[0], 4e-6); /* the unit is that of x, in m */
    settings_free(s);
}
END_TEST

START_TEST(a_prefix_adds_room_for_64_tracks)
{
    struct settings *s;
    char *text = strdup(load_small), *name;
    while ((name = strstr(text, "carriage")) != NULL)
        memcpy(name, "carria-*", 8);
    free(load_text(&s, text, NULL, 0));
    ck_assert_ptr_nonnull(s);
    ck_assert_int_eq(s->rig.max_tracks, 64);
    ck_assert_int_eq(s->rig.max_ids_per_sender, 64);
    settings_free(s);
    free(text);
}
END_TEST

START_TEST(changes_are_laid_over_the_file)
{
    static const struct settings_change changes[] = {
        {"sensors.laser.u", "5 cm"},
        {"sensors.laser.rate", "20"},
        {"tracks.carriage.state.q", "\"4 cm2/s\""},
        {"order.horizon", "1 s"},
        {"limits", "{\"tracks\": 3}"},
        {"sensors.second", "{\"like\": \"laser\", \"gate\": \"off\"}"}};
    struct settings *s;
    char *said = load_text(&s, load_small, changes, 6);
    ck_assert_str_eq(said, "");
    near(s->rig.kind[0].block[0].q, 4e-4);
    ck_assert_int_eq(s->rig.horizon_ns, 1000000000);
    ck_assert_int_eq(s->rig.max_tracks, 3);
    for (int i = 0; i < 2; i++) {
        near(s->rig.sensor[i].r[0], 25e-4);
        near(s->rig.sensor[i].rate_hz, 20);
    }
    ck_assert(s->rig.sensor[0].has_gate && !s->rig.sensor[1].has_gate);
    settings_free(s);
    free(said);
}
END_TEST

/* The reports that changes give, whole. */
static void change(const char *path, const char *value, const char *want)
{
    struct settings_change one = {path, value};
    struct settings *s;
    char *said = load_text(&s, load_small, &one, 1);
    ck_assert_str_eq(said, want);
    settings_free(s);
    free(said);
}

START_TEST(a_wrong_change_is_named)
{
    change("sensors.laser.u", "2 deg",
           "--set sensors.laser.u: error: the unit \"deg\" is of another kind "
           "than \"m\"\n       = give one that converts to m\n");
    change("sensors.lasr.u", "2",
           "--set sensors.lasr.u: error: unknown sensor \"lasr\"\n"
           "       = did you mean \"laser\"?\n");
    change("sensors.lasr", "null",
           "--set sensors.lasr: error: unknown sensor \"lasr\"\n"
           "       = did you mean \"laser\"?\n");
    change("ordr.hold", "1 ms",
           "--set ordr.hold: error: unknown setting \"ordr\"\n"
           "       = did you mean \"order\"?\n");
    change("sensors.laser.reads.0.x", "1",
           "--set sensors.laser.reads.0.x: error: there is no \"0.x\"\n"
           "       = join keys by dots, a block by its name or place from 0\n");
    change("rig", "5",
           "--set rig: error: \"rig\" must be a text in quotation marks\n"
           "       = meant here: name of the rig or of the test\n");
    change("order.hold", "\xff",
           "--set order.hold: error: the value is not UTF-8\n"
           "       = correct it\n");
}
END_TEST

START_TEST(each_wrong_change_is_named_in_its_order)
{
    static const struct settings_change changes[] = {
        {"order.horizon", "1 s"}, {"rig", "5"}, {"sensors.laser.u", "0"}};
    struct settings *s;
    char *said = load_text(&s, load_small, changes, 3);
    ck_assert_str_eq(
        said, "--set rig: error: \"rig\" must be a text in quotation marks\n"
              "       = meant here: name of the rig or of the test\n"
              "--set sensors.laser.u: error: standard uncertainty must be "
              "greater than 0\n"
              "       = give one standard deviation, in m\n");
    free(said);
}
END_TEST

static void expect_folder(const char *path, const char *folder,
                          const char *want)
{
    const struct settings_change one = {"capture.folder", folder};
    struct settings *s;
    struct problems p;
    problems_init(&p);
    ck_assert_int_eq(
        settings_parse(&s, path, load_small, strlen(load_small), &one, 1, &p),
        ST_OK);
    ck_assert_str_eq(s->folder, want);
    settings_free(s);
    problems_fini(&p);
}

START_TEST(the_capture_folder_stands_beside_the_rig_file)
{
    expect_folder("/srv/rig/day.json", "captures", "/srv/rig/captures");
    expect_folder("/day.json", "captures", "/captures");
    expect_folder("day.json", "/var/captures", "/var/captures");
}
END_TEST

START_TEST(as_many_sensors_as_there_are_places_load)
{
    struct settings *s;
    char *said = load_text(
        &s,
        "{\"tracks\": {\"c\": {\"state\": {\"model\": \"random-walk\","
        " \"name\": \"x\", \"unit\": \"m\", \"q\": 1}}},"
        " \"sensors\": {\"s{1..200}\": {\"reads\": \"x\", \"u\": 1},"
        " \"t{1..56}\": {\"reads\": \"x\", \"u\": 1}}}",
        NULL, 0);
    ck_assert_str_eq(said, "");
    ck_assert_int_eq(s->rig.n_sensors, RIG_SENSORS_MAX);
    settings_free(s);
    free(said);
}
END_TEST

START_TEST(a_sensor_is_removed_after_others_have_copied_it)
{
    static const struct settings_change changes[] = {{"sensors.laser", "null"}};
    struct settings *s;
    char text[sizeof load_small + 64];
    snprintf(text, sizeof text, "%.*s, \"second\": {\"like\": \"laser\"}}}",
             (int)strlen(load_small) - 2, load_small);
    char *said = load_text(&s, text, changes, 1);
    ck_assert_str_eq(said, "");
    ck_assert_int_eq(s->rig.n_sensors, 1);
    ck_assert_str_eq(s->rig.sensor[0].name, "second");
    near(s->rig.sensor[0].r[0], 4e-6);
    settings_free(s);
    free(said);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load");
    TCase *t = tcase_create("load");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_complete_file_fills_what_the_daemon_needs);
    tcase_add_test(t, a_complete_file_fills_the_tracks);
    tcase_add_test(t, a_complete_file_fills_the_sensors);
    tcase_add_test(t, like_copies_absent_keys_whole);
    tcase_add_test(t, what_is_absent_has_its_default);
    tcase_add_test(t, a_prefix_adds_room_for_64_tracks);
    tcase_add_test(t, changes_are_laid_over_the_file);
    tcase_add_test(t, a_wrong_change_is_named);
    tcase_add_test(t, each_wrong_change_is_named_in_its_order);
    tcase_add_test(t, the_capture_folder_stands_beside_the_rig_file);
    tcase_add_test(t, as_many_sensors_as_there_are_places_load);
    tcase_add_test(t, a_sensor_is_removed_after_others_have_copied_it);
    suite_add_tcase(s, t);
    return s;
}
