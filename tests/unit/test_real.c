/* Elementary functions: values, edges, and bits that no build may change. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/real.h"
#include "tests/suite.h"

static const double endless = (double)INFINITY;
static const double no_number = (double)NAN;

static double exp_of(double x, double y)
{
    return real_exp(x + 0 * y);
}

static double expm1_of(double x, double y)
{
    return real_expm1(x + 0 * y);
}

static double log_of(double x, double y)
{
    return real_log(x + 0 * y);
}

static double sin_of(double x, double y)
{
    return real_sin(x + 0 * y);
}

static double cos_of(double x, double y)
{
    return real_cos(x + 0 * y);
}

static double wrap_of(double x, double y)
{
    return real_wrap(x + 0 * y);
}

/* Arguments of the bit test: x = middle + width u, u uniform in [-1, 1).
 * golden: FNV-1a over the results of 100,000 of them. */
static const struct function {
    const char *name;
    double (*f)(double x, double y);
    int rows_min;
    double middle, width;
    uint64_t golden;
} functions[] = {
    {"exp", exp_of, 300, 0, 750, 0x81583dd667853ccf},
    {"expm1", expm1_of, 300, 0, 50, 0x7a043caef9f836a4},
    {"log", log_of, 300, 50, 50, 0x381573492a5cacea},
    {"sin", sin_of, 300, 0, 1e9, 0xc0641f089857322c},
    {"cos", cos_of, 300, 0, 1000, 0x72bbc6431c0c7c4a},
    {"atan2", real_atan2, 300, 0, 3, 0xbef8bf96ecdf701f},
    {"wrap", wrap_of, 300, 0, 1000, 0x4dfa8f532cadd765},
};

enum { FUNCTIONS = sizeof functions / sizeof functions[0] };

static uint64_t next_bits(uint64_t *seed) /* splitmix64 */
{
    uint64_t z = (*seed += 0x9e3779b97f4a7c15);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9;
    z = (z ^ (z >> 27)) * 0x94d049bb133111eb;
    return z ^ (z >> 31);
}

static uint64_t bits_of(double x)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    return bits;
}

/* Distance of y from high + low units of high's last place, in such units. */
static double last_places(double y, double high, double low)
{
    int exponent;
    frexp(high, &exponent);
    exponent = exponent - 53 < -1074 ? -1074 : exponent - 53;
    double apart = y - high; /* exact: neighbours */
    if (exponent < -1000)
        return fabs(ldexp(apart, 500) / ldexp(1, exponent + 500) - low);
    return fabs(apart / ldexp(1, exponent) - low);
}

/* tests/data/real_values.csv: 1200 bits, see its first lines. */
START_TEST(values_are_within_one_last_place)
{
    const struct function *function = &functions[_i];
    FILE *file = fopen("tests/data/real_values.csv", "r");
    ck_assert_ptr_nonnull(file);
    char line[200], name[16];
    double worst = 0, worst_x = 0, x, y, high, low;
    int rows = 0;
    while (fgets(line, sizeof line, file) != NULL) {
        if (sscanf(line, "%15[^,],%la,%la,%la,%lf", name, &x, &y, &high,
                   &low) != 5 ||
            strcmp(name, function->name) != 0)
            continue;
        rows++;
        double error = last_places(function->f(x, y), high, low);
        if (!(error <= worst)) {
            worst = error;
            worst_x = x;
        }
    }
    fclose(file);
    if (getenv("SHOW") != NULL)
        printf("%s: %d rows, %.3f last places at %a\n", function->name, rows,
               worst, worst_x);
    ck_assert_int_ge(rows, function->rows_min);
    ck_assert_msg(worst <= 1, "%s(%a) is off by %.3f last places",
                  function->name, worst_x, worst);
}
END_TEST

START_TEST(bits_are_those_of_every_other_build)
{
    const struct function *function = &functions[_i];
    uint64_t seed = 1, hash = 0xcbf29ce484222325;
    for (int i = 0; i < 100000; i++) {
        double argument[2];
        for (int k = 0; k < 2; k++) {
            double u = (double)(next_bits(&seed) >> 11) * 0x1p-52 - 1;
            argument[k] = function->middle + function->width * u;
        }
        uint64_t bits = bits_of(function->f(argument[0], argument[1]));
        for (int k = 0; k < 8; k++)
            hash = (hash ^ (bits >> 8 * k & 0xff)) * 0x100000001b3;
    }
    ck_assert_msg(hash == function->golden, "%s gives 0x%016llx",
                  function->name, (unsigned long long)hash);
}
END_TEST

START_TEST(values_agree_with_the_c_library_on_many_arguments)
{
    /* glibc 2.36 is right to 1 last place; both at most 2 apart. */
    uint64_t seed = 7;
    for (int i = 0; i < 200000; i++) {
        double u = (double)(next_bits(&seed) >> 11) * 0x1p-52 - 1;
        double v = (double)(next_bits(&seed) >> 11) * 0x1p-52 - 1;
        double pair[6][2] = {
            {real_exp(700 * u), exp(700 * u)},
            {real_expm1(30 * u), expm1(30 * u)},
            {real_log(u + 1), log(u + 1)},
            {real_sin(1e9 * u), sin(1e9 * u)},
            {real_cos(1e4 * u), cos(1e4 * u)},
            {real_atan2(u, v), atan2(u, v)},
        };
        for (int k = 0; k < 6; k++)
            ck_assert_msg(last_places(pair[k][0], pair[k][1], 0) <= 2,
                          "function %d of %a, %a", k, u, v);
    }
}
END_TEST

