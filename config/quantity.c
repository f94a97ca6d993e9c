/* SPDX-License-Identifier: Apache-2.0 */
#include "config/quantity.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <udunits2.h>

#include "core/wire/decode.h"

enum { UNIT_TEXT_SIZE = 512, TOKEN_SIZE = 24 };

struct quantity_units {
    ut_system *system;
};

/* What the unit library refuses, misreads or has no dimension for.  `countq`
 * and `byteq` are base units of ours, so that counts and amounts of data are
 * kinds of their own. */
static const struct {
    const char *name, *means;
} aliases[] = {{"deg", "(0.017453292519943295 rad)"},
               {"\xc2\xb0", "(0.017453292519943295 rad)"},
               {"rev", "(6.283185307179586 rad)"},
               {"turn", "(6.283185307179586 rad)"},
               {"rpm", "(0.10471975511965977 rad/s)"},
               {"gn", "(9.80665 m/s2)"},
               {"mgn", "(0.00980665 m/s2)"},
               {"kn", "(1852 m/h)"},
               {"B", "byteq"},
               {"byte", "byteq"},
               {"bytes", "byteq"},
               {"kB", "(1e3 byteq)"},
               {"MB", "(1e6 byteq)"},
               {"GB", "(1e9 byteq)"},
               {"TB", "(1e12 byteq)"},
               {"KiB", "(1024 byteq)"},
               {"MiB", "(1048576 byteq)"},
               {"GiB", "(1073741824 byteq)"},
               {"TiB", "(1099511627776 byteq)"},
               {"count", "countq"},
               {"counts", "countq"},
               {"pulse", "countq"},
               {"pulses", "countq"},
               {"tick", "countq"},
               {"ticks", "countq"}};

/* Letters that a reader and the unit library take for different things. */
static const struct {
    const char *name, *hint;
} refused[] = {{"g", "write gram for a mass or gn for standard gravity"},
               {"C", "write degC for a temperature or coulomb for a charge"},
               {"F", "write degF for a temperature or farad for a capacitance"},
               {"since", "give a unit without a reference time"},
               {"after", "give a unit without a reference time"},
               {"from", "give a unit without a reference"},
               {"ref", "give a unit without a reference time"},
               {"dB", "give the plain ratio"}};

#define LENGTH(a) ((int)(sizeof(a) / sizeof *(a)))

static bool add_base(ut_system *system, const char *name)
{
    ut_unit *base = ut_new_base_unit(system);
    if (base == NULL)
        return false;
    bool is_ok = ut_map_name_to_unit(name, UT_ASCII, base) == UT_SUCCESS &&
                 ut_map_unit_to_name(base, name, UT_ASCII) == UT_SUCCESS &&
                 ut_map_unit_to_symbol(base, name, UT_ASCII) == UT_SUCCESS;
    ut_free(base);
    return is_ok;
}

struct quantity_units *quantity_units_new(struct err *err)
{
    struct quantity_units *u = calloc(1, sizeof *u);
    if (u == NULL) {
        err_set(err, ST_NOMEM, "out of memory");
        return NULL;
    }
    ut_set_error_message_handler(ut_ignore);
    u->system = ut_read_xml(NULL);
    if (u->system == NULL || !add_base(u->system, "countq") ||
        !add_base(u->system, "byteq")) {
        err_set(err, ST_IO,
                "the table of units does not load; install libudunits2-data");
        quantity_units_free(u);
        return NULL;
    }
    return u;
}

void quantity_units_free(struct quantity_units *u)
{
    if (u == NULL)
        return;
    if (u->system != NULL)
        ut_free_system(u->system);
    free(u);
}

static bool is_letter(char c)
{
    unsigned char byte = (unsigned char)c;
    return isalpha(byte) || byte >= 0x80 || byte == '_';
}

/* True for the bytes of superscripts and the middle dot, which end a word. */
static bool is_sign(const char *s)
{
    return strncmp(s, "\xc2\xb2", 2) == 0 || strncmp(s, "\xc2\xb3", 2) == 0 ||
           strncmp(s, "\xc2\xb9", 2) == 0 || strncmp(s, "\xc2\xb7", 2) == 0;
}

static const char *alias(const char *word)
{
    for (int i = 0; i < LENGTH(aliases); i++)
        if (strcmp(word, aliases[i].name) == 0)
            return aliases[i].means;
    return word;
}

