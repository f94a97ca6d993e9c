/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/rig_text.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "core/math/real.h"

/* Appends to `out`, cut at size. */
static void append(char *out, size_t size, const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));

static void append(char *out, size_t size, const char *fmt, ...)
{
    size_t len = strlen(out);
    va_list list;
    va_start(list, fmt);
    vsnprintf(out + len, size - len, fmt, list);
    va_end(list);
}

const char *rig_text_model(enum block_model model)
{
    switch (model) {
    case BLOCK_CONSTANT:
        return "constant";
    case BLOCK_RANDOM_WALK:
        return "random-walk";
    case BLOCK_GAUSS_MARKOV:
        return "gauss-markov";
    case BLOCK_CONSTANT_VELOCITY:
        return "constant-velocity";
    case BLOCK_CONSTANT_ACCELERATION:
        return "constant-acceleration";
    case BLOCK_OSCILLATOR:
        return "oscillator";
    case BLOCK_SINGER:
        return "singer";
    case BLOCK_LINEAR:
        return "linear";
    case BLOCK_LAG:
        return "lag";
    }
    return "";
}

/* Powers of the second in the unit of q; 0 for no noise. */
static int q_seconds(enum block_model model)
{
    switch (model) {
    case BLOCK_CONSTANT:
    case BLOCK_LINEAR: /* a matrix of them */
    case BLOCK_LAG:
        return 0;
    case BLOCK_RANDOM_WALK:
    case BLOCK_GAUSS_MARKOV:
        return 1;
    case BLOCK_CONSTANT_VELOCITY:
    case BLOCK_OSCILLATOR:
        return 3;
    case BLOCK_CONSTANT_ACCELERATION:
    case BLOCK_SINGER:
        return 5;
    }
    return 0;
}

static bool is_plain_unit(const char *unit)
{
    return strpbrk(unit, "/ .*^()-0123456789") == NULL;
}

/* unit^power / s^seconds */
static void unit_over_seconds(const char *unit, int power, int seconds,
                              char *out, size_t size)
{
    char top[RIG_UNIT_SIZE + 8];
    if (strcmp(unit, "1") == 0)
        snprintf(top, sizeof top, "1");
    else if (power == 1)
        snprintf(top, sizeof top, is_plain_unit(unit) ? "%s" : "(%s)", unit);
    else
        snprintf(top, sizeof top, is_plain_unit(unit) ? "%s%d" : "(%s)%d", unit,
                 power);
    if (seconds == 1)
        snprintf(out, size, "%s/s", top);
    else
        snprintf(out, size, "%s/s%d", top, seconds);
}

void rig_text_q_unit(enum block_model model, const char *unit, char *out,
                     size_t size)
{
    int seconds = q_seconds(model);
    out[0] = '\0';
    if (seconds > 0)
        unit_over_seconds(unit, 2, seconds, out, size);
}

void rig_text_unmodelled(const struct rig_kind *kind, const struct block *b,
                         char *out, size_t size)
{
    static const char *const words[] = {"", "rate", "acceleration", "jerk"};
    const char *unit = kind->state[b->at].unit;
    char text[RIG_UNIT_SIZE + 16];
    int order = (q_seconds(b->model) + 1) / 2; /* 1, 2, 3 */
    out[0] = '\0';
    if (order == 0)
        return;
    if (b->model == BLOCK_GAUSS_MARKOV) {
        double u = sqrt(b->q * b->tau_s / 2); /* u^2 = q tau / 2 */
        snprintf(out, size, "u = %g %s, correlated over tau = %g s", u, unit,
                 b->tau_s);
        return;
    }
    unit_over_seconds(unit, 1, order, text, sizeof text);
    snprintf(out, size, "an unmodelled %s of %.3g %s that lasts 1 s",
             words[order], sqrt(b->q), text); /* a^2 lasts = q */
}

static void append_linear(const struct rig_kind *kind,
                          const struct reads_row *row, char *out, size_t size)
{
    for (int k = 0; k < row->n_terms; k++) {
        double value = row->term[k].value;
        if (k > 0)
            append(out, size, value < 0 ? " - " : " + ");
        else if (value < 0)
            append(out, size, "-");
        if (fabs(value) < 1 || fabs(value) > 1)
            append(out, size, "%g ", fabs(value));
        append(out, size, "%s", kind->state[row->term[k].state].name);
    }
}

