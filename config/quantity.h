/* quantity.h - numbers with units.
 *
 * Units go through UDUNITS-2 after our alias table (deg, gn, rev/min, kn, MiB
 * and others that it refuses or misreads).  "g", "C" and "F" are refused with
 * a hint.  Angle, ratio, count, frequency and angular rate are different
 * kinds although all are dimensionless or 1/s to a unit library.
 *
 * A setting is a *point* (z, mean, span) or a *difference* (u, limit, q):
 * points convert by slope and offset, differences by slope only, or 0.25 degC
 * would become 273.4 K.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_QUANTITY_H
#define CONFIG_QUANTITY_H

#include <stddef.h>
#include <stdbool.h>
#include <stdint.h>

#include "config/err.h"

struct quantity_units; /* the unit system; one per process is enough */

struct quantity_units *quantity_units_new(struct err *err);
void quantity_units_free(struct quantity_units *u);

enum quantity_role { QUANTITY_POINT, QUANTITY_DIFFERENCE };

/* value_in_to = value_in_from * scale + shift.  ST_SCHEMA with a remedy when
 * a unit is unknown or the kinds differ. */
status quantity_convert(struct quantity_units *u, const char *from,
                        const char *to, double *scale, double *shift,
                        struct err *err) MUST_USE;

/* "0.25 degC", "3 %", "-1.5e3 m/s2" in the unit `to`.  A bare number is
 * taken as already in `to`. */
status quantity_parse(struct quantity_units *u, const char *text,
                      const char *to, enum quantity_role role, double *value,
                      struct err *err) MUST_USE;

/* Splits "12.5 mm" into 12.5 and "mm"; false if it does not begin with a
 * finite number. */
bool quantity_split(const char *text, double *value, const char **unit);

/* unit (*) by 1/s^times, as text ("m" and 2 give "m/s2"): the unit of a
 * derivative.  Same with a numerator exponent for densities q. */
void quantity_derivative_unit(const char *unit, int times, char *out,
                              size_t size);

/* A duration ("12 ms", 0.5 = seconds) to whole ns. */
status quantity_time_ns(struct quantity_units *u, const char *text, int64_t *ns,
                        struct err *err) MUST_USE;

#endif
