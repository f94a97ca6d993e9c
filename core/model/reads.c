/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/reads.h"

#include <math.h>
#include <string.h>

#include "core/math/real.h"

bool reads_wraps(const struct reads *r, int i)
{
    return r->row[i].kind == READS_BEARING;
}

static double coordinate(const struct reads_row *row, int k, const double *x)
{
    const struct reads_term *t = &row->term[k];
    return (t->state < 0 ? t->value : x[t->state]) - row->from[k];
}

static void derive(const struct reads_row *row, int k, double d, double *H)
{
    if (row->term[k].state >= 0)
        H[row->term[k].state] += d;
}

static double linear(const struct reads_row *row, const double *x, double *H)
{
    double h = 0;
    for (int k = 0; k < row->n_terms; k++) {
        H[row->term[k].state] += row->term[k].value;
        h += row->term[k].value * x[row->term[k].state];
    }
    return h;
}

/* h = |p - p0|,  dh/dp = (p - p0) / h. */
static double range(const struct reads_row *row, const double *x, double *H)
{
    double d[3], square = 0;
    for (int k = 0; k < row->n_terms; k++) {
        d[k] = coordinate(row, k, x);
        square += d[k] * d[k];
    }
    double h = sqrt(square);
    for (int k = 0; k < row->n_terms && h > 0; k++)
        derive(row, k, d[k] / h, H);
    return h;
}

/* h = turn (angle - zero),  dh/dp = turn [-dy dx] / (dx^2 + dy^2). */
static double bearing(const struct reads_row *row, const double *x, double *H)
{
    double dx = coordinate(row, 0, x), dy = coordinate(row, 1, x);
    double square = dx * dx + dy * dy;
    if (square > 0) {
        derive(row, 0, row->turn * -dy / square, H);
        derive(row, 1, row->turn * dx / square, H);
    }
    return real_wrap(row->turn * (real_atan2(dy, dx) - row->zero_rad));
}

double reads_row_at(const struct reads *r, int i, int n, const double *x,
                    double *H)
{
    const struct reads_row *row = &r->row[i];
    memset(H, 0, (size_t)n * sizeof *H);
    switch (row->kind) {
    case READS_LINEAR:
        return linear(row, x, H);
    case READS_RANGE:
        return range(row, x, H);
    case READS_BEARING:
        return bearing(row, x, H);
    }
    return 0;
}

double reads_difference(const struct reads *r, int i, double z, double h)
{
    return reads_wraps(r, i) ? real_wrap(z - h) : z - h;
}