static void append_place(const struct rig_kind *kind,
                         const struct reads_row *row, char *out, size_t size)
{
    append(out, size, "(");
    for (int k = 0; k < row->n_terms; k++) {
        append(out, size, k > 0 ? ", " : "");
        if (row->term[k].state < 0)
            append(out, size, "%g", row->term[k].value);
        else
            append(out, size, "%s", kind->state[row->term[k].state].name);
    }
    append(out, size, ") from (");
    for (int k = 0; k < row->n_terms; k++)
        append(out, size, "%s%g", k > 0 ? ", " : "", row->from[k]);
    append(out, size, ")");
}

static void append_list(const struct rig_kind *kind,
                        const struct reads_row *row, int from,
                        const char *between, char *out, size_t size)
{
    for (int k = from; k < row->n_terms; k++) {
        append(out, size, "%s", k > from ? between : "");
        if (row->term[k].state < 0)
            append(out, size, "%g", row->term[k].value);
        else
            append(out, size, "%s", kind->state[row->term[k].state].name);
    }
}

static void append_error(const struct rig_kind *kind,
                         const struct reads_error *e, char *out, size_t size)
{
    if (!e->has_any)
        return;
    if (e->scale >= 0)
        append(out, size, ", times %s", kind->state[e->scale].name);
    if (e->factor < 1 || e->factor > 1)
        append(out, size, ", times %g", e->factor);
    for (int k = 0; k < e->n_added; k++)
        append(out, size, " + %s", kind->state[e->added[k]].name);
    if (e->constant < 0 || e->constant > 0)
        append(out, size, " %+g", e->constant);
}

void rig_text_reads(const struct rig_kind *kind, const struct reads *reads,
                    int i, char *out, size_t size)
{
    const struct reads_row *row = &reads->row[i];
    out[0] = '\0';
    switch (row->kind) {
    case READS_LINEAR:
        append_linear(kind, row, out, size);
        break;
    case READS_RANGE:
        append(out, size, "range ");
        append_place(kind, row, out, size);
        break;
    case READS_BEARING:
        append(out, size, "bearing ");
        append_place(kind, row, out, size);
        append(out, size, ", zero at %g deg, turning %s",
               row->zero_rad * 180 / REAL_PI, row->turn < 0 ? "right" : "left");
        break;
    case READS_RANGE_RATE:
        append(out, size, "range-rate ");
        append_place(kind, row, out, size);
        break;
    case READS_PRODUCT:
        append_list(kind, row, 0, " * ", out, size);
        break;
    case READS_POLYNOMIAL:
        append(out, size, "polynomial of %s, coefficients ",
               kind->state[row->term[0].state].name);
        append_list(kind, row, 1, ", ", out, size);
        break;
    }
    append_error(kind, &row->error, out, size);
}

bool rig_text_is_of_sensor(const struct rig_kind *kind, const struct block *b)
{
    return strchr(kind->state[b->at].name, '.') != NULL;
}

double rig_text_u(const struct rig_sensor *sensor, int i)
{
    return sqrt(sensor->r[i]) / fabs(sensor->scale[i]);
}

void rig_text_time(int64_t t_ns, char *out, size_t size)
{
    double t_s = (double)t_ns * 1e-9;
    if (t_s < 1e-3 && t_s > 0)
        snprintf(out, size, "%g us", t_s * 1e6);
    else if (t_s < 1)
        snprintf(out, size, "%g ms", t_s * 1e3);
    else
        snprintf(out, size, "%g s", t_s);
}

void rig_text_bytes(double bytes, char *out, size_t size)
{
    static const char *const units[] = {"bytes", "KiB", "MiB", "GiB", "TiB"};
    int i = 0;
    for (; bytes >= 1024 && i < 4; i++)
        bytes /= 1024;
    snprintf(out, size, "%.3g %s", bytes, units[i]);
}

double rig_text_burst_s(const struct rig *rig, int kind)
{
    double rate_hz = 0, for_s = (double)rig->kind[kind].recover_for_ns * 1e-9;
    for (int i = 0; i < rig->n_sensors; i++)
        if (rig->sensor[i].kind == kind)
            rate_hz += rig->sensor[i].rate_hz;
    double row_s =
        rate_hz > 0 ? (rig->kind[kind].recover_refused - 1) / rate_hz : 0;
    return row_s > for_s ? row_s : for_s;
}
