/* chi2.h - the chi-square distribution, for gates and consistency bounds.
 *
 * [NIST-EHB] 1.3.6.7.4 prints the table that the tests hold it against.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_CHI2_H
#define CORE_MATH_CHI2_H

/* P(X <= x), 0 < dof <= 1e10 (else NaN); 0 for x <= 0.  Relative error below
 * 1e-11; the work grows like the square root of dof. */
double chi2_cdf(double x, double dof);

/* The x with P(X <= x) = p, 0 < p < 1, 0 < dof <= 1e10.  Relative error below
 * 1e-10; NaN outside. */
double chi2_quantile(double p, double dof);

/* ln Gamma(x) for x > 0, 1e-13 relative (absolute near its zeros 1 and 2). */
double chi2_ln_gamma(double x);

#endif
