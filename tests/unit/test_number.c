/* wire_print_number, wire_print_time. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "core/wire/encode.h"
#include "tests/suite.h"

/* A fixed sequence: splitmix64. */
static uint64_t next_bits(uint64_t *seed)
{
    uint64_t z = (*seed += 0x9e3779b97f4a7c15);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9;
    z = (z ^ (z >> 27)) * 0x94d049bb133111eb;
    return z ^ (z >> 31);
}

static double of_bits(uint64_t bits)
{
    double x;
    memcpy(&x, &bits, sizeof x);
    return x;
}

static uint64_t bits_of(double x)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    return bits;
}

/* Significant digits of a number's text. */
static int digits_in(const char *s)
{
    int n = 0, zeros = 0;
    for (; *s != '\0' && *s != 'e'; s++) {
        if (*s < '0' || *s > '9' || (*s == '0' && n + zeros == 0))
            continue;
        zeros++;
        if (*s != '0') {
            n += zeros;
            zeros = 0;
        }
    }
    return n;
}

/* The fewest digits with which %e reads back as x, searched from `below`
 * downwards; printf rounds correctly in glibc, so that is a bound. */
static bool fewer_digits_do(double x, int below)
{
    char text[40];
    if (below < 1)
        return false;
    snprintf(text, sizeof text, "%.*e", below - 1, x);
    return bits_of(strtod(text, NULL)) == bits_of(x);
}

static void check_number(double x)
{
    char text[32];
    memset(text, 'x', sizeof text);
    size_t len = wire_print_number(x, text);
    ck_assert_msg(len < sizeof text && len == strlen(text), "%a: length", x);
    ck_assert_msg(bits_of(strtod(text, NULL)) == bits_of(x),
                  "%a printed as %s reads back as another number", x, text);
    int n = digits_in(text);
    ck_assert_msg(n <= 17, "%a: %d digits in %s", x, n, text);
    ck_assert_msg(!fewer_digits_do(x, n - 1), "%a: %s could be shorter", x,
                  text);
    if (n < 2) /* the shortest subnormals have neighbours many digits away */
        return;

    /* Among texts of the same length it is the closest to x, as %e prints
     * it, whenever that one reads back at all. */
    char same[40], ours[40];
    snprintf(same, sizeof same, "%.*e", n - 1, x);
    if (bits_of(strtod(same, NULL)) != bits_of(x))
        return;
    snprintf(ours, sizeof ours, "%.*e", n - 1, strtod(text, NULL));
    ck_assert_str_eq(ours, same);
}

static void check_text(double x, const char *want)
{
    char text[32];
    size_t len = wire_print_number(x, text);
    ck_assert_str_eq(text, want);
    ck_assert_uint_eq(len, strlen(want));
}

START_TEST(random_bits_read_back_and_are_shortest)
{
    uint64_t seed = 20260117;
    for (int i = 0; i < 1000000; i++) {
        double x = of_bits(next_bits(&seed));
        if (isfinite(x))
            check_number(x);
    }
}
END_TEST

START_TEST(every_power_of_two_and_its_neighbours_read_back)
{
    for (int e = -1074; e <= 1023; e++) {
        uint64_t bits = bits_of(ldexp(1, e));
        for (uint64_t i = 0; i < 5; i++)
            check_number(of_bits(bits + i > 2 ? bits + i - 2 : bits));
    }
}
END_TEST

START_TEST(every_power_of_ten_and_its_neighbours_read_back)
{
    for (int e = -323; e <= 308; e++) {
        char text[16];
        snprintf(text, sizeof text, "1e%d", e);
        uint64_t bits = bits_of(strtod(text, NULL));
        for (uint64_t i = 0; i < 5; i++)
            check_number(of_bits(bits + i - 2));
    }
}
END_TEST

START_TEST(small_subnormals_read_back)
{
    for (uint64_t bits = 1; bits < 20000; bits++)
        check_number(of_bits(bits));
}
END_TEST

START_TEST(readings_with_few_decimals_print_as_they_were_written)
{
    uint64_t seed = 7;
    for (int i = 0; i < 200000; i++) {
        char want[40];
        int places = 1 + (int)(next_bits(&seed) % 9);
        long whole = (long)(next_bits(&seed) % 100000);
        long part = (long)(next_bits(&seed) % (uint64_t)pow(10, places));
        if (part % 10 == 0)
            part++;
        snprintf(want, sizeof want, "%ld.%0*ld", whole, places, part);
        double x = strtod(want, NULL);
        if (x >= 1e-6)
            check_text(x, want);
    }
}
END_TEST

START_TEST(integers_print_without_point_or_exponent)
{
    uint64_t seed = 11;
    for (int i = 0; i < 200000; i++) {
        int64_t v = (int64_t)(next_bits(&seed) >> (11 + i % 53));
        char want[32];
        snprintf(want, sizeof want, "%lld", (long long)v);
        check_text((double)v, want);
    }
}
END_TEST

