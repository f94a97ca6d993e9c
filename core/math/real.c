/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/real.h"

#include <assert.h>
#include <float.h>
#include <stdint.h>
#include <string.h>

/* Polynomials and their coefficients are those of [FDLIBM], the freely
 * distributable mathematics library of 1993 (functions exp, expm1, log, sin,
 * cos, atan); code, range reduction and the quotient in atan2 are our own. */

/* Intermediate results must be doubles, or the bits depend on the build. */
static_assert(FLT_EVAL_METHOD == 0, "doubles must be evaluated as doubles");

static const double round_off = 0x1.8p52; /* adding rounds to an integer */
static const double ln2_high = 0x1.62e42feep-1; /* 33 bits: k ln2_high exact */
static const double ln2_low = 0x1.a39ef35793c76p-33;
static const double log2_e = 0x1.71547652b82fep+0;
static const double half_pi = 0x1.921fb54442d18p+0;
static const double half_pi_low = 0x1.1a62633145c07p-54;
static const double infinity = (double)__builtin_inff();

/* Beyond it an argument's own spacing exceeds 1e-7 rad. */
static const double angle_max = 1e9;

static uint64_t bits_of(double x)
{
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    return bits;
}

static double of_bits(uint64_t bits)
{
    double x;
    memcpy(&x, &bits, sizeof x);
    return x;
}

/* 2^k for a normal result, -1022 <= k <= 1023. */
static double power_of_two(int k)
{
    return of_bits((uint64_t)(1023 + k) << 52);
}

/* Nearest whole number, |x| < 2^51. */
static double nearest(double x)
{
    return (x + round_off) - round_off;
}

/* x 2^k, rounded once even where the result is subnormal; -1100 < k <= 1024,
 * 0.5 <= x < 4. */
static double scale(double x, int k)
{
    if (k > 1023)
        return x * 2 * power_of_two(k - 1);
    if (k < -1020)
        return x * power_of_two(k + 200) * 0x1p-200;
    return x * power_of_two(k);
}

bool real_is_finite(double x)
{
    return (bits_of(x) >> 52 & 0x7ff) != 0x7ff;
}

double real_abs(double x)
{
    return of_bits(bits_of(x) & ~((uint64_t)1 << 63));
}

double real_floor(double x)
{
    if (!(real_abs(x) < 0x1p52))
        return x;
    double whole = (double)(int64_t)x;
    return whole > x ? whole - 1 : whole;
}

double real_nan(void)
{
    return of_bits((uint64_t)0x7ff8 << 48);
}

/* e^x = 2^k e^r with |r| <= ln 2 / 2, and e^r = 1 + 2r / (R - r) with an even
 * function R(r) = r coth(r / 2), [FDLIBM] e_exp. */
double real_exp(double x)
{
    if (!(x <= 0x1.62e42fefa39efp+9))
        return x > 0 ? infinity : real_nan();
    if (x < -0x1.74910d52d3052p+9)
        return 0;
    double k = nearest(x * log2_e);
    double high = x - k * ln2_high, low = k * ln2_low;
    double r = high - low, t = r * r, tt = t * t;
    double P = 1.66666666666666019037e-01 - 2.77777777770155933842e-03 * t;
    P += tt * (6.61375632143793436117e-05 - 1.65339022054652515390e-06 * t +
               4.13813679705723846039e-08 * tt);
    double c = r - t * P;
    double y = 1 + ((r * c / (2 - c) - low) + high); /* e^r */
    return scale(y, (int)k);
}

/* [FDLIBM] s_expm1: the way back from e^r - 1 to 2^k e^r - 1 depends on which
 * of the two is the greater. */
static double expm1_back(double x, double e, int k)
{
    if (k == -1)
        return 0.5 * (x - e) - 0.5;
    if (k == 1)
        return x < -0.25 ? -2 * (e - (x + 0.5)) : 1 + 2 * (x - e);
    if (k <= -2 || k > 56)
        return scale(1 - (e - x), k) - 1;
    double inverse = power_of_two(-k);
    if (k < 20)
        return ((1 - inverse) - (e - x)) * power_of_two(k);
    return ((x - (e + inverse)) + 1) * power_of_two(k);
}

double real_expm1(double x)
{
    if (!(x <= 0x1.62e42fefa39efp+9))
        return x > 0 ? infinity : real_nan();
    if (x < -40)
        return -1;
    if (real_abs(x) < 0x1p-54)
        return x;
    double k = nearest(x * log2_e);
    double high = x - k * ln2_high, low = k * ln2_low;
    double r = high - low, c = (high - r) - low;
    double half = 0.5 * r, s = r * half, ss = s * s;
    double Q = 1 + s * -3.33333333333331316428e-02;
    Q += ss *
         (1.58730158725481460165e-03 + s * -7.93650757867487942473e-05 +
          ss * (4.00821782732936239552e-06 + s * -2.01099218183624371326e-07));
    double t = 3 - Q * half;
    double e = s * ((Q - t) / (6 - r * t));
    if (k == 0)
        return r - (r * e - s);
    e = (r * (e - c) - c) - s;
    return expm1_back(r, e, (int)k);
}

