/* real.h - elementary functions that give the same bits everywhere.
 *
 * A libm's exp, log, sin, cos and atan2 differ between processors and
 * versions; an estimate that is recorded today must be found again bit for
 * bit tomorrow.  These are built from +, -, *, / and comparisons only, and
 * need neither FMA nor a rounding mode other than nearest-even.
 *
 * Accuracy (tested against MPFR-grade values): within 1 ulp, except where a
 * function's comment says more.  No errno, no exceptions, no globals.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_REAL_H
#define CORE_MATH_REAL_H

#include <stdbool.h>

#define REAL_PI     3.14159265358979323846
#define REAL_TWO_PI 6.28318530717958647692
#define REAL_LN_2   0.693147180559945309417
#define REAL_LN_2PI 1.83787706640934548356

bool real_is_finite(double x);
double real_abs(double x);
double real_floor(double x);
double real_nan(void);

static inline double real_infinity(void)
{
    return __builtin_inf();
}

/* e^x; 0 below -745.13, +inf above 709.78. */
double real_exp(double x);

/* e^x - 1 without cancellation near 0. */
double real_expm1(double x);

/* Natural logarithm; -inf at 0, NaN below 0. */
double real_log(double x);

/* Radians; |x| up to 1e9 keeps 1e-15 absolute, NaN beyond and for inf. */
double real_sin(double x);
double real_cos(double x);

/* The angle of (x, y) in (-pi, pi]; atan2(0, 0) = 0.  A zero's sign is not
 * looked at; infinities give the limits along the axes or diagonals. */
double real_atan2(double y, double x);

/* The same angle in (-REAL_PI, REAL_PI]; what rounds to -pi becomes pi.  Beyond
 * 1e9, where an angle has no meaning left, still in range, but modulo the
 * double nearest to 2 pi.  NaN for NaN and inf. */
double real_wrap(double x);

/* x^p for whole p >= 0; within p ulp. */
double real_pow_int(double x, int p);

#endif
