/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/instant.h"

#include <time.h>

#include "core/wire/decode.h"

int64_t instant_now_ns(void)
{
    struct timespec now;
    clock_gettime(CLOCK_REALTIME, &now);
    return (int64_t)now.tv_sec * 1000000000 + now.tv_nsec;
}

/* Appends the digits at *i to *value; false when there is none or int64 is
 * left. */
static bool take_digits(const char *text, size_t len, size_t *i, int64_t *value)
{
    size_t first = *i;
    for (; *i < len && text[*i] >= '0' && text[*i] <= '9'; (*i)++)
        if (__builtin_mul_overflow(*value, 10, value) ||
            __builtin_add_overflow(*value, text[*i] - '0', value))
            return false;
    return *i > first;
}

bool instant_parse_ns(const char *text, size_t len, int64_t *t_ns)
{
    size_t i = len > 0 && text[0] == '-';
    int64_t value = 0;
    if (!take_digits(text, len, &i, &value) || i != len)
        return false;
    *t_ns = text[0] == '-' ? -value : value;
    return true;
}

/* Up to nine decimals count; more must be digits, and are cut. */
static bool take_decimals(const char *text, size_t len, size_t *i,
                          int64_t *value)
{
    int n = 0;
    for (; *i < len && text[*i] >= '0' && text[*i] <= '9'; (*i)++, n++)
        if (n < 9 && (__builtin_mul_overflow(*value, 10, value) ||
                      __builtin_add_overflow(*value, text[*i] - '0', value)))
            return false;
    for (int k = n; k < 9; k++)
        if (__builtin_mul_overflow(*value, 10, value))
            return false;
    return n > 0;
}

bool instant_parse(const char *text, size_t len, int64_t *t_ns)
{
    if (wire_parse_time(text, len, t_ns))
        return true;
    bool is_negative = len > 0 && text[0] == '-';
    size_t i = is_negative;
    int64_t value = 0;
    if (!take_digits(text, len, &i, &value))
        return false;
    if (i < len && text[i] == '.') {
        i++;
        if (!take_decimals(text, len, &i, &value))
            return false;
    } else if (__builtin_mul_overflow(value, 1000000000, &value)) {
        return false;
    }
    *t_ns = is_negative ? -value : value;
    return i == len;
}