/* x = 2^k (1 + f) with 1 + f in [sqrt(1/2), sqrt(2)); log(1 + f) by an odd
 * series in s = f / (2 + f), [FDLIBM] e_log. */
double real_log(double x)
{
    if (!(x > 0))
        return x == 0 ? -infinity : real_nan();
    if (x > DBL_MAX)
        return x;
    int k = 0;
    if (x < DBL_MIN) {
        x *= 0x1p54;
        k = -54;
    }
    const uint64_t root_half = 0x3fe6a09e667f3bcd;
    uint64_t above = bits_of(x) - root_half;
    k += (int)((int64_t)above >> 52);
    double f = of_bits((above & 0xfffffffffffff) + root_half) - 1;
    double half = 0.5 * f * f, s = f / (2 + f), z = s * s, w = z * z;
    double even =
        w * (3.999999999940941908e-01 +
             w * (2.222219843214978396e-01 + w * 1.531383769920937332e-01));
    double odd = 6.666666666666735130e-01 + w * 2.857142874366239149e-01;
    odd += w * w * (1.818357216161805012e-01 + w * 1.479819860511658591e-01);
    double R = even + z * odd, n = k;
    return n * ln2_high - ((half - (s * (half + R) + n * ln2_low)) - f);
}

/* sin(x + y) for |x| <= pi/4 and y below half an ulp of it, [FDLIBM] k_sin. */
static double sin_near(double x, double y)
{
    double z = x * x, w = z * z, v = z * x;
    double r =
        8.33333333332248946124e-03 +
        z * (-1.98412698298579493134e-04 + z * 2.75573137070700676789e-06);
    r += z * w * (-2.50507602534068634195e-08 + z * 1.58969099521155010221e-10);
    return x - ((z * (0.5 * y - v * r) - y) - v * -1.66666666666666324348e-01);
}

/* cos(x + y) likewise, [FDLIBM] k_cos. */
static double cos_near(double x, double y)
{
    double z = x * x, w = z * z;
    double r =
        z * (4.16666666666666019037e-02 + z * (-1.38888888888741095749e-03 +
                                               z * 2.48015872894767294178e-05));
    r += w * w *
         (-2.75573143513906633035e-07 +
          z * (2.08757232129817482790e-09 + z * -1.13596475577881948265e-11));
    double half = 0.5 * z, main = 1 - half;
    return main + (((1 - main) - half) + (z * r - x * y));
}

/* high + low = x - n pi/2, for whole |n| < 2^30 and a result below 4.
 *
 * pi/2 is cut into pieces of 23 bits, so that n times a piece is exact
 * (Cody and Waite); two of them leave x - n (p1 + p2) without rounding.  The
 * rest in one double is enough unless the difference is small: then two more
 * pieces, their rounding errors carried along.  The worst argument up to 1e9
 * leaves 2^-60.5; 145 bits of pi/2 keep more than 60 of those. */
static void reduce(double x, double n, double *high, double *low)
{
    double r = (x - n * 0x1.921fb4p+0) - n * 0x1.4442dp-24;
    double w = n * 0x1.8469898cc5170p-48;
    double y = r - w;
    *high = y;
    *low = (r - y) - w;
    if (real_abs(y) > 0x1p-8)
        return;
    double b = n * 0x1.84698p-48, s = r - b, t = s - r;
    double error = (r - (s - t)) - (b + t); /* r - b = s + error     */
    double c = n * 0x1.3198ap-69, u = s - c, v = u - s;
    error += (s - (u - v)) - (c + v); /* s - c = u + error     */
    error -= n * 0x1.701b839a25205p-92;
    *high = u + error;
    *low = (u - *high) + error;
}

/* cos(x) is sin in the next quadrant. */
static double sin_in(int quadrant, double high, double low)
{
    double y = quadrant & 1 ? cos_near(high, low) : sin_near(high, low);
    return quadrant & 2 ? -y : y;
}

double real_sin(double x)
{
    if (real_abs(x) <= half_pi / 2)
        return sin_near(x, 0);
    if (!(real_abs(x) <= angle_max))
        return real_nan();
    double n = nearest(x * 0x1.45f306dc9c883p-1), high, low;
    reduce(x, n, &high, &low);
    return sin_in((int)n, high, low);
}

double real_cos(double x)
{
    if (real_abs(x) <= half_pi / 2)
        return cos_near(x, 0);
    if (!(real_abs(x) <= angle_max))
        return real_nan();
    double n = nearest(x * 0x1.45f306dc9c883p-1), high, low;
    reduce(x, n, &high, &low);
    return sin_in((int)n + 1, high, low);
}

