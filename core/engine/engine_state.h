/* engine_state.h - what the engine's own files share; nobody else's. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_ENGINE_STATE_H
#define CORE_ENGINE_ENGINE_STATE_H

#include "core/engine/due.h"
#include "core/engine/engine.h"
#include "core/engine/roster.h"
#include "core/engine/verdict.h"

/* Numbers seen from one sensor's `seq`, for loss and conflicts. */
struct seq_window {
    bool has_any;
    uint64_t first; /* nothing before it was counted as lost          */
    uint64_t greatest;
    uint64_t seen; /* bit k: greatest - k was seen                    */
};

struct engine {
    const struct rig *rig;
    struct message_sink sink;
    int64_t now_ns, line_start_ns;
    struct roster roster;
    struct due due;
    struct counts *counts;
    struct kf_work *work;
    struct track_state *ahead; /* a state predicted to now, for coasting   */
    uint64_t steps;
    const char *refusal;

    int16_t *local;   /* by sensor: its number within its track          */
    int16_t *of_kind; /* sensors in order of kind                        */
    int first_of_kind[RIG_KINDS_MAX + 1];
    bool *silent, *aside;   /* scratch of one judgement                    */
    struct seq_window *seq; /* by sensor                                   */
    struct sensor_summary *summary; /* scratch, by sensor                  */
    int32_t *quota; /* by sensor: pending measurements per track       */
    double *budget; /* by sensor: re-run steps left in this second     */

    int32_t *touched; /* places with something new in this datagram      */
    int n_touched;
    struct step *incoming; /* scratch of one measurement                   */
    struct estimate *estimate; /* scratch of one message                   */
};

/* Sensors of a track: numbers and how many. */
static inline const int16_t *engine_sensors(const struct engine *e,
                                            const struct track *t, int *n)
{
    int k = t->kind_index;
    *n = e->first_of_kind[k + 1] - e->first_of_kind[k];
    return e->of_kind + e->first_of_kind[k];
}

/* intake.c: when the track has to be looked at next. */
void intake_schedule(struct engine *e, struct track *t);

/* speak.c */
void speak_live(struct engine *e, struct track *t, int n_laid_again);
void speak_settled(struct engine *e, struct track *t, struct step *s,
                   const struct track_state *st);
void speak_event(struct engine *e, enum event_kind kind, const struct track *t,
                 int sensor, int64_t t_ns);
void speak_mark(struct engine *e, const struct measurement *m, int64_t t_ns);

/* aside.c: a settled step's part in whether its sensor is set aside. */
void aside_weigh(struct engine *e, struct track *t, const struct step *s);

/* Silence and verdict as of now; says what changed. */
void speak_judge_live(struct engine *e, struct track *t, bool is_tick);

#endif
