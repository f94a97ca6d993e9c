/* scene_fault.h - what goes wrong in a rehearsal, and when.
 *
 * A fault has a place in time ("at", "for"), a sensor, and optionally one
 * track of a sensor that reads several.  Built: "jump" (added to what the
 * sensor says, one value or one per component) and "silence" (it says
 * nothing; its seq does not count on).
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_FAULT_H
#define TOOLS_SCENE_FAULT_H

#include "tools/scene.h"
#include "tools/scene_text.h"

const char *scene_fault_text(enum scene_fault_kind kind);

/* The list "faults" of the file into *s; complaints go to the reader. */
void scene_fault_load(struct scene_text *r, struct scene *s,
                      const cJSON *faults);

/* Lays the faults of a sensor at t over z, READS_MAX values at most; false
 * when it says nothing then. */
bool scene_fault_apply(const struct scene *s, int sensor, int track,
                       int64_t t_ns, double *z);

#endif