/* t - atan(t) for |t| < 7/16, [FDLIBM] s_atan. */
static double atan_rest(double t)
{
    double z = t * t, w = z * z;
    double odd = 3.33333333333329318027e-01 +
                 w * (1.42857142725034663711e-01 +
                      w * (9.09088713343650656196e-02 +
                           w * (6.66107313738753120669e-02 +
                                w * (4.97687799461593236017e-02 +
                                     w * 1.62858201153657823623e-02))));
    double even = -1.99999999998764832476e-01 +
                  w * (-1.11111104054623557880e-01 +
                       w * (-7.69187620504482999495e-02 +
                            w * (-5.83357013379057348645e-02 +
                                 w * -3.65315727442169155270e-02)));
    return t * (z * odd + w * even);
}

/* The upper 26 bits: products of two such are exact. */
static double upper(double x)
{
    return of_bits(bits_of(x) & ~(uint64_t)0x7ffffff);
}

/* high + low = atan(y / x) for 2^-60 < y / x < 2^60, x and y in the middle of
 * the exponents' range.  As [FDLIBM] s_atan, but the new argument is formed
 * from y and x, and where atan(t) is near t the rounding of t = y / x, which
 * would show, is put back. */
static double atan_of(double y, double x, double *low)
{
    double base, base_low, t;
    if (y < 0.4375 * x) {
        t = y / x;
        double t1 = upper(t), t2 = t - t1, x1 = upper(x), x2 = x - x1;
        double left = (((y - t1 * x1) - t1 * x2) - t2 * x1) - t2 * x2;
        *low = left / (x * (1 + t * t)) - atan_rest(t);
        return t;
    }
    if (y < 0.6875 * x) {
        t = (2 * y - x) / (2 * x + y); /* from atan(1/2)        */
        base = 0x1.dac670561bb4fp-2;
        base_low = 0x1.a2b7f222f65e2p-56;
    } else if (y < 1.1875 * x) {
        t = (y - x) / (x + y); /* from atan(1)          */
        base = half_pi / 2;
        base_low = half_pi_low / 2;
    } else if (y < 2.4375 * x) {
        t = (y - 1.5 * x) / (x + 1.5 * y); /* from atan(3/2)        */
        base = 0x1.f730bd281f69bp-1;
        base_low = 0x1.007887af0cbbdp-56;
    } else {
        t = -x / y; /* from atan(inf)        */
        base = half_pi;
        base_low = half_pi_low;
    }
    double sum = base + t;
    *low = ((base - sum) + t) + (base_low - atan_rest(t));
    return sum;
}

/* Both at least 0, at least one finite and above 0. */
static double angle_of(double y, double x, bool is_left)
{
    double low = 0, angle;
    if (y <= x * 0x1p-60) {
        if (!is_left)
            return y / x;
        angle = 0;
    } else if (x <= y * 0x1p-60) {
        return half_pi;
    } else {
        double far = x > y ? x : y;
        double unit = far > 0x1p500 ? 0x1p-500 : far < 0x1p-500 ? 0x1p500 : 1;
        angle = atan_of(y * unit, x * unit, &low);
    }
    if (!is_left)
        return angle + low;
    double sum = 2 * half_pi - angle;
    low = ((2 * half_pi - sum) - angle) + (2 * half_pi_low - low);
    return sum + low;
}

double real_atan2(double y, double x)
{
    if (!(y == y && x == x))
        return real_nan();
    bool is_left = x < 0;
    double dy = real_abs(y), dx = real_abs(x);
    if (dy > DBL_MAX && dx > DBL_MAX)
        dy = dx = 1;
    if (dy == 0)
        return is_left ? 2 * half_pi : 0;
    double angle = angle_of(dy, dx, is_left);
    return y < 0 ? -angle : angle;
}

double real_wrap(double x)
{
    if (!real_is_finite(x))
        return real_nan();
    /* Modulo the double 2 pi; exact, as half_pi has only 50 bits. */
    while (real_abs(x) > angle_max) {
        int k = (int)(bits_of(x) >> 52 & 0x7ff) - 1023;
        double step = half_pi * power_of_two(k - 1);
        x = x > 0 ? x - step : x + step;
    }
    double n = nearest(x * 0x1.45f306dc9c883p-3), low;
    if (n != 0) {
        double was = x;
        reduce(was, 4 * n, &x, &low); /* x - 2 pi n            */
        if (x > REAL_PI)
            reduce(was, 4 * (n + 1), &x, &low);
        else if (x <= -REAL_PI)
            reduce(was, 4 * (n - 1), &x, &low);
    }
    /* What is left lies within half an ulp of pi. */
    return x > REAL_PI || x <= -REAL_PI ? REAL_PI : x;
}

double real_pow_int(double x, int p)
{
    double y = 1;
    for (; p > 0; p >>= 1) {
        if (p & 1)
            y *= x;
        x *= x;
    }
    return y;
}
