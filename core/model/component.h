/* component.h - blocks that couple are discretised together.
 *
 * A block without a closed form, and every block that a coupling joins to
 * another, becomes part of a component: one system A, W, c over its states.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MODEL_COMPONENT_H
#define CORE_MODEL_COMPONENT_H

#include "core/model/rig.h"

/* Fills n_components, component, system and each block's is_joined from the
 * blocks, couplings and own matrices of the kind. */
void component_build(struct rig_kind *kind);

/* A, W and c of a component. */
static inline const double *component_A(const struct rig_kind *kind, int i)
{
    return kind->system + kind->component[i].at;
}
static inline const double *component_W(const struct rig_kind *kind, int i)
{
    int n = kind->component[i].n;
    return component_A(kind, i) + n * n;
}
static inline const double *component_c(const struct rig_kind *kind, int i)
{
    int n = kind->component[i].n;
    return component_W(kind, i) + n * n;
}

#endif
