/* SPDX-License-Identifier: Apache-2.0 */
#include <stdlib.h>
#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode.h"

enum { TOKEN_MAX = 400 };

/* Powers of ten that a double holds exactly. */
static const double exact_ten[] = {
    1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,  1e8,  1e9,  1e10, 1e11,
    1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

/* [-]digits[.digits][e[+-]digits] as mantissa and power of ten; false when
 * it has another shape or more digits than a double's integers. */
static bool split(const char *s, const char *end, uint64_t *mantissa, int *ten)
{
    int n = 0, after_point = 0, exponent = 0;
    bool is_past_point = false, has_digit = false;
    *mantissa = 0;
    for (; s < end && *s != 'e' && *s != 'E'; s++) {
        if (*s == '.' && !is_past_point) {
            is_past_point = true;
            continue;
        }
        if (*s < '0' || *s > '9')
            return false;
        has_digit = true;
        *mantissa = *mantissa * 10 + (uint64_t)(*s - '0');
        n += *mantissa > 0;
        after_point += is_past_point;
        if (n > 18)
            return false;
    }
    if (!has_digit)
        return false;
    if (s < end) {
        bool is_negative = ++s < end && *s == '-';
        s += s < end && (*s == '-' || *s == '+');
        if (s == end || end - s > 4)
            return false;
        for (; s < end; s++) {
            if (*s < '0' || *s > '9')
                return false;
            exponent = exponent * 10 + (*s - '0');
        }
        exponent = is_negative ? -exponent : exponent;
    }
    *ten = exponent - after_point;
    return true;
}

/* One rounding only, hence correct: the mantissa and the power are exact. */
static bool fast(const char *s, const char *end, double *value)
{
    uint64_t mantissa;
    int ten;
    bool is_negative = s < end && *s == '-';
    if (!split(s + is_negative, end, &mantissa, &ten) ||
        mantissa > (uint64_t)1 << 53 || ten < -22 || ten > 22)
        return false;
    double v = (double)mantissa;
    v = ten < 0 ? v / exact_ten[-ten] : v * exact_ten[ten];
    *value = is_negative ? -v : v;
    return true;
}

static bool is_number_letter(char c)
{
    return (c >= '0' && c <= '9') || c == '.' || c == '-' || c == '+' ||
           c == 'e' || c == 'E';
}

bool wire_parse_number(const char *s, size_t len, double *value)
{
    char token[TOKEN_MAX + 1];
    if (len == 0 || len > TOKEN_MAX)
        return false;
    if (fast(s, s + len, value))
        return true;
    /* strtod takes more than numbers: hexadecimal, inf, nan, blanks. */
    for (size_t i = 0; i < len; i++)
        if (!is_number_letter(s[i]))
            return false;
    memcpy(token, s, len);
    token[len] = 0;
    char *end;
    double v = strtod(token, &end);
    if (end != token + len || !real_is_finite(v))
        return false;
    *value = v;
    return true;
}
