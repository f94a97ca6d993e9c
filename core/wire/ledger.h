/* ledger.h - the two ledgers as counts, summary and status show them. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_LEDGER_H
#define CORE_WIRE_LEDGER_H

#include "core/wire/writer.h"

/* The keys `datagrams` and `measurements`, into the map that is open. */
void ledger_write(struct writer *w, const struct rig *rig,
                  const struct counts *c);

#endif