/* The unit in words of the unit library, without blanks at its end. */
static status translate(const char *unit, char out[UNIT_TEXT_SIZE],
                        struct err *err)
{
    size_t n = 0;
    out[0] = '\0';
    for (const char *s = unit; *s != '\0';) {
        char word[TOKEN_SIZE] = "";
        size_t len = 0;
        while (is_letter(s[len]) && !is_sign(s + len) && len + 1 < TOKEN_SIZE)
            len++;
        if (len == 0)
            len = is_sign(s) ? 2 : 1;
        memcpy(word, s, len);
        for (int i = 0; i < LENGTH(refused); i++)
            if (strcmp(word, refused[i].name) == 0)
                return err_set(err, ST_SCHEMA,
                               "the unit \"%.64s\" is not clear; %s", unit,
                               refused[i].hint);
        const char *means = alias(word);
        n += (size_t)snprintf(out + n, UNIT_TEXT_SIZE - n, "%s", means);
        if (n >= UNIT_TEXT_SIZE)
            return err_set(err, ST_SCHEMA, "the unit is too long; shorten it");
        s += len;
    }
    while (n > 0 && out[n - 1] == ' ')
        out[--n] = '\0';
    return ST_OK;
}

static bool ends_unit(char c)
{
    return is_letter(c) || c == ')' || c == '%';
}

/* True if digits at s are the power of what stands before them. */
static bool is_power(const char *unit, const char *s)
{
    size_t n = (size_t)(s - unit);
    if (n >= 2 && is_sign(s - 2))
        return false;
    if (n >= 2 && s[-1] == '-') {
        s--;
        n--;
    }
    if (n >= 2 && (s[-1] == '^' || (s[-1] == '*' && s[-2] == '*')))
        return true;
    return n >= 1 && ends_unit(s[-1]);
}

/* "2 3 mm" would be 6 mm: in a unit, digits are powers or the 1 of 1/s. */
static bool has_factor(const char *unit)
{
    for (const char *s = unit; *s != '\0'; s++) {
        size_t n = strspn(s, "0123456789");
        if (n == 0)
            continue;
        char after = s[n + strspn(s + n, " ")];
        bool is_one = n == 1 && *s == '1' && (s == unit || s[-1] == '(') &&
                      (after == '\0' || after == '/' || after == ')');
        if (!is_one && !is_power(unit, s))
            return true;
        s += n - 1;
    }
    return false;
}

static status parse_unit(struct quantity_units *u, const char *unit,
                         ut_unit **out, struct err *err)
{
    char text[UNIT_TEXT_SIZE];
    status st = translate(unit, text, err);
    if (st != ST_OK)
        return st;
    bool has_reference = strpbrk(text, "@\"'") != NULL;
    if (!has_reference && has_factor(unit))
        return err_set(err, ST_SCHEMA,
                       "the unit \"%.64s\" holds a number; digits in a unit "
                       "are powers, like m/s2",
                       unit);
    *out = has_reference ? NULL : ut_parse(u->system, text, UT_UTF8);
    if (*out == NULL || text[0] == '\0')
        return err_set(err, ST_SCHEMA,
                       "the unit \"%.64s\" is not known; write units like "
                       "mm, m/s2, deg, rev/min, %%, or 1",
                       unit);
    return ST_OK;
}

/* Power of the radian in a unit: the unit library counts it for nothing. */
static int power_of_angle(const ut_unit *unit)
{
    char text[UNIT_TEXT_SIZE] = "";
    int n = ut_format(unit, text, sizeof text - 1, UT_ASCII | UT_DEFINITION);
    if (n < 0 || n >= UNIT_TEXT_SIZE - 1)
        return 0;
    const char *s = strstr(text, "rad");
    if (s == NULL)
        return 0;
    s += strlen("rad");
    return *s == '-' || isdigit((unsigned char)*s) ? (int)strtol(s, NULL, 10)
                                                   : 1;
}

static status kinds_differ(const char *from, const char *to, struct err *err)
{
    const char *hint = "";
    if (strcmp(from, "kN") == 0)
        hint = " (kn is the knot, kN the kilonewton)";
    else if (strcmp(from, "mg") == 0)
        hint = " (mgn is a thousandth of standard gravity)";
    else if (strcmp(from, "Hz") == 0 || strcmp(to, "Hz") == 0)
        hint = " (rev/min and rad/s turn, Hz counts)";
    return err_set(err, ST_SCHEMA,
                   "the unit \"%.64s\" is of another kind than \"%.64s\"; "
                   "give one that converts to %.64s%s",
                   from, to, to, hint);
}

