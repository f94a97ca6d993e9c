/* Messages: what the engine says, and the verdicts that stand in them. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/engine_state.h"

/* Verdicts of a coasting track need a prediction; ten a second are enough. */
#define COASTING_EVERY_NS 100000000

static void head_of(struct message *head, enum message_type type, size_t bytes,
                    const struct track *t)
{
    head->bytes = (uint32_t)((bytes + 7) / 8 * 8);
    head->type = (uint16_t)type;
    head->kind = t ? (uint16_t)t->kind_index : 0xffff;
    memset(head->track, 0, sizeof head->track);
    if (t)
        memcpy(head->track, t->id, sizeof head->track);
}

/* --- events ----------------------------------------------------------------
 */

static struct event event_of(enum event_kind kind, const struct track *t,
                             int sensor, int64_t t_ns)
{
    struct event ev;
    memset(&ev, 0, sizeof ev);
    head_of(&ev.head, MESSAGE_EVENT, sizeof ev, t);
    ev.t_ns = t_ns;
    ev.event = (uint8_t)kind;
    ev.sensor = (int16_t)sensor;
    return ev;
}

void speak_event(struct engine *e, enum event_kind kind, const struct track *t,
                 int sensor, int64_t t_ns)
{
    struct event ev = event_of(kind, t, sensor, t_ns);
    e->sink.say(e->sink.ctx, &ev.head);
}

static void speak_verdict(struct engine *e, const struct track *t,
                          const struct judged *was)
{
    struct event ev = event_of(EVENT_VERDICT, t, -1, e->now_ns);
    ev.verdict = t->live.verdict;
    ev.was = was->verdict;
    ev.n_why = t->live.n_why;
    memcpy(ev.why, t->live.why, sizeof ev.why);
    e->sink.say(e->sink.ctx, &ev.head);
}

static void put_text(char *to, size_t size, const struct text *text)
{
    size_t len = text->len < 0 ? 0 : (size_t)text->len;
    if (len > size - 1)
        len = size - 1;
    if (len > 0)
        memcpy(to, text->at, len);
    /* A character of several bytes is kept whole or left out. */
    while (len > 0 && len < (size_t)text->len &&
           ((unsigned char)text->at[len] & 0xc0) == 0x80)
        to[--len] = 0;
}

void speak_mark(struct engine *e, const struct measurement *m, int64_t t_ns)
{
    struct event ev = event_of(EVENT_MARK, NULL, -1, t_ns);
    ev.mark = (uint8_t)m->mark;
    put_text(ev.head.track, sizeof ev.head.track, &m->track);
    put_text(ev.name, sizeof ev.name, &m->name);
    put_text(ev.note, sizeof ev.note, &m->note);
    e->sink.say(e->sink.ctx, &ev.head);
}

/* --- live verdict ----------------------------------------------------------
 */

/* What is heard of a track's sensors, by arrival. */
struct hearing {
    int64_t quiet_ns; /* since a measurement was used                      */
    bool is_coasting; /* all silent, or heard without a reading            */
    bool has_changed; /* one fell silent just now                          */
};

/* Only ticks find silence, so that it does not depend on who else sends. */
static struct hearing hear(struct engine *e, struct track *t, bool is_tick)
{
    int n;
    const int16_t *sensor = engine_sensors(e, t, &n);
    struct hearing h = {e->now_ns - t->used_ns, false, false};
    int64_t slowest_ns = 0;
    int n_silent = 0;
    for (int i = 0; i < n; i++) {
        struct watch *w = &t->watch[i];
        int64_t since = e->now_ns - w->heard_ns;
        if (is_tick && !w->is_silent &&
            since > e->rig->sensor[sensor[i]].silent_after_ns) {
            w->is_silent = h.has_changed = true;
            t->n_silent++;
            speak_event(e, EVENT_SILENT, t, sensor[i], e->now_ns);
        }
        e->silent[i] = w->is_silent;
        e->aside[i] = w->is_aside;
        n_silent += w->is_silent;
        int64_t after_ns = e->rig->sensor[sensor[i]].silent_after_ns;
        slowest_ns = after_ns > slowest_ns ? after_ns : slowest_ns;
    }
    const struct track_state *tip = track_tip(t);
    h.is_coasting =
        n_silent == n || (tip && tip->refused == 0 && h.quiet_ns > slowest_ns);
    return h;
}

/* Good without reservation, and nothing that could change that. */
static bool is_plainly_good(const struct track *t, const struct track_state *st)
{
    return t->n_silent == 0 && t->n_aside == 0 &&
           t->live.verdict == VERDICT_GOOD && t->live.n_why == 0 &&
           !t->kind->has_limits && st->refused == 0 && st->kf.n_free == 0;
}

