/* Numbers with units.
 *
 * Exact factors: International System of Units (SI brochure, 9th edition):
 * table 8 (degree, hour, knot by the nautical mile of 1852 m), standard
 * gravity 9.80665 m/s2 (CGPM 1901), 0 degC = 273.15 K; IEC 80000-13 for KiB,
 * MiB, GiB.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>
#include <string.h>

#include "config/quantity.h"
#include "tests/suite.h"

static struct quantity_units *units;

static void setup(void)
{
    struct err err;
    units = quantity_units_new(&err);
    ck_assert_msg(units != NULL, "%s", err.text);
}

static void teardown(void)
{
    quantity_units_free(units);
    units = NULL;
}

static double parse(const char *text, const char *to, enum quantity_role role)
{
    struct err err = {ST_OK, ""};
    double value = nan("");
    status st = quantity_parse(units, text, to, role, &value, &err);
    ck_assert_msg(st == ST_OK, "%s to %s: %s", text, to, err.text);
    return value;
}

#define PI 3.14159265358979323846

static const struct {
    const char *text, *to;
    double value;
} good[] = {{"2 mm", "m", 0.002},
            {"2mm", "m", 0.002},
            {"  -1.5e3   m/s2 ", "m/s2", -1500},
            {"+7", "m", 7},
            {"36 km/h", "m/s", 10},
            {"0.2 m2/s5", "m2/s5", 0.2},
            {"1 mm2/s3", "m2/s3", 1e-6},
            {"1 (km/h)^2/s", "m2/s3", 1 / 12.96},
            {"180 deg", "rad", PI},
            {"180 \xc2\xb0", "rad", PI},
            {"1 deg2/s3", "rad2/s3", PI *PI / 32400},
            {"60 rev/min", "rad/s", 2 * PI},
            {"60 rpm", "rad/s", 2 * PI},
            {"6 deg/s", "rev/min", 1},
            {"1 gn", "m/s2", 9.80665},
            {"1 mgn", "m/s2", 0.00980665},
            {"1 kn", "m/s", 1852.0 / 3600},
            {"1 kN", "N", 1000},
            {"4 MiB", "B", 4194304},
            {"1 GiB", "MiB", 1024},
            {"1 KiB", "B", 1024},
            {"0.3 %", "1", 0.003},
            {"50 ppm", "1", 50e-6},
            {"20 min", "s", 1200},
            {"2 kHz", "Hz", 2000},
            {"5 1/s", "Hz", 5},
            {"3 pulses", "count", 3},
            {"3 counts/s", "count/s", 3},
            {"2 \xc2\xb5m", "mm", 0.002},
            {"1 gram", "kg", 0.001},
            {"3 m s-2", "m/s2", 3},
            {"3 m^2/s^-1", "m2.s", 3},
            {"4 m**2", "m2", 4},
            {"2 (1/s)^2", "1/s2", 2},
            {"1 (%)^2/s", "1/s", 1e-4},
            {"1 m/s\xc2\xb2", "m/s2", 1}};

START_TEST(a_quantity_becomes_the_wanted_unit)
{
    double want = good[_i].value;
    double got = parse(good[_i].text, good[_i].to, QUANTITY_POINT);
    ck_assert_msg(fabs(got - want) <= 4e-16 * fabs(want), "%s in %s is %.17g",
                  good[_i].text, good[_i].to, got);
}
END_TEST

START_TEST(a_point_moves_by_the_offset_and_a_difference_does_not)
{
    double scale, shift;
    struct err err;
    ck_assert_double_eq_tol(parse("0.25 degC", "K", QUANTITY_POINT), 273.4,
                            1e-12);
    ck_assert_double_eq_tol(parse("0.25 degC", "K", QUANTITY_DIFFERENCE), 0.25,
                            1e-12);
    ck_assert_double_eq_tol(parse("9 degF", "degC", QUANTITY_DIFFERENCE), 5,
                            1e-12);
    ck_assert_double_eq_tol(parse("50 degF", "degC", QUANTITY_POINT), 10,
                            1e-12);
    ck_assert(quantity_convert(units, "degC", "K", &scale, &shift, &err) ==
              ST_OK);
    ck_assert_double_eq_tol(scale, 1, 1e-15);
    ck_assert_double_eq_tol(shift, 273.15, 1e-12);
}
END_TEST

static const struct {
    const char *text, *to, *part; /* of the message */
} wrong[] = {
    {"2 g", "m/s2", "write gram for a mass or gn for standard gravity"},
    {"2 C", "degC", "write degC"},
    {"2 F", "degF", "write degF"},
    {"2 mm/g", "m", "not clear"},
    {"2 mg", "m/s2", "mgn is a thousandth"},
    {"2 kN", "m/s", "kn is the knot"},
    {"2 deg", "1", "another kind"},
    {"2 %", "rad", "another kind"},
    {"2 rad/s", "Hz", "rev/min and rad/s turn, Hz counts"},
    {"2 rev/min", "1/s", "another kind"},
    {"2 Hz", "rad/s", "another kind"},
    {"2 count", "1", "another kind"},
    {"2 count/s", "Hz", "another kind"},
    {"2 B", "1", "another kind"},
    {"2 rad2", "rad", "another kind"},
    {"2 s", "m", "give one that converts to m"},
    {"2 dB", "1", "plain ratio"},
    {"2 lg(re mW)", "W", "another kind"},
    {"2 s since 1970-01-01", "s", "reference"},
    {"2 s@3", "s", "not known"},
    {"2 blub", "m", "not known"},
    {"2 3 mm", "m", "holds a number"},
    {"1.5.2 mm", "m", "holds a number"},
    {"10 -3 m", "m", "holds a number"},
    {"5 mm 2", "m", "holds a number"},
    {"5 (3 mm)", "m", "holds a number"},
    {"2 1 mm", "m", "holds a number"},
    {"1 K/10 min", "K/s", "holds a number"},
    {"5 m\xc2\xb7"
     "2",
     "m", "holds a number"},
    {"mm", "m", "not a number with a unit"},
    {"", "m", "not a number with a unit"},
    {"nan", "m", "not a number with a unit"},
    {"inf m", "m", "not a number with a unit"},
    {"1e999 m", "m", "not a number with a unit"}};

