/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/engine.h"

#include "core/engine/engine_state.h"
#include "core/filter/joined.h"
#include "core/math/real.h"

/* --- memory ----------------------------------------------------------------
 */

static size_t largest_state(const struct rig *rig)
{
    size_t largest = 0;
    for (int i = 0; i < rig->n_kinds; i++) {
        size_t bytes = track_size(rig, i).state_bytes;
        largest = bytes > largest ? bytes : largest;
    }
    return largest;
}

/* The largest kind with coupled blocks, 0 if there is none. */
static int largest_joined(const struct rig *rig)
{
    int largest = 0;
    for (int i = 0; i < rig->n_kinds; i++)
        if (rig->kind[i].n_components > 0 && rig->kind[i].n > largest)
            largest = rig->kind[i].n;
    return largest;
}

static void lay_out(struct engine *e, struct arena *arena,
                    const struct rig *rig)
{
    size_t n = (size_t)rig->n_sensors;
    e->counts =
        arena_take(arena, sizeof *e->counts + n * sizeof(struct ledger));
    e->work = arena_take(arena, sizeof *e->work);
    int n_joined = largest_joined(rig);
    void *joined =
        n_joined > 0 ? arena_take(arena, joined_bytes(n_joined)) : NULL;
    if (e->work)
        e->work->joined = joined ? joined_init(joined, n_joined) : NULL;
    e->ahead = arena_take(arena, largest_state(rig));
    e->local = arena_take(arena, n * sizeof *e->local);
    e->of_kind = arena_take(arena, n * sizeof *e->of_kind);
    e->silent = arena_take(arena, n * sizeof *e->silent);
    e->aside = arena_take(arena, n * sizeof *e->aside);
    e->seq = arena_take(arena, n * sizeof *e->seq);
    e->summary = arena_take(arena, n * sizeof *e->summary);
    e->quota = arena_take(arena, n * sizeof *e->quota);
    e->budget = arena_take(arena, n * sizeof *e->budget);
    e->incoming =
        arena_take(arena, sizeof *e->incoming + 2 * READS_MAX * sizeof(double));
    e->estimate =
        arena_take(arena, sizeof *e->estimate +
                              (UD_MAX + UD_SIZE(UD_MAX)) * sizeof(double));
    roster_layout(&e->roster, rig, arena);
    size_t places = (size_t)rig->max_tracks + RIG_KINDS_MAX;
    e->touched = arena_take(arena, places * sizeof *e->touched);
    e->due.heap = arena_take(arena, places * sizeof *e->due.heap);
    e->due.at = arena_take(arena, places * sizeof *e->due.at);
    e->due.id = arena_take(arena, places * sizeof *e->due.id);
    e->due.key = arena_take(arena, places * sizeof *e->due.key);
    e->due.time = arena_take(arena, places * sizeof *e->due.time);
}

size_t engine_bytes(const struct rig *rig)
{
    struct arena arena = {NULL, 0};
    struct engine count;
    arena_take(&arena, sizeof count);
    lay_out(&count, &arena, rig);
    return arena.used;
}

static void number_sensors(struct engine *e)
{
    int n = 0;
    for (int k = 0; k < e->rig->n_kinds; k++) {
        e->first_of_kind[k] = n;
        for (int i = 0; i < e->rig->n_sensors; i++) {
            if (e->rig->sensor[i].kind != k)
                continue;
            e->local[i] = (int16_t)(n - e->first_of_kind[k]);
            e->of_kind[n++] = (int16_t)i;
        }
    }
    e->first_of_kind[e->rig->n_kinds] = n;
}

struct engine *engine_init(void *memory, const struct rig *rig,
                           struct message_sink sink)
{
    struct arena arena = {memory, 0};
    struct engine *e = arena_take(&arena, sizeof *e);
    lay_out(e, &arena, rig);
    e->rig = rig;
    e->sink = sink;
    due_init(&e->due, e->roster.n_places);
    for (int i = 0; i < e->roster.n_places; i++)
        e->due.id[i] = e->roster.track[i].id;
    number_sensors(e);
    for (int i = 0; i < rig->n_sensors; i++)
        e->quota[i] = rig_pending_quota(rig, &rig->sensor[i]);
    size_t bytes =
        sizeof *e->counts + (size_t)rig->n_sensors * sizeof(struct ledger);
    e->counts->head = (struct message){
        .bytes = (uint32_t)bytes, .type = MESSAGE_COUNTS, .kind = 0xffff};
    e->counts->n_sensors = (uint32_t)rig->n_sensors;
    return e;
}

static void refill(struct engine *e)
{
    for (int i = 0; i < e->rig->n_sensors; i++)
        e->budget[i] = e->rig->max_steps;
}

