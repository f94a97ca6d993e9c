/* The network and the faults of a rehearsal, and that it repeats. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdlib.h>

#include "core/wire/decode.h"
#include "tests/suite.h"
#include "tests/unit/play_case.h"

enum { PLAYED_MAX = 40000 };

static const int64_t begin_ns = 1767225600000000000;

/* What a sensor of a rehearsal sent, as it arrived. */
struct datagram {
    int64_t arrives_ns, t_ns; /* from the beginning */
    uint64_t seq, hash;
    double z;
    char track[16];
};

struct played {
    int n;
    struct datagram at[PLAYED_MAX];
    struct scene_network network;
    uint64_t n_silent;
    uint64_t hash; /* of all bytes and times */
};

static uint64_t hash_on(uint64_t hash, const void *bytes, size_t len)
{
    const unsigned char *byte = bytes;
    for (size_t i = 0; i < len; i++)
        hash = (hash ^ byte[i]) * 0x100000001b3;
    return hash;
}

static void keep(struct played *p, const struct scene_datagram *d)
{
    static struct wire_decoder decoder;
    struct datagram *to = &p->at[p->n++];
    ck_assert_int_le(p->n, PLAYED_MAX);
    ck_assert_int_eq(wire_decode(&decoder, (const uint8_t *)d->bytes, d->len),
                     DATAGRAM_DECODED);
    ck_assert_int_eq(decoder.n, 1);
    const struct measurement *m = &decoder.element[0];
    ck_assert(m->has_t && m->has_seq);
    to->arrives_ns = d->arrives_ns - begin_ns;
    to->t_ns = m->t_ns - begin_ns;
    to->seq = m->seq;
    to->hash = hash_on(1, d->bytes, d->len);
    to->z = m->z[0];
    snprintf(to->track, sizeof to->track, "%.*s", m->track.len,
             m->track.len > 0 ? m->track.at : "");
}

/* Plays the whole rehearsal and keeps the datagrams of one sensor. */
static struct played *play(const char *text, const char *sensor)
{
    struct play_case c;
    struct scene_play play;
    struct scene_datagram d;
    bool is_over;
    struct played *p = calloc(1, sizeof *p);
    case_init(&c, text);
    ck_assert_int_eq(scene_play_init(&play, c.scene, begin_ns), ST_OK);
    for (;;) {
        ck_assert_int_eq(scene_play_next(&play, &d, &is_over), ST_OK);
        if (is_over)
            break;
        p->hash = hash_on(p->hash, d.bytes, d.len);
        p->hash = hash_on(p->hash, &d.arrives_ns, sizeof d.arrives_ns);
        if (d.sensor == case_sensor(&c, sensor))
            keep(p, &d);
    }
    p->network = play.network;
    p->n_silent = play.n_silent;
    scene_play_fini(&play);
    case_fini(&c);
    return p;
}

/* 200 s of the cart at rest, 10,000 samples of the laser. */
#define CART(more)                                                             \
    "{\"lasts\": \"200 s\", \"truth\": {\"cart\": {\"start\": "                \
    "{\"x\": \"3 m\"}}}" more "}"

/* --- the network ---------------------------------------------------------- */

START_TEST(all_arrives_at_once_and_in_order_without_a_network)
{
    struct played *p = play(CART(""), "laser");
    ck_assert_int_eq(p->n, 10000);
    for (int i = 0; i < p->n; i++) {
        ck_assert_int_eq(p->at[i].arrives_ns, p->at[i].t_ns);
        ck_assert_uint_eq(p->at[i].seq, (uint64_t)i + 1);
        ck_assert_str_eq(p->at[i].track, "");
    }
    free(p);
}
END_TEST

