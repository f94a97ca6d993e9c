/* RFC 3339 times and the civil calendar. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/decode.h"
#include "core/wire/encode.h"

#define SECOND_NS 1000000000

static bool two(const char *s, int *v)
{
    if (s[0] < '0' || s[0] > '9' || s[1] < '0' || s[1] > '9')
        return false;
    *v = (s[0] - '0') * 10 + (s[1] - '0');
    return true;
}

/* Days from 1970-01-01 to a date of the Gregorian calendar. */
static int64_t days_from_civil(int y, int m, int d)
{
    y -= m <= 2;
    int era = y / 400, year = y - era * 400;
    int day = (153 * (m + (m > 2 ? -3 : 9)) + 2) / 5 + d - 1;
    int in_era = year * 365 + year / 4 - year / 100 + day;
    return (int64_t)era * 146097 + in_era - 719468;
}

static int month_days(int y, int m)
{
    static const int days[] = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
    bool is_leap = (y % 4 == 0 && y % 100 != 0) || y % 400 == 0;
    return days[m - 1] + (m == 2 && is_leap);
}

/* Z or +hh:mm at s, the end of the text; seconds east of UTC. */
static bool offset(const char *s, size_t len, int *east_s)
{
    int h, m;
    *east_s = 0;
    if (len == 1)
        return s[0] == 'Z' || s[0] == 'z';
    if (len != 6 || (s[0] != '+' && s[0] != '-') || s[3] != ':' ||
        !two(s + 1, &h) || !two(s + 4, &m) || h > 23 || m > 59)
        return false;
    *east_s = (h * 3600 + m * 60) * (s[0] == '-' ? -1 : 1);
    return true;
}

bool wire_parse_time(const char *s, size_t len, int64_t *t_ns)
{
    int century, year, month, day, h, m, second, east_s;
    if (len < 20 || len > 35 || s[4] != '-' || s[7] != '-' ||
        (s[10] != 'T' && s[10] != 't' && s[10] != ' ') || s[13] != ':' ||
        s[16] != ':')
        return false;
    if (!two(s, &century) || !two(s + 2, &year) || !two(s + 5, &month) ||
        !two(s + 8, &day) || !two(s + 11, &h) || !two(s + 14, &m) ||
        !two(s + 17, &second))
        return false;
    year += 100 * century;
    if (year < 1678 || year > 2261 || month < 1 || month > 12 || day < 1 ||
        day > month_days(year, month) || h > 23 || m > 59 || second > 60)
        return false;
    size_t at = 19;
    int64_t ns = 0;
    if (s[at] == '.') {
        int64_t unit = SECOND_NS / 10;
        for (at++; at < len && s[at] >= '0' && s[at] <= '9'; at++) {
            if (unit == 0)
                return false; /* more than 9 decimals */
            ns += (s[at] - '0') * unit;
            unit /= 10;
        }
        if (unit == SECOND_NS / 10)
            return false;
    }
    if (!offset(s + at, len - at, &east_s))
        return false;
    int64_t seconds = days_from_civil(year, month, day) * 86400 + h * 3600 +
                      m * 60 + second - east_s;
    *t_ns = seconds * SECOND_NS + ns;
    return true;
}