void engine_start(struct engine *e, int64_t line_ns)
{
    e->now_ns = e->line_start_ns = line_ns;
    refill(e);
    roster_start(&e->roster, line_ns);
}

/* --- release and settle -----------------------------------------------------
 */

static struct lay laying(struct engine *e)
{
    return (struct lay){e->rig, e->work, e->local, &e->steps};
}

/* n_before: steps that were laid before the newest arrivals went in. */
static void release(struct engine *e, struct track *t, int n_before,
                    int64_t until_ns)
{
    struct lay lay = laying(e);
    int n = track_lay(t, &lay, until_ns);
    if (n > 0)
        speak_live(e, t, n - (t->n_laid - n_before));
}

static void count_settled(struct engine *e, struct track *t, struct step *s)
{
    struct watch *w = &t->watch[e->local[s->sensor]];
    struct ledger *own = &e->counts->sensor[s->sensor];
    bool is_used = s->flags & STEP_ACCEPTED;
    enum outcome o = is_used ? OUTCOME_USED : OUTCOME_GATED;
    own->outcome[OUTCOME_PENDING]--;
    own->outcome[o]++;
    e->counts->total.outcome[OUTCOME_PENDING]--;
    e->counts->total.outcome[o]++;
    w->pending--;
    w->settled_t_ns = s->t_ns;
    t->n_used += is_used;
    if (s->dof == 0)
        return;
    w->summary.n++;
    w->summary.nis_sum += s->nis;
    if (!is_used)
        return;
    w->summary.n_accepted++;
    w->summary.nis_accepted_sum += s->nis_used;
    kf_total_add(&t->total, s->dof, s->nis_used, s->v + t->m_max);
}

/* Held measurements go in. */
static void let_in(struct engine *e, struct track *t)
{
    int n_before = t->is_touched ? t->n_laid_before : t->n_laid;
    t->is_touched = false;
    if (t->is_confirmed)
        release(e, t, n_before, e->now_ns - e->rig->hold_ns);
}

/* The next step to settle comes so long after the one before that the track
 * was retired in between: nothing earlier can come any more. */
static bool is_anew(const struct track *t)
{
    int i = t->n_settled;
    return i > 0 && track_is_over(t, track_step(t, i)->t_ns -
                                         track_step(t, i - 1)->t_ns);
}

static void begin_anew(struct engine *e, struct track *t)
{
    int n;
    speak_event(e, EVENT_RETIRED, t, -1, e->now_ns);
    while (t->n_settled > 0) {
        track_drop_first(t);
        t->n_settled--;
    }
    t->n_laid = 0;
    t->scratch_at = -1;
    memset(t->base, 0, t->state_bytes);
    t->n_final = t->n_live = 0;
    t->n_aside = 0;
    memset(&t->live, 0, sizeof t->live);
    memset(&t->settled, 0, sizeof t->settled);
    engine_sensors(e, t, &n);
    for (int k = 0; k < n; k++) {
        t->watch[k].settled_t_ns = INT64_MIN;
        t->watch[k].is_aside = false;
        t->watch[k].refused = t->watch[k].agreed = 0;
    }
    track_confirm(t);
}

static void settle(struct engine *e, struct track *t, int64_t before_ns)
{
    struct lay lay = laying(e);
    for (int next; (next = track_next_settled(t)) >= 0 &&
                   track_step(t, next)->t_ns < before_ns;) {
        const struct track_state *st;
        if (is_anew(t)) {
            begin_anew(e, t);
            if (!t->is_confirmed)
                return;
            let_in(e, t);
            continue;
        }
        struct step *s = track_settle(t, &lay, &st);
        count_settled(e, t, s);
        aside_weigh(e, t, s);
        speak_settled(e, t, s, st);
    }
}

/* A candidate's first measurement found no second in time. */
static void give_up_first(struct engine *e, struct track *t)
{
    int sensor = track_step(t, 0)->sensor;
    e->counts->sensor[sensor].outcome[OUTCOME_PENDING]--;
    e->counts->sensor[sensor].outcome[OUTCOME_UNKNOWN_TRACK]++;
    e->counts->total.outcome[OUTCOME_PENDING]--;
    e->counts->total.outcome[OUTCOME_UNKNOWN_TRACK]++;
    t->watch[e->local[sensor]].pending--;
    track_drop_first(t);
    track_confirm(t);
    if (t->n == 0)
        roster_remove(&e->roster, t);
}

/* The track that is due at due_ns, and nothing of it that is due later: steps
 * of all tracks settle in one order, by t and id, whenever that happens. */
static void move_on(struct engine *e, struct track *t, int64_t due_ns)
{
    let_in(e, t);
    if (t->is_confirmed)
        settle(e, t, due_ns - e->rig->horizon_ns);
    else if (t->n > 0)
        give_up_first(e, t);
    intake_schedule(e, t);
}