START_TEST(delays_lie_even_between_their_two_ends)
{
    struct played *p = play(CART(", \"network\": {\"laser\": {\"delay\": "
                                 "[\"30 ms\", \"50 ms\"]}}"),
                            "laser");
    double sum = 0, square = 0;
    ck_assert_int_eq(p->n, 10000);
    for (int i = 0; i < p->n; i++) {
        double delay_ms = (double)(p->at[i].arrives_ns - p->at[i].t_ns) / 1e6;
        ck_assert_double_ge(delay_ms, 30);
        ck_assert_double_lt(delay_ms, 50);
        sum += delay_ms;
        square += (delay_ms - 40) * (delay_ms - 40);
        ck_assert(i == 0 || p->at[i].arrives_ns >= p->at[i - 1].arrives_ns);
    }
    /* variance 20^2 / 12; 4.5 standard deviations of the mean, 5 % */
    ck_assert_double_eq_tol(sum / p->n, 40, 4.5 * 20 / sqrt(12 * 10000));
    ck_assert_double_eq_tol(square / p->n, 400. / 12, 0.05 * 400 / 12);
    free(p);
}
END_TEST

START_TEST(a_share_is_lost_and_its_seq_is_missing)
{
    struct played *p = play(CART(", \"network\": {\"laser\": {\"loss\": "
                                 "\"2 %\"}}"),
                            "laser");
    /* binomial: 200 +- 14 */
    ck_assert_int_le(abs(10000 - p->n - 200), 63);
    ck_assert_uint_eq(p->network.n_lost, (uint64_t)(10000 - p->n));
    uint64_t missing = p->at[0].seq - 1;
    for (int i = 1; i < p->n; i++)
        missing += p->at[i].seq - p->at[i - 1].seq - 1;
    missing += 10000 - p->at[p->n - 1].seq;
    ck_assert_uint_eq(missing, p->network.n_lost);
    free(p);
}
END_TEST

START_TEST(a_share_comes_twice_with_the_same_bytes)
{
    struct played *p =
        play(CART(", \"network\": {\"laser\": {\"delay\": [\"10 ms\", "
                  "\"90 ms\"], \"duplicates\": 0.05}}"),
             "laser");
    int seen[10001] = {0}, n_twice = 0;
    uint64_t hash[10001] = {0};
    for (int i = 0; i < p->n; i++) {
        uint64_t seq = p->at[i].seq;
        ck_assert_uint_le(seq, 10000);
        if (seen[seq]++ > 0) {
            ck_assert_uint_eq(hash[seq], p->at[i].hash);
            n_twice++;
        }
        hash[seq] = p->at[i].hash;
    }
    ck_assert_int_eq(p->n - n_twice, 10000);
    ck_assert_int_le(abs(n_twice - 500), 98); /* 500 +- 22 */
    ck_assert_uint_eq(p->network.n_doubled, (uint64_t)n_twice);
    free(p);
}
END_TEST

START_TEST(a_share_takes_one_to_two_periods_more_and_comes_out_of_order)
{
    struct played *p = play(CART(", \"network\": {\"laser\": {\"delay\": "
                                 "\"5 ms\", \"reordering\": 0.1}}"),
                            "laser");
    int n_late = 0, n_behind = 0;
    uint64_t greatest = 0;
    for (int i = 0; i < p->n; i++) {
        int64_t more_ns = p->at[i].arrives_ns - p->at[i].t_ns - 5000000;
        ck_assert(more_ns == 0 || (more_ns >= 20000000 && more_ns < 40000000));
        n_late += more_ns > 0;
        n_behind += p->at[i].seq < greatest;
        greatest = p->at[i].seq > greatest ? p->at[i].seq : greatest;
    }
    ck_assert_int_le(abs(n_late - 1000), 135); /* 1000 +- 30 */
    ck_assert_uint_eq(p->network.n_reordered, (uint64_t)n_late);
    ck_assert_int_gt(n_behind, n_late * 8 / 10);
    free(p);
}
END_TEST

