/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene_sensor.h"

#include <math.h>
#include <stdio.h>

#include "core/math/real.h"
#include "tools/scene_fault.h"

/* --- geometry ------------------------------------------------------------- */

static double sum(const struct reads_row *row, const double *x)
{
    double z = 0;
    for (int k = row->n_terms - 1; k >= 0; k--)
        z += x[row->term[k].state] * row->term[k].value;
    return z;
}

/* Where the body is, seen from the sensor's place. */
static void look(const struct reads_row *row, const double *x, double to[3])
{
    for (int k = 0; k < 3; k++)
        to[k] = 0;
    for (int k = 0; k < row->n_terms; k++) {
        int state = row->term[k].state;
        to[k] = (state >= 0 ? x[state] : row->term[k].value) - row->from[k];
    }
}

/* In the sensor's own frame: `ahead` is the direction that reads 0, `aside`
 * the one that reads a quarter turn. */
static double bearing(const struct reads_row *row, const double to[3])
{
    double c = real_cos(row->zero_rad), s = real_sin(row->zero_rad);
    double ahead = c * to[0] + s * to[1];
    double aside = row->turn * (c * to[1] - s * to[0]);
    return real_atan2(aside, ahead);
}

static double of(const struct reads_term *term, const double *x)
{
    return term->state >= 0 ? x[term->state] : term->value;
}

/* The part of the motion that points away from the sensor. */
static double receding(const struct reads_row *row, const double *x)
{
    double to[3], along = 0, square = 0;
    look(row, x, to);
    for (int k = 0; k < row->n_terms; k++) {
        along += to[k] * of(&row->term[row->n_terms + k], x);
        square += to[k] * to[k];
    }
    return square > 0 ? along / sqrt(square) : 0;
}

static double multiplied(const struct reads_row *row, const double *x)
{
    double z = 1;
    for (int k = 0; k < row->n_terms; k++)
        z *= of(&row->term[k], x);
    return z;
}

static double powers(const struct reads_row *row, const double *x)
{
    double z = 0, power = 1;
    for (int k = 1; k < row->n_terms; k++) {
        z += power * of(&row->term[k], x);
        power *= of(&row->term[0], x);
    }
    return z;
}

static double without_error(const struct reads_row *row, const double *x)
{
    double to[3];
    switch (row->kind) {
    case READS_LINEAR:
        return sum(row, x);
    case READS_RANGE:
        look(row, x, to);
        return sqrt(to[0] * to[0] + to[1] * to[1] + to[2] * to[2]);
    case READS_BEARING:
        look(row, x, to);
        return bearing(row, to);
    case READS_RANGE_RATE:
        return receding(row, x);
    case READS_PRODUCT:
        return multiplied(row, x);
    case READS_POLYNOMIAL:
        return powers(row, x);
    }
    return 0;
}

double scene_sensor_truth(const struct rig_sensor *sensor, int i,
                          const double *x)
{
    const struct reads_row *row = &sensor->reads.row[i];
    const struct reads_error *e = &row->error;
    double z = without_error(row, x);
    if (!e->has_any)
        return z;
    z *= e->factor * (e->scale >= 0 ? x[e->scale] : 1);
    for (int k = 0; k < e->n_added; k++)
        z += x[e->added[k]];
    return z + e->constant;
}

/* --- sampling ------------------------------------------------------------- */

void scene_sensor_init(struct scene_sensor *p, const struct scene *s,
                       int sensor, int track)
{
    char of[2 * RIG_ID_SIZE + 2];
    struct random first;
    snprintf(of, sizeof of, "%s/%s", s->rig->sensor[sensor].name,
             s->track[track].id);
    *p = (struct scene_sensor){.sensor = sensor, .track = track};
    scene_random(s, "noise", of, &p->noise);
    scene_random(s, "first", of, &first);
    p->first_ns = (int64_t)(random_uniform(&first) * 1e9 /
                            s->rig->sensor[sensor].rate_hz);
}

int64_t scene_sensor_due(const struct scene_sensor *p, const struct scene *s)
{
    double rate_hz = s->rig->sensor[p->sensor].rate_hz;
    return p->first_ns + (int64_t)((double)p->n * 1e9 / rate_hz);
}

/* An angle beyond half a turn is told from the other side. */
static double fold(double angle)
{
    if (angle > REAL_PI)
        return angle - REAL_TWO_PI;
    return angle <= -REAL_PI ? angle + REAL_TWO_PI : angle;
}

bool scene_sensor_sample(struct scene_sensor *p, struct scene *s,
                         struct scene_reading *reading)
{
    const struct rig_sensor *sensor = &s->rig->sensor[p->sensor];
    double x[RIG_STATES_MAX];
    *reading = (struct scene_reading){
        p->sensor, p->track, scene_sensor_due(p, s), {0}};
    p->n++;
    scene_truth(s, p->track, reading->t_ns, x);
    for (int i = 0; i < sensor->reads.m; i++) {
        double truth = scene_sensor_truth(sensor, i, x);
        double part = sensor->relative[i] * (truth - sensor->shift[i]);
        double value =
            truth + sqrt(sensor->r[i] + part * part) * random_normal(&p->noise);
        if (sensor->reads.row[i].kind == READS_BEARING)
            value = fold(value);
        reading->z[i] = (value - sensor->shift[i]) / sensor->scale[i];
    }
    return scene_fault_apply(s, p->sensor, p->track, reading->t_ns, reading->z);
}
