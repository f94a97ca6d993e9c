/* check.h - what one measurement costs on this machine. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_CHECK_H
#define TOOLS_CHECK_H

#include "core/model/rig.h"

/* Seconds of one core per measurement, from feeding a run of this rig with
 * made-up readings for a moment; 0 when that is not possible. */
double check_cost_s(const struct rig *rig);

#endif