START_TEST(what_arrives_at_one_instant_comes_as_it_was_sent)
{
    struct play_case c;
    struct scene_network network;
    struct scene_post post;
    case_init(&c, CART(""));
    scene_network_init(&network, c.scene);
    for (int i = 0; i < 20; i++) {
        struct scene_reading reading = {.sensor = i % 3, .t_ns = 5};
        ck_assert_int_eq(scene_network_send(&network, c.scene, &reading),
                         ST_OK);
    }
    for (int i = 0; i < 20; i++) {
        ck_assert_int_eq(scene_network_due(&network), 5);
        scene_network_take(&network, &post);
        ck_assert_int_eq(post.reading.sensor, i % 3);
        ck_assert_uint_eq(post.seq, (uint64_t)(i / 3 + 1));
    }
    ck_assert_int_eq(scene_network_due(&network), INT64_MAX);
    scene_network_fini(&network);
    case_fini(&c);
}
END_TEST

START_TEST(a_declared_delay_makes_the_stamp_so_much_later)
{
    struct play_case c;
    struct scene_sensor sensor;
    struct played *p = play(CART(""), "frame");
    case_init(&c, CART(""));
    scene_sensor_init(&sensor, c.scene, case_sensor(&c, "frame"), 0);
    ck_assert_int_eq(p->at[0].t_ns,
                     scene_sensor_due(&sensor, c.scene) + 4000000);
    case_fini(&c);
    free(p);
}
END_TEST

START_TEST(a_sensor_of_several_tracks_names_each_and_counts_them_together)
{
    struct played *p =
        play("{\"lasts\": 5, \"truth\": {\"raft-1\": [], \"raft-22\": []}, "
             "\"network\": {\"tower-a\": {\"form\": \"msgpack\"}}}",
             "tower-a");
    int n[2] = {0};
    ck_assert_int_eq(p->n, 100);
    for (int i = 0; i < p->n; i++) {
        ck_assert_uint_eq(p->at[i].seq, (uint64_t)i + 1);
        bool is_first = strcmp(p->at[i].track, "raft-1") == 0;
        ck_assert(is_first || strcmp(p->at[i].track, "raft-22") == 0);
        n[!is_first]++;
    }
    ck_assert_int_eq(n[0], 50);
    ck_assert_int_eq(n[1], 50);
    free(p);
}
END_TEST

/* --- faults --------------------------------------------------------------- */

START_TEST(a_jump_is_added_while_it_lasts_and_changes_nothing_else)
{
    struct played *was = play(CART(""), "laser");
    struct played *p = play(CART(", \"faults\": [{\"at\": \"40 s\", \"for\": "
                                 "\"0.5 s\", \"sensor\": \"laser\", "
                                 "\"jump\": \"0.6 m\"}]"),
                            "laser");
    int n = 0;
    ck_assert_int_eq(p->n, was->n);
    for (int i = 0; i < p->n; i++) {
        bool is_in =
            p->at[i].t_ns >= 40000000000 && p->at[i].t_ns < 40500000000;
        ck_assert_double_eq_tol(p->at[i].z - was->at[i].z, is_in ? 600 : 0,
                                1e-9);
        n += is_in;
    }
    ck_assert_int_eq(n, 25);
    free(was);
    free(p);
}
END_TEST

START_TEST(a_silent_sensor_says_nothing_and_goes_on_with_the_next_seq)
{
    struct played *p = play(CART(", \"faults\": [{\"at\": 40, \"for\": 2, "
                                 "\"sensor\": \"laser\", \"silence\": true}]"),
                            "laser");
    ck_assert_int_eq(p->n, 10000 - 100);
    ck_assert_uint_eq(p->n_silent, 100);
    for (int i = 0; i < p->n; i++) {
        ck_assert_uint_eq(p->at[i].seq, (uint64_t)i + 1);
        ck_assert(p->at[i].t_ns < 40000000000 || p->at[i].t_ns >= 42000000000);
    }
    free(p);
}
END_TEST

