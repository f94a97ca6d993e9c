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

static double value(const struct reads_term *t, const double *x)
{
    return t->state < 0 ? t->value : x[t->state];
}

/* h = d . v / r,  dh/dp = (v - h d / r) / r,  dh/dv = d / r. */
static double range_rate(const struct reads_row *row, const double *x,
                         double *H)
{
    double d[3], square = 0, dot = 0;
    int n = row->n_terms;
    for (int k = 0; k < n; k++) {
        d[k] = coordinate(row, k, x);
        square += d[k] * d[k];
        dot += d[k] * value(&row->term[n + k], x);
    }
    double r = sqrt(square);
    if (!(r > 0))
        return 0;
    double h = dot / r;
    for (int k = 0; k < n; k++) {
        derive(row, k, (value(&row->term[n + k], x) - h * d[k] / r) / r, H);
        derive(row, n + k, d[k] / r, H);
    }
    return h;
}

static double product(const struct reads_row *row, const double *x, double *H)
{
    double h = 1;
    for (int k = 0; k < row->n_terms; k++) {
        double others = 1;
        for (int j = 0; j < row->n_terms; j++)
            if (j != k)
                others *= value(&row->term[j], x);
        derive(row, k, others, H);
        h *= value(&row->term[k], x);
    }
    return h;
}

static double polynomial(const struct reads_row *row, const double *x,
                         double *H)
{
    double s = value(&row->term[0], x), h = 0, slope = 0, power = 1;
    for (int k = row->n_terms - 1; k >= 1; k--) { /* Horner */
        slope = slope * s + h;
        h = h * s + value(&row->term[k], x);
    }
    derive(row, 0, slope, H);
    for (int k = 1; k < row->n_terms; k++, power *= s)
        derive(row, k, power, H);
    return h;
}

static double core(const struct reads_row *row, const double *x, double *H)
{
    switch (row->kind) {
    case READS_LINEAR:
        return linear(row, x, H);
    case READS_RANGE:
        return range(row, x, H);
    case READS_BEARING:
        return bearing(row, x, H);
    case READS_RANGE_RATE:
        return range_rate(row, x, H);
    case READS_PRODUCT:
        return product(row, x, H);
    case READS_POLYNOMIAL:
        return polynomial(row, x, H);
    }
    return 0;
}

double reads_row_at(const struct reads *r, int i, int n, const double *x,
                    double *H)
{
    const struct reads_row *row = &r->row[i];
    const struct reads_error *e = &row->error;
    memset(H, 0, (size_t)n * sizeof *H);
    double h = core(row, x, H);
    if (!e->has_any)
        return h;
    double scale = e->factor * (e->scale < 0 ? 1 : x[e->scale]);
    for (int k = 0; k < n; k++)
        H[k] *= scale;
    if (e->scale >= 0)
        H[e->scale] += e->factor * h;
    h = scale * h + e->constant;
    for (int k = 0; k < e->n_added; k++) {
        H[e->added[k]] += 1;
        h += x[e->added[k]];
    }
    return h;
}

double reads_difference(const struct reads *r, int i, double z, double h)
{
    return reads_wraps(r, i) ? real_wrap(z - h) : z - h;
}
