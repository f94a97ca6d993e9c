/* reads.h - what a sensor reads: z = h(x) + v, with H = dh/dx.
 *
 * Every component is one of
 *   linear    sum of coefficient * state  (a state alone: coefficient 1)
 *   range     distance between a point of states or constants and a fixed one,
 *             2 or 3 coordinates
 *   bearing   turn * (angle of (x - x0, y - y0)) - zero, in radians, wrapped;
 *             the angle runs from the first axis towards the second
 *   range-rate  how fast that range grows, from the rates of its coordinates
 *   product   of states and constants
 *   polynomial  c0 + c1 s + c2 s^2 ..., s a state, c states or constants
 * A `range-bearing` sensor is two components.  Units: linear in the unit of
 * the states; range in the unit of its coordinates; bearing in radians.
 *
 * A component may stand behind errors that are states of their own:
 *     h' = factor * x_scale * h(x) + sum of added states + constant.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_READS_H
#define CORE_MODEL_READS_H

#include <stdbool.h>

enum { READS_MAX = 8, READS_TERMS_MAX = 16, READS_ADDED_MAX = 6 };

enum reads_kind {
    READS_LINEAR,
    READS_RANGE,
    READS_BEARING,
    READS_RANGE_RATE,
    READS_PRODUCT,
    READS_POLYNOMIAL
};

struct reads_term {
    int state;    /* index in the layout, -1 for a constant coordinate    */
    double value; /* linear: coefficient; coordinate: the constant        */
};

/* What stands between a component and its reading; has_any false: nothing. */
struct reads_error {
    bool has_any;
    int scale;     /* a state that multiplies, -1 = none                  */
    double factor; /* a fixed one                                         */
    double constant;
    int n_added;
    int added[READS_ADDED_MAX]; /* states that are added                   */
};

struct reads_row {
    enum reads_kind kind;
    int n_terms; /* range 2-3, bearing 2, range-rate as many, their rates
                    behind them                                          */
    struct reads_term term[READS_TERMS_MAX]; /* linear terms, factors,
                    coordinates; of a polynomial first s, then c0 ..     */
    double from[3];                          /* the fixed point           */
    double zero_rad;                         /* bearing: direction that
                                                reads 0, from the first axis
                                                towards the second        */
    double turn; /* bearing: +1 grows from the first axis towards the second,
                    -1 the other way                                      */
    struct reads_error error;
};

struct reads {
    int m; /* components of z                                             */
    struct reads_row row[READS_MAX];
};

static inline bool reads_is_linear(const struct reads *r)
{
    for (int i = 0; i < r->m; i++)
        if (r->row[i].kind != READS_LINEAR || r->row[i].error.has_any)
            return false;
    return true;
}

/* True if an update shall be linearised anew at its result: places seen from
 * afar need it.  Products must not be: their derivative at the result holds
 * the noise of the reading, and a scale that is estimated so drifts up by its
 * u (measured: mean error +0.74 u, 88 % inside 2 u; once linearised at the
 * prediction -0.07 u, 97 %). */
static inline bool reads_iterates(const struct reads *r)
{
    for (int i = 0; i < r->m; i++)
        if (r->row[i].kind == READS_RANGE || r->row[i].kind == READS_BEARING ||
            r->row[i].kind == READS_RANGE_RATE)
            return true;
    return false;
}

/* True if row i reads an angle: its difference is wrapped to (-pi, pi]. */
bool reads_wraps(const struct reads *r, int i);

/* Row i at x (n states): returns h, fills H (n values, zeros included).  At
 * the place of the sensor itself, where a range or bearing has no
 * derivative, H is all zero: such a component says nothing. */
double reads_row_at(const struct reads *r, int i, int n, const double *x,
                    double *H);

/* z - h with angles wrapped. */
double reads_difference(const struct reads *r, int i, double z, double h);

#endif