START_TEST(a_fault_of_one_track_leaves_the_others)
{
    struct played *p =
        play("{\"lasts\": 5, \"truth\": {\"raft-1\": [], \"raft-2\": []}, "
             "\"faults\": [{\"at\": 1, \"for\": 1, \"sensor\": \"tower-b\", "
             "\"track\": \"raft-2\", \"silence\": true}, {\"at\": 3, \"for\": "
             "1, \"sensor\": \"tower-b\", \"track\": \"raft-1\", \"jump\": "
             "[\"2 m\", \"0 deg\"]}]}",
             "tower-b");
    int n_far = 0;
    ck_assert_int_eq(p->n, 90);
    for (int i = 0; i < p->n; i++) {
        bool is_first = strcmp(p->at[i].track, "raft-1") == 0;
        bool is_far = p->at[i].z > sqrt(9 * 9 + 4 * 4) + 1; /* from (1, 2)  */
        ck_assert(is_first || !is_far);
        ck_assert(is_first || p->at[i].t_ns < 1000000000 ||
                  p->at[i].t_ns >= 2000000000);
        n_far += is_far;
    }
    ck_assert_int_eq(n_far, 10);
    free(p);
}
END_TEST

/* --- it repeats ----------------------------------------------------------- */

#define BUSY(seed, loss)                                                       \
    "{\"seed\": " seed ", \"lasts\": 5, \"truth\": {\"cart\": {\"wander\": "   \
    "{\"x\": 0.2}}, \"raft-1\": {\"wander\": {\"y\": 0.02}}}, \"network\": "   \
    "{\"frame\": {\"delay\": [0.01, 0.1], \"loss\": " loss ", "                \
    "\"duplicates\": 0.1, \"reordering\": 0.1}}}"

START_TEST(the_same_seed_gives_the_same_bytes_and_another_others)
{
    struct played *one = play(BUSY("5", "0.1"), "laser");
    struct played *again = play(BUSY("5", "0.1"), "laser");
    struct played *other = play(BUSY("6", "0.1"), "laser");
    ck_assert_uint_eq(one->hash, again->hash);
    ck_assert_uint_ne(one->hash, other->hash);
    free(one);
    free(again);
    free(other);
}
END_TEST

START_TEST(another_share_of_loss_leaves_all_else_as_it_was)
{
    struct played *less = play(BUSY("5", "0.1"), "frame");
    struct played *more = play(BUSY("5", "0.3"), "frame");
    ck_assert_uint_gt(more->network.n_lost, less->network.n_lost);
    int k = 0;
    for (int i = 0; i < more->n; i++) {
        while (k < less->n &&
               (less->at[k].hash != more->at[i].hash ||
                less->at[k].arrives_ns != more->at[i].arrives_ns))
            k++;
        ck_assert_int_lt(k, less->n);
    }
    free(less);
    free(more);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("scene_play");
    TCase *t = tcase_create("network");
    tcase_add_test(t, all_arrives_at_once_and_in_order_without_a_network);
    tcase_add_test(t, delays_lie_even_between_their_two_ends);
    tcase_add_test(t, a_share_is_lost_and_its_seq_is_missing);
    tcase_add_test(t, a_share_comes_twice_with_the_same_bytes);
    tcase_add_test(
        t, a_share_takes_one_to_two_periods_more_and_comes_out_of_order);
    tcase_add_test(t, what_arrives_at_one_instant_comes_as_it_was_sent);
    tcase_add_test(t, a_declared_delay_makes_the_stamp_so_much_later);
    tcase_add_test(
        t, a_sensor_of_several_tracks_names_each_and_counts_them_together);
    suite_add_tcase(s, t);
    t = tcase_create("faults");
    tcase_add_test(t, a_jump_is_added_while_it_lasts_and_changes_nothing_else);
    tcase_add_test(t,
                   a_silent_sensor_says_nothing_and_goes_on_with_the_next_seq);
    tcase_add_test(t, a_fault_of_one_track_leaves_the_others);
    suite_add_tcase(s, t);
    t = tcase_create("repeats");
    tcase_add_test(t, the_same_seed_gives_the_same_bytes_and_another_others);
    tcase_add_test(t, another_share_of_loss_leaves_all_else_as_it_was);
    suite_add_tcase(s, t);
    return s;
}