START_TEST(another_kind_or_an_unclear_unit_is_refused_with_a_hint)
{
    struct err err = {ST_OK, ""};
    double value;
    ck_assert_int_eq(quantity_parse(units, wrong[_i].text, wrong[_i].to,
                                    QUANTITY_POINT, &value, &err),
                     ST_SCHEMA);
    ck_assert_int_eq(err.code, ST_SCHEMA);
    ck_assert_msg(strstr(err.text, wrong[_i].part) != NULL, "%s: %s",
                  wrong[_i].text, err.text);
    ck_assert_ptr_nonnull(strstr(err.text, "; "));
}
END_TEST

START_TEST(the_unit_of_a_derivative_is_written_as_one_would)
{
    static const struct {
        const char *unit;
        int times;
        const char *want;
    } cases[] = {
        {"m", 0, "m"},       {"m", 1, "m/s"},       {"m", 2, "m/s2"},
        {"deg", 1, "deg/s"}, {"m/s", 1, "m/s2"},    {"1", 1, "1/s"},
        {"m2", 1, "m2/s"},   {"km/h", 1, "km/h/s"}, {"m/s2", 1, "m/s3"}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char got[32];
        double scale, shift;
        quantity_derivative_unit(cases[i].unit, cases[i].times, got,
                                 sizeof got);
        ck_assert_str_eq(got, cases[i].want);
        ck_assert(quantity_convert(units, got, got, &scale, &shift, NULL) ==
                  ST_OK);
    }
}
END_TEST

START_TEST(a_number_is_split_from_its_unit)
{
    double value;
    const char *unit;
    ck_assert(quantity_split("12.5 mm", &value, &unit));
    ck_assert_double_eq(value, 12.5);
    ck_assert_str_eq(unit, "mm");
    ck_assert(quantity_split("5 eV", &value, &unit));
    ck_assert_str_eq(unit, "eV");
    ck_assert(quantity_split("5eV", &value, &unit));
    ck_assert_double_eq(value, 5);
    ck_assert_str_eq(unit, "eV");
    ck_assert(quantity_split("-3", &value, &unit));
    ck_assert_str_eq(unit, "");
    ck_assert(!quantity_split(".5 m", &value, &unit));
    ck_assert(!quantity_split("- 5 m", &value, &unit));
}
END_TEST

START_TEST(a_time_is_whole_nanoseconds_and_bare_numbers_are_seconds)
{
    int64_t ns;
    struct err err;
    ck_assert(quantity_time_ns(units, "12 ms", &ns, &err) == ST_OK);
    ck_assert_int_eq(ns, 12000000);
    ck_assert(quantity_time_ns(units, "0.5", &ns, &err) == ST_OK);
    ck_assert_int_eq(ns, 500000000);
    ck_assert(quantity_time_ns(units, "0.1 us", &ns, &err) == ST_OK);
    ck_assert_int_eq(ns, 100);
    ck_assert(quantity_time_ns(units, "200 years", &ns, &err) == ST_SCHEMA);
    ck_assert(quantity_time_ns(units, "1 m", &ns, &err) == ST_SCHEMA);
}
END_TEST

#define COUNT(a) (int)(sizeof(a) / sizeof *(a))

Suite *suite(void)
{
    Suite *s = suite_create("quantity");
    TCase *t = tcase_create("quantity");
    tcase_add_checked_fixture(t, setup, teardown);
    tcase_add_loop_test(t, a_quantity_becomes_the_wanted_unit, 0, COUNT(good));
    tcase_add_test(t, a_point_moves_by_the_offset_and_a_difference_does_not);
    tcase_add_loop_test(t,
                        another_kind_or_an_unclear_unit_is_refused_with_a_hint,
                        0, COUNT(wrong));
    tcase_add_test(t, the_unit_of_a_derivative_is_written_as_one_would);
    tcase_add_test(t, a_number_is_split_from_its_unit);
    tcase_add_test(t, a_time_is_whole_nanoseconds_and_bare_numbers_are_seconds);
    suite_add_tcase(s, t);
    return s;
}
