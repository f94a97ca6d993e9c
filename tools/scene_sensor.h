/* scene_sensor.h - what a sensor of a rehearsal says about the truth.
 *
 * It samples at its rate, from a moment of its own within the first period;
 * it reads the true states, adds normal noise of its u, and tells the result
 * in its own unit.  The equations are worked out here from geometry and share
 * nothing with core/model/reads.c, which they serve to test.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_SENSOR_H
#define TOOLS_SCENE_SENSOR_H

#include "tools/scene.h"

/* One sensor looking at one track. */
struct scene_sensor {
    int sensor, track;
    int64_t first_ns; /* its first sample                                 */
    uint64_t n;       /* samples taken                                    */
    struct random noise;
};

struct scene_reading {
    int sensor, track;
    int64_t t_ns; /* when it was true                                 */
    double z[READS_MAX];
};

/* What row i of a sensor reads at the states x, without noise: in the unit of
 * its states, bearings in radians within (-pi, pi]. */
double scene_sensor_truth(const struct rig_sensor *sensor, int i,
                          const double *x);

void scene_sensor_init(struct scene_sensor *p, const struct scene *s,
                       int sensor, int track);

/* When its next sample is due. */
int64_t scene_sensor_due(const struct scene_sensor *p, const struct scene *s);

/* Takes the sample that is due; false when the sensor says nothing. */
bool scene_sensor_sample(struct scene_sensor *p, struct scene *s,
                         struct scene_reading *reading);

#endif
