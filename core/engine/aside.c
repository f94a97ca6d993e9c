/* A sensor that the gate refuses while others are believed is set aside: said,
 * scored, tried again with every measurement, never followed.  Recovery of a
 * track whose every measurement is refused is track_lay.c's. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/engine_state.h"

static void set_aside(struct engine *e, struct track *t, struct watch *w,
                      const struct step *s, bool is_aside)
{
    w->is_aside = is_aside;
    w->refused = w->agreed = 0;
    t->n_aside += is_aside ? 1 : -1;
    speak_event(e, is_aside ? EVENT_SET_ASIDE : EVENT_TAKEN_BACK, t, s->sensor,
                s->t_ns);
}

void aside_weigh(struct engine *e, struct track *t, const struct step *s)
{
    struct watch *w = &t->watch[e->local[s->sensor]];
    const struct rig_kind *kind = t->kind;
    if (s->flags & STEP_ACCEPTED) {
        w->refused = 0;
        if (w->is_aside && ++w->agreed >= kind->recover_refused)
            set_aside(e, t, w, s, false);
        return;
    }
    w->agreed = 0;
    if (w->refused == 0)
        w->refused_since_ns = s->t_ns;
    if (w->refused < UINT16_MAX)
        w->refused++;
    bool others_believed = s->refused < w->refused;
    if (!w->is_aside && others_believed &&
        w->refused >= kind->recover_refused &&
        s->t_ns - w->refused_since_ns >= kind->recover_for_ns)
        set_aside(e, t, w, s, true);
}
