/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/chi2.h"

#include <math.h>
#include <stdbool.h>

#include "core/math/real.h"

/* X with dof degrees of freedom is twice a gamma variable of shape a = dof/2:
 * P(X <= 2y) = P(a, y) and P(X > 2y) = Q(a, y), the regularised incomplete
 * gamma functions.  Everything is kept as logarithms: far tails do not
 * underflow, and ln P and ln Q are concave in ln y, so Newton cannot stray.
 * Sources: [DLMF] chapters 5 and 8; [WH31] for the first guess. */

static const double dof_max = 1e10; /* bounds the work: terms ~ 6 sqrt(dof) */
static const double tiny = 1e-300;

/* ln Gamma(x) - ((x - 1/2) ln x - x + ln(2 pi)/2) for x >= 10,
 * [DLMF] 5.11.1: sum of B_2k / (2k (2k - 1) x^(2k-1)). */
static double stirling_rest(double x)
{
    double y = 1 / x, z = y * y;
    double sum = -691.0 / 360360 + z * (1.0 / 156);
    sum = 1.0 / 1188 + z * sum;
    sum = -1.0 / 1680 + z * sum;
    sum = 1.0 / 1260 + z * sum;
    sum = -1.0 / 360 + z * sum;
    return y * (1.0 / 12 + z * sum);
}

double chi2_ln_gamma(double x)
{
    if (!(x > 0))
        return real_nan();
    if (!real_is_finite(x))
        return x;
    double product = 1;
    for (; x < 10; x += 1)
        product *= x; /* Gamma(x) = Gamma(x + n) / product */
    return (x - 0.5) * (real_log(x) - 1) + (0.5 * REAL_LN_2PI - 0.5) +
           stirling_rest(x) - real_log(product);
}

/* m - ln(1 + m) for 1 + m = y / a, without cancellation near 0: with
 * s = m / (2 + m), ln(1 + m) = 2 (s + s^3/3 + s^5/5 ...) and m - 2s = m s. */
static double excess(double a, double y)
{
    double m = (y - a) / a;
    if (m < -0.5 || m > 1)
        return m - real_log(y / a);
    double s = m / (2 + m), z = s * s, power = 1, sum = 0;
    for (int k = 3; k < 45; k += 2) {
        sum += power / k;
        power *= z;
    }
    return m * s - 2 * s * z * sum;
}

/* ln(y^a e^-y / Gamma(a)).  For great a the terms are far greater than their
 * sum, therefore as -a excess + ln(a / 2 pi)/2 - rest(a). */
static double ln_density(double a, double y)
{
    if (a < 10)
        return a * real_log(y) - y - chi2_ln_gamma(a);
    return -a * excess(a, y) + 0.5 * (real_log(a) - REAL_LN_2PI) -
           stirling_rest(a);
}

/* P(a, y) = density sum_n y^n / (a (a + 1) ... (a + n)), [DLMF] 8.11.4;
 * y < a + 1. */
static double ln_lower_series(double a, double y)
{
    double term = 1, sum = 1;
    for (double n = 1; term > 1e-17 * sum; n += 1) {
        term *= y / (a + n);
        sum += term;
    }
    return ln_density(a, y) + real_log(sum / a);
}

/* Q(a, y) = density / (y + 1 - a - 1 (1 - a) / (y + 3 - a - ...)),
 * [DLMF] 8.9.2 in even form, by Lentz's rule; y >= a + 1. */
static double ln_upper_fraction(double a, double y)
{
    double b = y + 1 - a, c = 1 / tiny, d = 1 / b, h = d;
    for (double n = 1; n < 1e6; n += 1) {
        double numerator = n * (a - n);
        b += 2;
        d = numerator * d + b;
        if (real_abs(d) < tiny)
            d = tiny;
        d = 1 / d;
        c = b + numerator / c;
        if (real_abs(c) < tiny)
            c = tiny;
        double change = c * d;
        h *= change;
        if (real_abs(change - 1) < 1e-16)
            break;
    }
    return ln_density(a, y) + real_log(h);
}

/* ln(1 - e^u), u < 0. */
static double ln_complement(double u)
{
    return u > -0.69 ? real_log(-real_expm1(u)) : real_log(1 - real_exp(u));
}

/* ln P(a, y), or ln Q(a, y) if upper. */
static double ln_tail(double a, double y, bool upper)
{
    bool is_low = y < a + 1;
    double u = is_low ? ln_lower_series(a, y) : ln_upper_fraction(a, y);
    return is_low == upper ? ln_complement(u) : u;
}

double chi2_cdf(double x, double dof)
{
    if (!(dof > 0 && dof <= dof_max) || x != x)
        return real_nan();
    double a = 0.5 * dof, y = 0.5 * x;
    if (y <= 0)
        return 0;
    if (y < a + 1)
        return real_exp(ln_lower_series(a, y));
    if (y > 2 * a + 1000)
        return 1;
    return -real_expm1(ln_upper_fraction(a, y));
}

/* A standard normal quantile good to 4.5e-4, [HAS55] sheet 68: lower tail of
 * probability p <= 1/2. */
static double normal_guess(double p)
{
    double t = sqrt(-2 * real_log(p));
    double top = 2.515517 + t * (0.802853 + t * 0.010328);
    double below = 1 + t * (1.432788 + t * (0.189269 + t * 0.001308));
    return top / below - t;
}

/* [WH31]: (X / dof)^(1/3) is nearly normal. */
static double first_guess(double p, double q, double a)
{
    double z = p < q ? normal_guess(p) : -normal_guess(q);
    double v = 1 / (9 * a), root = 1 - v + z * sqrt(v);
    if (root > 0.1)
        return real_log(a * root * root * root);
    return (real_log(p) + chi2_ln_gamma(a + 1)) / a;
}

double chi2_quantile(double p, double dof)
{
    if (!(p > 0 && p < 1 && dof > 0 && dof <= dof_max))
        return real_nan();
    bool upper = p > 0.5;
    double a = 0.5 * dof, q = 1 - p;
    double target = upper ? real_log(q) : real_log(p);
    /* P = y^a / Gamma(a + 1) (1 - O(y)), also where y underflows. */
    double small = (real_log(p) + chi2_ln_gamma(a + 1)) / a;
    if (small < -40)
        return 2 * real_exp(small);
    double t = first_guess(p, q, a);
    for (int i = 0; i < 60; i++) {
        double y = real_exp(t), tail = ln_tail(a, y, upper);
        double slope = real_exp(ln_density(a, y) - tail);
        double step = (target - tail) / (upper ? -slope : slope);
        if (!(real_abs(step) < 2)) /* also when the slope is 0          */
            step = (target > tail) != upper ? 2 : -2;
        t += step;
        if (real_abs(step) < 1e-12)
            break;
    }
    return 2 * real_exp(t);
}
