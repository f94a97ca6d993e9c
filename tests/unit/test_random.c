/* The seeded generator: published outputs, moments, the same sequence. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <string.h>

#include "core/math/random.h"
#include "tests/suite.h"

enum { DRAWS = 1000000 };

START_TEST(seeding_gives_the_known_outputs_of_splitmix64)
{
    /* Widely printed for seed 1234567; found again by a second program. */
    static const uint64_t known[4] = {
        6457827717110365317U, 3203168211198807973U, 9817491932198370423U,
        4593380528125082431U};
    struct random r;
    random_init(&r, 1234567, 0);
    for (int i = 0; i < 4; i++)
        ck_assert_uint_eq(r.s[i], known[i]);
}
END_TEST

START_TEST(bits_are_the_known_outputs_of_xoshiro256)
{
    /* From state 1, 2, 3, 4 by the authors' program [BLA21], as printed in
     * many test suites; found again by a second program. */
    static const uint64_t known[10] = {11520U,
                                       0U,
                                       1509978240U,
                                       1215971899390074240U,
                                       1216172134540287360U,
                                       607988272756665600U,
                                       16172922978634559625U,
                                       8476171486693032832U,
                                       10595114339597558777U,
                                       2904607092377533576U};
    struct random r = {.s = {1, 2, 3, 4}};
    for (int i = 0; i < 10; i++)
        ck_assert_uint_eq(random_bits(&r), known[i]);
}
END_TEST

START_TEST(a_seeded_stream_gives_the_sequence_of_a_second_program)
{
    /* Seed 42 through splitmix64, computed in Python from [BLA21]. */
    static const uint64_t known[4] = {
        1546998764402558742U, 6990951692964543102U, 12544586762248559009U,
        17057574109182124193U};
    struct random r;
    random_init(&r, 42, 0);
    for (int i = 0; i < 4; i++)
        ck_assert_uint_eq(random_bits(&r), known[i]);
}
END_TEST

/* Sums of the powers 1 to 4 of n draws, divided by n. */
static void moments(double (*draw)(struct random *r), double m[5])
{
    struct random r;
    random_init(&r, 2024, 1);
    memset(m, 0, 5 * sizeof *m);
    for (int i = 0; i < DRAWS; i++) {
        double x = draw(&r), power = 1;
        for (int k = 1; k <= 4; k++) {
            power *= x;
            m[k] += power / DRAWS;
        }
    }
}

/* A mean of n draws strays by sd / sqrt(n); five of those are allowed, and
 * sd^2 of X^k is E X^2k - (E X^k)^2. */
static void assert_moment(double found, double is, double of_square)
{
    double sd = sqrt((of_square - is * is) / DRAWS);
    ck_assert_double_eq_tol(found, is, 5 * sd);
}

START_TEST(uniform_moments_are_right)
{
    double m[5];
    moments(random_uniform, m);
    for (int k = 1; k <= 4; k++)
        assert_moment(m[k], 1.0 / (k + 1), 1.0 / (2 * k + 1));
}
END_TEST

START_TEST(normal_moments_are_right)
{
    static const double is[9] = {1, 0, 1, 0, 3, 0, 15, 0, 105};
    double m[5];
    moments(random_normal, m);
    for (int k = 1; k <= 4; k++)
        assert_moment(m[k], is[k], is[2 * k]);
}
END_TEST

START_TEST(exponential_moments_are_factorials)
{
    double m[5];
    moments(random_exponential, m);
    for (int k = 1; k <= 4; k++)
        assert_moment(m[k], tgamma(k + 1), tgamma(2 * k + 1));
}
END_TEST