void speak_judge_live(struct engine *e, struct track *t, bool is_tick)
{
    const struct track_state *newest = track_tip(t);
    if (!is_tick && newest && is_plainly_good(t, newest))
        return;
    int n;
    const int16_t *sensor = engine_sensors(e, t, &n);
    struct hearing h = hear(e, t, is_tick);
    const struct track_state *tip = newest;
    bool is_coasting = h.is_coasting;
    if (!tip || (is_tick && !h.has_changed && !is_coasting))
        return;
    const struct step *last =
        t->n_laid > 0 ? track_step(t, t->n_laid - 1) : NULL;
    struct verdict_input in = {&tip->kf,
                               sensor,
                               e->silent,
                               e->aside,
                               n,
                               is_coasting,
                               h.quiet_ns,
                               tip->refused,
                               last ? last->sensor : (int16_t)-1};
    if (is_coasting && e->now_ns > tip->kf.t_ns) {
        if (!h.has_changed && e->now_ns % COASTING_EVERY_NS != 0)
            return;
        kf_predict(t->kind, e->work, &tip->kf, e->now_ns, &e->ahead->kf);
        in.kf = &e->ahead->kf;
    }
    struct judged was = t->live;
    verdict_judge(t->kind, &in, &t->live);
    if (t->n_live > 0 && !verdict_equal(&was, &t->live))
        speak_verdict(e, t, &was);
}

/* --- estimates -------------------------------------------------------------
 */

static bool is_wanted(const struct engine *e, enum stream stream)
{
    return !e->sink.wants || e->sink.wants[stream];
}

static struct estimate *estimate_of(struct engine *e, const struct track *t,
                                    const struct kf *kf, const struct step *s,
                                    const struct judged *j)
{
    struct estimate *m = e->estimate;
    size_t n = (size_t)kf->n;
    head_of(&m->head, MESSAGE_ESTIMATE,
            sizeof *m + (n + UD_SIZE(n)) * sizeof(double), t);
    m->t_ns = kf->t_ns;
    m->arrived_ns = 0;
    m->rerun = 0;
    m->undetermined = kf->n_free > 0 ? kf_undetermined(kf) : 0;
    m->sensor = s->sensor;
    m->nis = s->nis;
    m->dof = s->dof;
    m->accepted = s->flags & STEP_ACCEPTED;
    m->verdict = j->verdict;
    m->n_why = j->n_why;
    memcpy(m->why, j->why, sizeof m->why);
    m->n_states = (uint8_t)n;
    memcpy(m->v, kf->v, (n + UD_SIZE(n)) * sizeof(double));
    return m;
}

void speak_live(struct engine *e, struct track *t, int n_laid_again)
{
    const struct track_state *tip = track_tip(t);
    const struct step *s = track_step(t, t->n_laid - 1);
    if (t->n_live == 0 && t->kind->is_prefix)
        speak_event(e, EVENT_TRACK, t, -1, e->now_ns);
    if (tip->refused == 0)
        t->used_ns = e->now_ns;
    speak_judge_live(e, t, false);
    t->n_live++;
    if (!is_wanted(e, STREAM_LIVE))
        return;
    struct estimate *m = estimate_of(e, t, &tip->kf, s, &t->live);
    m->stream = STREAM_LIVE;
    m->n = t->n_live;
    m->arrived_ns = e->now_ns;
    m->rerun = (uint32_t)n_laid_again;
    e->sink.say(e->sink.ctx, &m->head);
}

/* What happened at this step is final now. */
static void speak_incidents(struct engine *e, struct track *t,
                            const struct step *s)
{
    if (s->flags & STEP_WIDENED)
        speak_event(e, EVENT_WIDENED, t, s->sensor, s->t_ns);
    if (s->flags & STEP_RESTARTED)
        speak_event(e, EVENT_RESTART, t, s->sensor, s->t_ns);
    if (s->refused == VERDICT_REFUSED)
        speak_event(e, EVENT_REFUSALS, t, s->sensor, s->t_ns);
}

/* The verdict at the step's own time, from stamps up to it alone. */
static void judge_settled(struct engine *e, struct track *t,
                          const struct step *s, const struct track_state *st)
{
    int n;
    const int16_t *sensor = engine_sensors(e, t, &n);
    for (int i = 0; i < n; i++) {
        int64_t t_ns = t->watch[i].settled_t_ns;
        int64_t after = e->rig->sensor[sensor[i]].silent_after_ns;
        e->silent[i] = t_ns == INT64_MIN || s->t_ns - t_ns >= after;
        e->aside[i] = t->watch[i].is_aside;
    }
    struct verdict_input in = {&st->kf, sensor, e->silent,   e->aside, n,
                               false,   0,      st->refused, s->sensor};
    verdict_judge(t->kind, &in, &t->settled);
}

void speak_settled(struct engine *e, struct track *t, struct step *s,
                   const struct track_state *st)
{
    bool is_told = is_wanted(e, STREAM_SETTLED);
    if (s->flags & (STEP_BIRTH | STEP_RESTARTED))
        t->settled.is_started = false;
    if (s->flags & STEP_BIRTH)
        t->n_final = 0;
    t->n_final++;
    if (is_told || !t->settled.is_started)
        judge_settled(e, t, s, st);
    if (s->flags & ~(STEP_ACCEPTED | STEP_BIRTH) || s->refused > 0)
        speak_incidents(e, t, s);
    if (!is_told)
        return;
    struct estimate *m = estimate_of(e, t, &st->kf, s, &t->settled);
    m->stream = STREAM_SETTLED;
    m->n = t->n_final;
    e->sink.say(e->sink.ctx, &m->head);
}