static void run_due(struct engine *e, int64_t until_ns)
{
    if (e->roster.n_places == 0)
        return;
    for (;;) {
        int place = due_first(&e->due);
        int64_t due_ns = e->due.time[place];
        if (due_ns > until_ns || due_ns == DUE_NEVER)
            break;
        move_on(e, &e->roster.track[place], due_ns);
    }
}

void engine_begin(struct engine *e, int64_t a_ns)
{
    e->now_ns = a_ns;
    e->n_touched = 0;
    e->refusal = NULL;
    run_due(e, a_ns);
}

void engine_end(struct engine *e)
{
    for (int i = 0; i < e->n_touched; i++) {
        struct track *t = &e->roster.track[e->touched[i]];
        let_in(e, t);
        intake_schedule(e, t);
    }
    e->n_touched = 0;
}

/* --- ticks -------------------------------------------------------------------
 */

static void retire(struct engine *e, struct track *t)
{
    const struct track_state *tip = track_tip(t);
    int64_t since_ns = tip ? tip->kf.t_ns : e->line_start_ns;
    if (!t->is_confirmed || t->n > t->n_settled ||
        !track_is_over(t, e->now_ns - since_ns - e->rig->horizon_ns))
        return;
    speak_event(e, EVENT_RETIRED, t, -1, e->now_ns);
    roster_remove(&e->roster, t);
    intake_schedule(e, t);
}

void engine_tick(struct engine *e, int64_t tick_ns)
{
    e->now_ns = tick_ns;
    run_due(e, tick_ns);
    for (int i = 0; i < e->roster.n; i++) {
        struct track *t = &e->roster.track[e->roster.by_id[i]];
        if (t->is_confirmed)
            speak_judge_live(e, t, true);
    }
    if (tick_ns % 1000000000 != 0)
        return;
    refill(e);
    for (int i = e->roster.n - 1; i >= 0; i--)
        retire(e, &e->roster.track[e->roster.by_id[i]]);
}

void engine_finish(struct engine *e)
{
    for (int i = e->roster.n - 1; i >= 0; i--) {
        struct track *t = &e->roster.track[e->roster.by_id[i]];
        while (!t->is_confirmed && t->n > 0)
            give_up_first(e, t);
        intake_schedule(e, t);
    }
    for (int i = 0; i < e->roster.n; i++) {
        struct track *t = &e->roster.track[e->roster.by_id[i]];
        release(e, t, t->n_laid, INT64_MAX);
        intake_schedule(e, t);
    }
    run_due(e, INT64_MAX);
}

void engine_reanchor(struct engine *e, int64_t line_ns)
{
    engine_finish(e);
    int64_t was_ns = e->now_ns;
    e->now_ns = e->line_start_ns = line_ns;
    speak_event(e, EVENT_REANCHOR, NULL, -1, line_ns);
    for (int i = 0; i < e->roster.n; i++) {
        struct track *t = &e->roster.track[e->roster.by_id[i]];
        int n;
        engine_sensors(e, t, &n);
        track_reanchor(t, e->rig, e->work);
        for (int k = 0; k < n; k++) {
            t->watch[k].heard_ns += line_ns - was_ns;
            t->watch[k].settled_t_ns = INT64_MIN;
            t->watch[k].refused = t->watch[k].agreed = 0;
        }
        t->used_ns += line_ns - was_ns;
        t->live.is_started = t->settled.is_started = false;
        intake_schedule(e, t);
    }
}

/* --- accounts ----------------------------------------------------------------
 */

struct counts *engine_counts(struct engine *e)
{
    return e->counts;
}

void engine_say_counts(struct engine *e, int64_t t_ns)
{
    e->counts->t_ns = t_ns;
    e->sink.say(e->sink.ctx, &e->counts->head);
}

const char *engine_last_refusal(const struct engine *e)
{
    return e->refusal;
}

bool engine_track_summary(struct engine *e, int i, struct track_summary *out)
{
    if (i < 0 || i >= e->roster.n)
        return false;
    struct track *t = &e->roster.track[e->roster.by_id[i]];
    int n;
    const int16_t *sensor = engine_sensors(e, t, &n);
    memset(e->summary, 0, (size_t)e->rig->n_sensors * sizeof *e->summary);
    for (int k = 0; k < n; k++)
        e->summary[sensor[k]] = t->watch[k].summary;
    out->sensor = e->summary;
    memcpy(out->id, t->id, sizeof out->id);
    out->kind = t->kind_index;
    out->loglik = kf_total_loglik(&t->total);
    out->measurements = t->n_used;
    return true;
}

uint64_t engine_steps(const struct engine *e)
{
    return e->steps;
}