START_TEST(normal_draws_fill_their_cells_and_pairs_do_not_correlate)
{
    struct random r;
    random_init(&r, 5, 5);
    double cells[20] = {0}, was = 0, product = 0;
    for (int i = 0; i < DRAWS; i++) {
        double x = random_normal(&r);
        int cell = (int)(20 * 0.5 * erfc(-x / sqrt(2)));
        cells[cell > 19 ? 19 : cell]++;
        product += x * was / DRAWS;
        was = x;
    }
    double statistic = 0, expected = DRAWS / 20.0;
    for (int i = 0; i < 20; i++)
        statistic += pow(cells[i] - expected, 2) / expected;
    ck_assert_double_lt(statistic, 43.82); /* chi-square 19, p = 0.999 */
    ck_assert_double_lt(fabs(product), 5 / sqrt(DRAWS));
}
END_TEST

START_TEST(whole_numbers_below_a_bound_come_equally_often)
{
    struct random r;
    random_init(&r, 1, 0);
    double cells[7] = {0}, statistic = 0, expected = DRAWS / 7.0;
    for (int i = 0; i < DRAWS; i++)
        cells[random_below(&r, 7)]++;
    for (int i = 0; i < 7; i++)
        statistic += pow(cells[i] - expected, 2) / expected;
    ck_assert_double_lt(statistic, 22.46); /* chi-square 6, p = 0.999 */

    /* n = 3 2^62: plain bits % n would be below 2^62 half of the time. */
    int low = 0;
    uint64_t n = (uint64_t)3 << 62;
    for (int i = 0; i < DRAWS; i++) {
        uint64_t y = random_below(&r, n);
        ck_assert_uint_lt(y, n);
        low += y < (uint64_t)1 << 62;
    }
    ck_assert_double_eq_tol(low, DRAWS / 3.0, 5 * sqrt(DRAWS * 2 / 9.0));
    ck_assert_uint_eq(random_below(&r, 1), 0);
}
END_TEST

START_TEST(other_seeds_and_streams_give_other_sequences)
{
    uint64_t first[64];
    for (uint64_t i = 0; i < 64; i++) {
        struct random r;
        random_init(&r, i / 8, i % 8);
        first[i] = random_bits(&r);
        for (uint64_t k = 0; k < i; k++)
            ck_assert_uint_ne(first[i], first[k]);
    }
    double product = 0; /* two streams do not correlate */
    struct random a, b;
    random_init(&a, 9, 0);
    random_init(&b, 9, 1);
    for (int i = 0; i < DRAWS; i++)
        product += random_normal(&a) * random_normal(&b) / DRAWS;
    ck_assert_double_lt(fabs(product), 5 / sqrt(DRAWS));
}
END_TEST

START_TEST(draws_have_the_bits_of_every_other_build)
{
    struct random r;
    random_init(&r, 77, 3);
    uint64_t hash = 0xcbf29ce484222325; /* FNV-1a */
    for (int i = 0; i < 100000; i++) {
        double x[4] = {random_uniform(&r), random_normal(&r),
                       random_exponential(&r), (double)random_below(&r, 1000)};
        unsigned char bytes[sizeof x];
        memcpy(bytes, x, sizeof x);
        for (size_t k = 0; k < sizeof x; k++)
            hash = (hash ^ bytes[k]) * 0x100000001b3;
    }
    ck_assert_msg(hash == 0xb495573d3b380b6e, "draws give 0x%016llx",
                  (unsigned long long)hash);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("random");
    TCase *t = tcase_create("random");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, seeding_gives_the_known_outputs_of_splitmix64);
    tcase_add_test(t, bits_are_the_known_outputs_of_xoshiro256);
    tcase_add_test(t, a_seeded_stream_gives_the_sequence_of_a_second_program);
    tcase_add_test(t, uniform_moments_are_right);
    tcase_add_test(t, normal_moments_are_right);
    tcase_add_test(t, exponential_moments_are_factorials);
    tcase_add_test(t, normal_draws_fill_their_cells_and_pairs_do_not_correlate);
    tcase_add_test(t, whole_numbers_below_a_bound_come_equally_often);
    tcase_add_test(t, other_seeds_and_streams_give_other_sequences);
    tcase_add_test(t, draws_have_the_bits_of_every_other_build);
    suite_add_tcase(s, t);
    return s;
}