static const struct {
    double x;
    const char *text;
} edges[] = {
    {0.0, "0"},
    {-0.0, "-0"},
    {1, "1"},
    {-1, "-1"},
    {0.1, "0.1"},
    {0.1 + 0.2, "0.30000000000000004"},
    {1.0 / 3, "0.3333333333333333"},
    {100, "100"},
    {123456.789, "123456.789"},
    {1e-6, "0.000001"},
    {1.5e-6, "0.0000015"},
    {1e-7, "1e-7"},
    {1.25e-7, "1.25e-7"},
    {1e20, "100000000000000000000"},
    {123456789012345680000.0, "123456789012345680000"},
    {1e21, "1e+21"},
    {1e22, "1e+22"},
    {1e23, "1e+23"}, /* lies between two doubles; the even one            */
    {1125899906842624.25, "1125899906842624.2"}, /* equally close: even */
    {1125899906842624.75, "1125899906842624.8"},
    {9.5e-323, "9.4e-323"},
    {9007199254740992.0, "9007199254740992"},
    {9007199254740994.0, "9007199254740994"},
    {18014398509481984.0, "18014398509481984"},
    {DBL_MAX, "1.7976931348623157e+308"},
    {-DBL_MAX, "-1.7976931348623157e+308"},
    {DBL_MIN, "2.2250738585072014e-308"},
    {2.2250738585072011e-308, "2.225073858507201e-308"},
    {4.9406564584124654e-324, "5e-324"},
    {DBL_EPSILON, "2.220446049250313e-16"},
    {(double)NAN, "null"},
    {(double)INFINITY, "null"},
    {-(double)INFINITY, "null"},
};

START_TEST(edge_values_print_as_stated)
{
    check_text(edges[_i].x, edges[_i].text);
}
END_TEST

START_TEST(the_longest_text_fits_in_32_bytes)
{
    size_t longest = 0;
    uint64_t seed = 3;
    for (int i = 0; i < 300000; i++) {
        char text[64];
        double x = -ldexp(1 + (double)(next_bits(&seed) >> 12) * 0x1p-52,
                          i % 120 - 40);
        size_t len = wire_print_number(x, text);
        longest = len > longest ? len : longest;
    }
    ck_assert_uint_eq(longest, 25); /* -0.0000012345678901234567          */
}
END_TEST

START_TEST(times_agree_with_the_c_library)
{
    uint64_t seed = 5;
    for (int i = 0; i < 200000; i++) {
        int64_t t_ns = (int64_t)next_bits(&seed);
        int64_t ns = ((t_ns % 1000000000) + 1000000000) % 1000000000;
        time_t seconds = (time_t)((t_ns - ns) / 1000000000);
        if (t_ns < INT64_MIN + 1000000000)
            continue;
        struct tm tm;
        char want[64], text[31];
        ck_assert_ptr_nonnull(gmtime_r(&seconds, &tm));
        size_t n = strftime(want, sizeof want, "%Y-%m-%dT%H:%M:%S", &tm);
        snprintf(want + n, sizeof want - n, ".%09lldZ", (long long)ns);
        ck_assert_uint_eq(wire_print_time(t_ns, text), 30);
        ck_assert_str_eq(text, want);
    }
}
END_TEST

static const struct {
    int64_t t_ns;
    const char *text;
} times[] = {
    {1000000000000000000, "2001-09-09T01:46:40.000000000Z"},
    {0, "1970-01-01T00:00:00.000000000Z"},
    {-1, "1969-12-31T23:59:59.999999999Z"},
    {951782400000000001, "2000-02-29T00:00:00.000000001Z"},
    {4107542400000000000, "2100-03-01T00:00:00.000000000Z"},
    {INT64_MAX, "2262-04-11T23:47:16.854775807Z"},
    {INT64_MIN, "1677-09-21T00:12:43.145224192Z"},
};

START_TEST(edge_times_print_as_stated)
{
    char text[31];
    ck_assert_uint_eq(wire_print_time(times[_i].t_ns, text), 30);
    ck_assert_str_eq(text, times[_i].text);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("number");
    TCase *t = tcase_create("number");
    tcase_set_timeout(t, 120);
    tcase_add_test(t, random_bits_read_back_and_are_shortest);
    tcase_add_test(t, every_power_of_two_and_its_neighbours_read_back);
    tcase_add_test(t, every_power_of_ten_and_its_neighbours_read_back);
    tcase_add_test(t, small_subnormals_read_back);
    tcase_add_test(t, readings_with_few_decimals_print_as_they_were_written);
    tcase_add_test(t, integers_print_without_point_or_exponent);
    tcase_add_loop_test(t, edge_values_print_as_stated, 0,
                        sizeof edges / sizeof *edges);
    tcase_add_test(t, the_longest_text_fits_in_32_bytes);
    tcase_add_test(t, times_agree_with_the_c_library);
    tcase_add_loop_test(t, edge_times_print_as_stated, 0,
                        sizeof times / sizeof *times);
    suite_add_tcase(s, t);
    return s;
}