/* Slope and offset from a converter; false if it is no straight line. */
static bool line_of(const cv_converter *c, double *scale, double *shift)
{
    const double far = 1048576;
    double zero = cv_convert_double(c, 0), one = cv_convert_double(c, 1);
    double end = cv_convert_double(c, far);
    *shift = zero;
    *scale = zero == 0 ? one : (end - zero) / far;
    double wanted = zero + *scale;
    return isfinite(zero) && isfinite(*scale) && *scale != 0 &&
           fabs(one - wanted) <= 1e-9 * (fabs(one) + fabs(zero));
}

status quantity_convert(struct quantity_units *u, const char *from,
                        const char *to, double *scale, double *shift,
                        struct err *err)
{
    ut_unit *a = NULL, *b = NULL;
    cv_converter *c = NULL;
    *scale = 1;
    *shift = 0;
    status st = parse_unit(u, from, &a, err);
    if (st == ST_OK)
        st = parse_unit(u, to, &b, err);
    if (st != ST_OK || strcmp(from, to) == 0)
        goto out;
    if (ut_are_convertible(a, b) && power_of_angle(a) == power_of_angle(b))
        c = ut_get_converter(a, b);
    if (c == NULL || !line_of(c, scale, shift))
        st = kinds_differ(from, to, err);
out:
    cv_free(c);
    ut_free(b);
    ut_free(a);
    return st;
}

/* Length of the number that the text begins with, 0 if none. */
static size_t number_len(const char *s)
{
    size_t n = *s == '-' || *s == '+', digits = n;
    n += strspn(s + n, "0123456789");
    digits = n - digits;
    if (digits > 0 && s[n] == '.') {
        size_t decimals = strspn(s + n + 1, "0123456789");
        n += decimals > 0 ? 1 + decimals : 0;
    }
    if (digits > 0 && (s[n] == 'e' || s[n] == 'E')) {
        size_t sign = s[n + 1] == '-' || s[n + 1] == '+';
        size_t power = strspn(s + n + 1 + sign, "0123456789");
        n += power > 0 ? 1 + sign + power : 0;
    }
    return digits > 0 ? n : 0;
}

bool quantity_split(const char *text, double *value, const char **unit)
{
    const char *s = text + strspn(text, " \t");
    size_t n = number_len(s);
    size_t plus = n > 0 && *s == '+';
    if (n == 0 || !wire_parse_number(s + plus, n - plus, value))
        return false;
    *unit = s + n + strspn(s + n, " \t");
    return true;
}

status quantity_parse(struct quantity_units *u, const char *text,
                      const char *to, enum quantity_role role, double *value,
                      struct err *err)
{
    const char *unit;
    double scale, shift;
    if (!quantity_split(text, value, &unit))
        return err_set(err, ST_SCHEMA,
                       "\"%.64s\" is not a number with a unit; write it like "
                       "\"1.5 %.32s\"",
                       text, to);
    if (unit[0] == '\0')
        return ST_OK;
    status st = quantity_convert(u, unit, to, &scale, &shift, err);
    if (st == ST_OK)
        *value = *value * scale + (role == QUANTITY_POINT ? shift : 0);
    return st;
}

/* "m/s2" ends with a power of seconds: how many bytes come before "/s", and
 * the power. */
static int power_of_seconds(const char *unit, size_t *before)
{
    size_t n = strlen(unit);
    int power = 1;
    *before = n;
    if (n > 0 && isdigit((unsigned char)unit[n - 1]))
        power = unit[--n] - '0';
    if (n < 3 || unit[n - 1] != 's' || unit[n - 2] != '/')
        return 0;
    *before = n - 2;
    return power;
}

void quantity_derivative_unit(const char *unit, int times, char *out,
                              size_t size)
{
    size_t before;
    int power = power_of_seconds(unit, &before) + times;
    if (times <= 0)
        snprintf(out, size, "%s", unit);
    else if (power == 1)
        snprintf(out, size, "%.*s/s", (int)before, unit);
    else
        snprintf(out, size, "%.*s/s%d", (int)before, unit, power);
}

status quantity_time_ns(struct quantity_units *u, const char *text, int64_t *ns,
                        struct err *err)
{
    double s;
    status st = quantity_parse(u, text, "s", QUANTITY_DIFFERENCE, &s, err);
    if (st != ST_OK)
        return st;
    if (!(fabs(s) < 4e9))
        return err_set(err, ST_SCHEMA,
                       "%.64s is longer than 4e9 s; give a shorter time", text);
    *ns = llround(s * 1e9);
    return ST_OK;
}