START_TEST(exp_and_log_have_their_limits_at_the_ends)
{
    ck_assert_double_eq(real_exp(0), 1);
    ck_assert_double_eq(real_exp(-746), 0);
    ck_assert_double_eq(real_exp(-1e5), 0);
    ck_assert_double_eq(real_exp(-endless), 0);
    ck_assert_double_infinite(real_exp(710));
    ck_assert_double_infinite(real_exp(endless));
    ck_assert_double_nan(real_exp(no_number));
    ck_assert_double_eq(real_expm1(0), 0);
    ck_assert_double_eq(real_expm1(-1e5), -1);
    ck_assert_double_eq(real_expm1(-endless), -1);
    ck_assert_double_infinite(real_expm1(1e300));
    ck_assert_double_nan(real_expm1(no_number));
    ck_assert_double_eq(real_log(1), 0);
    ck_assert_double_eq(real_log(0), -endless);
    ck_assert_double_eq(real_log(-0.0), -endless);
    ck_assert_double_eq(real_log(endless), endless);
    ck_assert_double_nan(real_log(-1));
    ck_assert_double_nan(real_log(no_number));
}
END_TEST

START_TEST(angles_have_their_limits_at_the_ends)
{
    ck_assert_double_nan(real_sin(1.1e9));
    ck_assert_double_nan(real_cos(-endless));
    ck_assert_double_nan(real_sin(no_number));
    ck_assert_double_eq(real_cos(0), 1);
    ck_assert_double_eq(real_atan2(0, 0), 0);
    ck_assert_double_eq(real_atan2(0, 2), 0);
    ck_assert_double_eq(real_atan2(0, -1), REAL_PI);
    ck_assert_double_eq(real_atan2(-0.0, -1), REAL_PI);
    ck_assert_double_eq(real_atan2(1, 0), REAL_PI / 2);
    ck_assert_double_eq(real_atan2(-1, -0.0), -REAL_PI / 2);
    ck_assert_double_eq(real_atan2(endless, endless), REAL_PI / 4);
    ck_assert_double_eq(real_atan2(-1, endless), 0);
    ck_assert_double_eq(real_atan2(1, -endless), REAL_PI);
    ck_assert_double_eq(real_atan2(-endless, 1), -REAL_PI / 2);
    ck_assert_double_nan(real_atan2(no_number, 1));
    ck_assert_double_nan(real_atan2(1, no_number));
}
END_TEST

START_TEST(a_wrapped_angle_lies_above_minus_pi_and_not_above_pi)
{
    static const double angles[] = {REAL_PI, -REAL_PI, 3 * REAL_PI, 1e9,
                                    -1e9,    1.1e9,    1e15,        -1e300,
                                    1.7e308, 0x1p1023, -0x1.91p900, 0x1.93p900};
    for (size_t i = 0; i < sizeof angles / sizeof angles[0]; i++) {
        double y = real_wrap(angles[i]);
        ck_assert_msg(y > -REAL_PI && y <= REAL_PI, "%a: %a", angles[i], y);
    }
    ck_assert_double_eq(real_wrap(-REAL_PI), REAL_PI);
    ck_assert_double_eq(real_wrap(0.25), 0.25);
    ck_assert_double_nan(real_wrap(endless));
    ck_assert_double_nan(real_wrap(no_number));
}
END_TEST

START_TEST(a_huge_angle_is_wrapped_by_the_double_nearest_to_two_pi)
{
    uint64_t seed = 3;
    for (int i = 0; i < 20000; i++) {
        double u = (double)(next_bits(&seed) >> 11) * 0x1p-52 - 1;
        double x = ldexp(u, 32 + i % 990);
        double apart = real_wrap(x) - remainder(x, REAL_TWO_PI);
        ck_assert_msg(fabs(remainder(apart, REAL_TWO_PI)) < 1e-7, "%a", x);
    }
}
END_TEST

START_TEST(small_functions_do_what_their_names_say)
{
    static const double values[] = {0,       0.5,    -0.5,      1,     -1,
                                    1e15,    -1e15,  1e300,     -2.5,  2.5,
                                    -1e-300, 0x1p52, -0x1.8p51, 1e-300};
    for (size_t i = 0; i < sizeof values / sizeof values[0]; i++) {
        ck_assert_double_eq(real_floor(values[i]), floor(values[i]));
        ck_assert_double_eq(real_abs(values[i]), fabs(values[i]));
        ck_assert(real_is_finite(values[i]));
    }
    ck_assert(!real_is_finite(no_number) && !real_is_finite(-endless));
    ck_assert_double_infinite(real_floor(endless));
    ck_assert_uint_eq(bits_of(real_abs(-0.0)), 0);
    ck_assert_uint_eq(bits_of(real_nan()), (uint64_t)0x7ff8 << 48);
    ck_assert_double_eq(real_pow_int(3, 0), 1);
    ck_assert_double_eq(real_pow_int(-3, 5), -243);
    ck_assert_double_eq(real_pow_int(2, 1023), 0x1p1023);
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("real");
    TCase *t = tcase_create("real");
    tcase_set_timeout(t, 60);
    tcase_add_loop_test(t, values_are_within_one_last_place, 0, FUNCTIONS);
    tcase_add_loop_test(t, bits_are_those_of_every_other_build, 0, FUNCTIONS);
    tcase_add_test(t, values_agree_with_the_c_library_on_many_arguments);
    tcase_add_test(t, exp_and_log_have_their_limits_at_the_ends);
    tcase_add_test(t, angles_have_their_limits_at_the_ends);
    tcase_add_test(t, a_wrapped_angle_lies_above_minus_pi_and_not_above_pi);
    tcase_add_test(t, a_huge_angle_is_wrapped_by_the_double_nearest_to_two_pi);
    tcase_add_test(t, small_functions_do_what_their_names_say);
    suite_add_tcase(s, t);
    return s;
}
