/* number.c - doubles and times to text.
 *
 * The shortest digits inside the interval of numbers that round to x are
 * found by Giulietti's method ("The Schubfach way to render doubles"): three
 * products with a 126-bit power of ten, rounded to odd, decide exactly what
 * would otherwise need integers of 1100 bits.  Of two shortest candidates
 * the closer one to x is taken, of two equally close ones the even.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/encode.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#include "core/wire/pow10_table.h"

static_assert(sizeof(double) == sizeof(uint64_t), "needs IEEE binary64");

enum {
    DIGITS_MAX = 20, /* of a uint64_t                                    */
    FIXED_MAX = 21,  /* more places before the point: exponent           */
    FIXED_ZEROS = 5  /* more zeros after the point: exponent             */
};

/* digits * 10^exponent, without sign; digits != 0. */
struct decimal {
    uint64_t digits;
    int exponent;
};

/* --- digits ----------------------------------------------------------------
 */

/* floor(log2(10^k)), |k| <= 1233. */
static int log2_of_pow10(int k)
{
    return (k * 1741647) >> 19;
}

/* floor(log10(2^q)), or of 3/4 2^q, |q| <= 1500. */
static int log10_of_pow2(int q, bool three_quarters)
{
    return (q * 1262611 - (three_quarters ? 524031 : 0)) >> 22;
}

/* floor(g c / 2^128) with its last bit set if anything was cut off. */
static uint64_t product_to_odd(const uint64_t g[2], uint64_t c)
{
    unsigned __int128 low = (unsigned __int128)g[1] * c;
    unsigned __int128 y = (unsigned __int128)g[0] * c + (uint64_t)(low >> 64);
    return (uint64_t)(y >> 64) | ((uint64_t)y > 1);
}

/* c 2^q, c > 0, to the shortest decimal.  is_power: c is the smallest of its
 * binade, so the number below is only half as far away. */
static struct decimal shortest(uint64_t c, int q, bool is_power)
{
    int k = log10_of_pow2(q, is_power);
    int h = q + log2_of_pow10(-k) + 1; /* 1..4                            */
    const uint64_t *g = &pow10_table[2 * (-k - POW10_MIN)];
    uint64_t open = c & 1; /* an odd c does not own its interval's ends   */

    /* Four times x and the ends of its interval, in units of 10^k. */
    uint64_t x = product_to_odd(g, (4 * c) << h);
    uint64_t low = product_to_odd(g, (4 * c - 2 + is_power) << h) + open;
    uint64_t high = product_to_odd(g, (4 * c + 2) << h) - open;

    uint64_t s = x / 4;
    if (s >= 10) { /* one digit less?                                     */
        uint64_t tens = s / 10;
        bool down = low <= 40 * tens, up = 40 * tens + 40 <= high;
        if (down != up)
            return (struct decimal){tens + up, k + 1};
    }
    bool down = low <= 4 * s, up = 4 * s + 4 <= high;
    if (down == up) /* both or neither: the closer one                    */
        up = x > 4 * s + 2 || (x == 4 * s + 2 && (s & 1));
    return (struct decimal){s + up, k};
}

static struct decimal without_zeros(struct decimal d)
{
    while (d.digits % 100000000 == 0)
        d = (struct decimal){d.digits / 100000000, d.exponent + 8};
    if (d.digits % 10000 == 0)
        d = (struct decimal){d.digits / 10000, d.exponent + 4};
    if (d.digits % 100 == 0)
        d = (struct decimal){d.digits / 100, d.exponent + 2};
    if (d.digits % 10 == 0)
        d = (struct decimal){d.digits / 10, d.exponent + 1};
    return d;
}

/* The bits of a finite x > 0. */
static struct decimal decimal_of(uint64_t bits)
{
    uint64_t fraction = bits & 0xfffffffffffff;
    int biased = (int)(bits >> 52 & 0x7ff);
    if (biased == 0)
        return without_zeros(shortest(fraction, -1074, false));

    uint64_t c = fraction | (uint64_t)1 << 52;
    int q = biased - 1075;
    if (q <= 0 && q > -53 && (c & (((uint64_t)1 << -q) - 1)) == 0)
        return without_zeros((struct decimal){c >> -q, 0}); /* an integer */
    return without_zeros(shortest(c, q, fraction == 0 && biased > 1));
}

/* --- layout ----------------------------------------------------------------
 */

static char *two_digits_before(char *end, uint32_t v)
{
    static const char pairs[] = "0001020304050607080910111213141516171819"
                                "2021222324252627282930313233343536373839"
                                "4041424344454647484950515253545556575859"
                                "6061626364656667686970717273747576777879"
                                "8081828384858687888990919293949596979899";
    return memcpy(end - 2, pairs + 2 * (size_t)v, 2);
}

static char *eight_digits_before(char *end, uint32_t v)
{
    uint32_t high = v / 10000, low = v % 10000;
    two_digits_before(end, low % 100);
    two_digits_before(end - 2, low / 100);
    two_digits_before(end - 4, high % 100);
    return two_digits_before(end - 6, high / 100);
}

