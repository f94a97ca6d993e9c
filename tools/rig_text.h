/* rig_text.h - a loaded rig in words and units, for people. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_RIG_TEXT_H
#define TOOLS_RIG_TEXT_H

#include <stdbool.h>

#include "core/model/rig.h"

enum { RIG_TEXT_SIZE = 256 };

/* "constant-acceleration" */
const char *rig_text_model(enum block_model model);

/* Unit of a block's q: L2/s, L2/s3, L2/s5 with L the state's unit; "" where
 * the block has no noise. */
void rig_text_q_unit(enum block_model model, const char *unit, char *out,
                     size_t size);

/* What q stands for: "an unmodelled jerk of 0.45 m/s3 that lasts 1 s"; q is
 * its square times how long it lasts.  "" where the block has no noise. */
void rig_text_unmodelled(const struct rig_kind *kind, const struct block *b,
                         char *out, size_t size);

/* What component i of a sensor reads: "x", "2 x + bias", "range (x, y) from
 * (2.58, -0.87)". */
void rig_text_reads(const struct rig_kind *kind, const struct reads *reads,
                    int i, char *out, size_t size);

/* The standard uncertainty of component i in the sensor's own unit. */
double rig_text_u(const struct rig_sensor *sensor, int i);

/* "12 ms", "1.5 s", "2 min" */
void rig_text_time(int64_t t_ns, char *out, size_t size);

/* "1.5 MiB" */
void rig_text_bytes(double bytes, char *out, size_t size);

/* How long every sensor of a track may agree on something false without the
 * track going there: below recover.refused refusals or recover.for it is not
 * widened.  Seconds. */
double rig_text_burst_s(const struct rig *rig, int kind);

/* True for a block that is the error of a sensor: its state is named
 * SENSOR.WHAT, and no block's own name has a dot. */
bool rig_text_is_of_sensor(const struct rig_kind *kind, const struct block *b);

#endif