/* The digits of v > 0, ending at `end`; returns where they begin. */
static char *digits_before(char *end, uint64_t v)
{
    for (; v >= 100000000; v /= 100000000)
        end = eight_digits_before(end, (uint32_t)(v % 100000000));
    uint32_t rest = (uint32_t)v;
    for (; rest >= 100; rest /= 100)
        end = two_digits_before(end, rest % 100);
    if (rest >= 10)
        return two_digits_before(end, rest);
    if (rest > 0)
        *--end = (char)('0' + rest);
    return end;
}

static char *put(char *to, const char *from, int n)
{
    memcpy(to, from, (size_t)n);
    return to + n;
}

static char *put_zeros(char *to, int n)
{
    memset(to, '0', (size_t)n);
    return to + n;
}

/* d.ddde+xx */
static char *put_scientific(char *p, const char *digits, int n, int exponent)
{
    *p++ = digits[0];
    if (n > 1) {
        *p++ = '.';
        p = put(p, digits + 1, n - 1);
    }
    *p++ = 'e';
    *p++ = exponent < 0 ? '-' : '+';
    uint32_t e = (uint32_t)(exponent < 0 ? -exponent : exponent);
    char text[4];
    const char *first = digits_before(text + 4, e);
    return put(p, first, (int)(text + 4 - first));
}

/* `point` digits stand before the decimal point. */
static char *put_number(char *p, const char *digits, int n, int point)
{
    if (point > FIXED_MAX || point < -FIXED_ZEROS)
        return put_scientific(p, digits, n, point - 1);
    if (point >= n)
        return put_zeros(put(p, digits, n), point - n);
    if (point > 0) {
        p = put(p, digits, point);
        *p++ = '.';
        return put(p, digits + point, n - point);
    }
    p = put(p, "0.", 2);
    return put(put_zeros(p, -point), digits, n);
}

size_t wire_print_number(double x, char *buf)
{
    if (!isfinite(x)) {
        memcpy(buf, "null", 5);
        return 4;
    }
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    char *p = buf;
    if (bits >> 63)
        *p++ = '-';
    bits &= ~((uint64_t)1 << 63);
    if (bits == 0) {
        *p++ = '0';
    } else {
        struct decimal d = decimal_of(bits);
        char text[DIGITS_MAX];
        char *end = text + DIGITS_MAX;
        const char *first = digits_before(end, d.digits);
        int n = (int)(end - first);
        p = put_number(p, first, n, n + d.exponent);
    }
    *p = '\0';
    return (size_t)(p - buf);
}

/* --- times -----------------------------------------------------------------
 */

/* Days since 1970-01-01 to the Gregorian date, in eras of 400 years that
 * begin on 1 March, so that the leap day is the last of its year. */
static void date_of_days(int32_t days, int32_t *year, int32_t *month,
                         int32_t *day)
{
    int32_t shifted = days + 719468; /* since 0000-03-01                  */
    int32_t era = (shifted >= 0 ? shifted : shifted - 146096) / 146097;
    int32_t of_era = shifted - era * 146097;
    int32_t year_of_era =
        (of_era - of_era / 1460 + of_era / 36524 - of_era / 146096) / 365;
    int32_t of_year =
        of_era - (365 * year_of_era + year_of_era / 4 - year_of_era / 100);
    int32_t from_march = (5 * of_year + 2) / 153;
    *day = of_year - (153 * from_march + 2) / 5 + 1;
    *month = from_march < 10 ? from_march + 3 : from_march - 9;
    *year = year_of_era + era * 400 + (*month <= 2);
}

size_t wire_print_time(int64_t t_ns, char *buf)
{
    int64_t seconds = t_ns / 1000000000, ns = t_ns % 1000000000;
    if (ns < 0) {
        ns += 1000000000;
        seconds--;
    }
    int64_t days = seconds / 86400, of_day = seconds % 86400;
    if (of_day < 0) {
        of_day += 86400;
        days--;
    }
    int32_t year, month, day;
    date_of_days((int32_t)days, &year, &month, &day); /* 1677..2262       */

    memcpy(buf, "0000-00-00T00:00:00.000000000Z", 31);
    two_digits_before(buf + 2, (uint32_t)year / 100);
    two_digits_before(buf + 4, (uint32_t)year % 100);
    two_digits_before(buf + 7, (uint32_t)month);
    two_digits_before(buf + 10, (uint32_t)day);
    two_digits_before(buf + 13, (uint32_t)(of_day / 3600));
    two_digits_before(buf + 16, (uint32_t)(of_day / 60 % 60));
    two_digits_before(buf + 19, (uint32_t)(of_day % 60));
    eight_digits_before(buf + 29, (uint32_t)(ns % 100000000));
    buf[20] = (char)('0' + ns / 100000000);
    return 30;
}
