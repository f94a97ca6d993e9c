/* The door: what becomes of each measurement, and when tracks move on. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/engine/engine_state.h"

#include "core/math/real.h"

/* Stamps before this are counted from a boot, not from 1970. */
#define BOOT_STAMP_NS (400000000 * (int64_t)1000000000)

/* Differences of stamps within this never overflow. */
#define STAMP_MAX_NS ((int64_t)4000000000 * 1000000000)

/* A jump of seq by more than this is a sender that began anew. */
enum { SEQ_JUMP_MAX = 100000 };

static const double z_max = 1e150;

/* --- who is meant -----------------------------------------------------------
 */

struct door {
    int sensor, kind;
    struct text id;      /* of the track                                */
    struct track *track; /* NULL: not there yet                         */
    int64_t t_ns;
};

static void address(const struct engine *e, const struct measurement *m,
                    struct door *d)
{
    const struct rig *rig = e->rig;
    d->sensor = rig_find_sensor(rig, m->sensor.at, (size_t)m->sensor.len);
    d->id = m->track;
    d->kind = -1;
    d->track = NULL;
    if (m->track.len > 0) {
        d->kind = rig_find_kind(rig, m->track.at, (size_t)m->track.len);
    } else if (d->sensor >= 0) {
        const struct rig_kind *own = &rig->kind[rig->sensor[d->sensor].kind];
        if (!own->is_prefix) {
            d->kind = rig->sensor[d->sensor].kind;
            d->id = (struct text){own->id, (int)strlen(own->id)};
        }
    }
    if (d->kind >= 0)
        d->track = roster_find(&e->roster, d->id.at, (size_t)d->id.len);
}

/* --- refusals that look at the measurement alone ----------------------------
 */

static enum outcome refuse(struct engine *e, enum outcome o, const char *why)
{
    e->refusal = why;
    return o;
}

/* Milli- or microseconds since 1970, 2001 to 2100, where nanoseconds stand. */
static bool is_scaled(int64_t t_ns)
{
    const int64_t least_ms = 1000000000000, most_ms = 4102444800000;
    return (t_ns > least_ms && t_ns < most_ms) ||
           (t_ns > least_ms * 1000 && t_ns < most_ms * 1000);
}

static bool is_implausible(const struct engine *e, const struct rig_sensor *s,
                           const struct measurement *m, const char **why)
{
    for (int i = 0; i < m->n_z && i < READS_MAX; i++) {
        double z = m->z[i] * s->scale[i] + s->shift[i];
        if (real_abs(m->z[i]) > z_max || real_abs(z) > z_max) {
            *why = "z is not a possible number: send null where there is no "
                   "reading";
            return true;
        }
    }
    if (m->has_t && (m->t_ns < -STAMP_MAX_NS || m->t_ns > STAMP_MAX_NS)) {
        *why = "t is not within 127 years of 1970: send seconds since 1970 "
               "UTC, not milliseconds";
        return true;
    }
    if (m->has_t && is_scaled(m->t_ns)) {
        *why = "the stamp in ns looks like milli- or microseconds since 1970: "
               "send nanoseconds, or seconds as `t`";
        return true;
    }
    if (m->has_t && m->t_ns < BOOT_STAMP_NS && e->now_ns > BOOT_STAMP_NS) {
        *why = "t looks like time since boot: send seconds since 1970 UTC, or "
               "leave t out";
        return true;
    }
    return false;
}

static int64_t stamp(const struct engine *e, const struct rig_sensor *s,
                     const struct measurement *m)
{
    bool is_own = m->has_t && s->stamp != RIG_STAMP_ARRIVAL;
    return (is_own ? m->t_ns : e->now_ns) - s->delay_ns;
}

/* Refusals in their fixed precedence; OUTCOME_PENDING lets it pass. */
static enum outcome examine(struct engine *e, const struct measurement *m,
                            struct door *d)
{
    const char *why = NULL;
    bool names_wrong_track =
        d->sensor >= 0 && d->kind != e->rig->sensor[d->sensor].kind;
    if ((m->track.len > 0 && d->kind < 0) || names_wrong_track)
        return refuse(e, OUTCOME_UNKNOWN_TRACK,
                      "no such track for this sensor: compare `track` with the "
                      "rig file");
    if (d->sensor < 0)
        return refuse(e, OUTCOME_UNKNOWN_SENSOR,
                      "no sensor of this name: add it to the rig file");
    const struct rig_sensor *s = &e->rig->sensor[d->sensor];
    if (is_implausible(e, s, m, &why))
        return refuse(e, OUTCOME_IMPLAUSIBLE, why);
    if (m->n_z != 0 && m->n_z != s->reads.m)
        return refuse(e, OUTCOME_WRONG_SIZE,
                      "z has another number of components than the sensor "
                      "reads: compare with `reads`");
    if (!m->has_t && s->stamp == RIG_STAMP_SENSOR)
        return refuse(e, OUTCOME_NO_STAMP,
                      "no t although time.stamp is `sensor`: send t, or set "
                      "time.stamp to `arrival`");
    d->t_ns = stamp(e, s, m);
    if (d->t_ns - e->now_ns > e->rig->ahead_ns)
        return refuse(e, OUTCOME_TOO_EARLY,
                      "t lies after its arrival by more than order.ahead: "
                      "check the sender's clock (milliseconds for seconds?)");
    if (e->now_ns - d->t_ns > e->rig->horizon_ns)
        return refuse(e, OUTCOME_TOO_LATE,
                      "arrived later than order.horizon: widen it, or check "
                      "the sender's clock");
    return OUTCOME_PENDING;
}

/* --- seq --------------------------------------------------------------------
 */

/* True if this number was seen before. */
static bool seq_seen(struct engine *e, int sensor, uint64_t seq)
{
    struct seq_window *w = &e->seq[sensor];
    uint64_t *lost = &e->counts->sensor[sensor].tally[TALLY_LOST];
    uint64_t *total = &e->counts->total.tally[TALLY_LOST];
    bool is_far =
        w->has_any && (seq > w->greatest ? seq - w->greatest > SEQ_JUMP_MAX
                                         : w->greatest - seq > SEQ_JUMP_MAX);
    if (!w->has_any || is_far) {
        *w = (struct seq_window){true, seq, seq, 1};
        return false;
    }
    if (seq > w->greatest) {
        uint64_t gap = seq - w->greatest;
        *lost += gap - 1;
        *total += gap - 1;
        w->seen = gap < 64 ? w->seen << gap | 1 : 1;
        w->greatest = seq;
        return false;
    }
    uint64_t behind = w->greatest - seq;
    if (behind >= 64 || seq < w->first)
        return false;
    if (w->seen >> behind & 1)
        return true;
    w->seen |= (uint64_t)1 << behind;
    if (*lost > 0) { /* counted as lost, now it is here */
        --*lost;
        --*total;
    }
    return false;
}

/* --- taking in --------------------------------------------------------------
 */

static double plain(double z)
{
    if (z != z)
        return real_nan(); /* one NaN of many */
    return z == 0 ? 0 : z; /* -0 as 0 */
}

static uint64_t digest(const struct measurement *m)
{
    uint64_t h = 1469598103934665603u; /* FNV-1a over the values */
    for (int i = 0; i < m->n_u; i++) {
        uint64_t bits;
        double u = plain(m->u[i]);
        memcpy(&bits, &u, sizeof bits);
        for (int k = 0; k < 64; k += 8)
            h = (h ^ (bits >> k & 255)) * 1099511628211u;
    }
    return h | 1;
}

/* Fills the scratch step; returns how many components were read. */
static int fill(struct engine *e, const struct measurement *m,
                const struct door *d, int m_max)
{
    struct step *s = e->incoming;
    int n_read = 0;
    memset(s, 0, sizeof *s);
    for (int i = m->n_z; i < m_max; i++)
        s->v[i] = 0;
    s->t_ns = d->t_ns;
    s->sensor = (int16_t)d->sensor;
    s->has_seq = m->has_seq;
    s->seq = m->has_seq ? m->seq : 0;
    s->u_mark = m->n_u > 0 ? digest(m) : 0;
    s->state = -1;
    for (int i = 0; i < m->n_z; i++) {
        s->v[i] = plain(m->z[i]);
        n_read += s->v[i] == s->v[i];
    }
    return n_read;
}

/* Neither place nor t tells a repeat of a stamp-by-arrival sensor: its seq
 * and values do. */
static bool is_repeat(const struct engine *e, const struct track *t)
{
    const struct step *s = e->incoming;
    size_t values = (size_t)t->m_max * sizeof(double);
    for (int i = t->n - 1; i >= t->n_settled && s->has_seq; i--) {
        const struct step *k = track_step(t, i);
        if (k->sensor == s->sensor && k->has_seq && k->seq == s->seq &&
            k->u_mark == s->u_mark && memcmp(k->v, s->v, values) == 0)
            return true;
    }
    return false;
}

static int m_max_of(const struct engine *e, const struct door *d)
{
    if (d->track)
        return d->track->m_max;
    return track_size(e->rig, d->kind).m_max;
}

static enum outcome no_room(struct engine *e, const char *why)
{
    return refuse(e, OUTCOME_OVER_QUOTA, why);
}

static enum outcome place(struct engine *e, const struct measurement *m,
                          struct door *d, const struct sender *from)
{
    const struct rig_sensor *sensor = &e->rig->sensor[d->sensor];
    bool is_duplicate = false,
         is_by_arrival = !m->has_t || sensor->stamp == RIG_STAMP_ARRIVAL;
    int n_read = fill(e, m, d, m_max_of(e, d)), i = 0;
    if (d->track)
        i = track_find(d->track, e->incoming, &is_duplicate);
    if (d->track && is_by_arrival)
        is_duplicate = is_repeat(e, d->track);
    if (is_duplicate && n_read > 0)
        return refuse(e, OUTCOME_DUPLICATE,
                      "came before: the sender or the network repeats "
                      "datagrams, nothing is lost");
    if (n_read == 0)
        return OUTCOME_NO_READING;
    if (!d->track)
        d->track = roster_add(&e->roster, d->kind, &d->id, from, e->now_ns);
    if (!d->track)
        return no_room(e, "no place for another track: see limits.tracks and "
                          "limits.ids_per_sender");
    struct track *t = d->track;
    struct watch *w = &t->watch[e->local[d->sensor]];
    if (w->pending >= e->quota[d->sensor])
        return no_room(e, "more measurements pending than the sensor's rate "
                          "allows: raise `rate` or limits.pending");
    int again = t->n_laid - i;
    if (!t->is_touched)
        t->n_laid_before = t->n_laid;
    if (again > 0 && e->budget[d->sensor] < again)
        return no_room(e, "too many late measurements in this second: set "
                          "order.hold, or raise limits.steps");
    if (!track_insert(t, i, e->incoming))
        return no_room(e, "no room for another pending measurement: raise "
                          "limits.pending");
    if (again > 0)
        e->budget[d->sensor] -= again;
    w->pending++;
    return OUTCOME_PENDING;
}

static void tally(struct engine *e, int sensor, enum tally t)
{
    e->counts->total.tally[t]++;
    e->counts->sensor[sensor].tally[t]++;
}

/* Heard: any measurement that got through the door, readings or not. */
static void heard(struct engine *e, struct track *t, int sensor)
{
    struct watch *w = &t->watch[e->local[sensor]];
    w->heard_ns = e->now_ns;
    if (w->is_silent) {
        w->is_silent = false;
        t->n_silent--;
        speak_event(e, EVENT_BACK, t, sensor, e->now_ns);
    }
}

static void taken(struct engine *e, struct track *t, int sensor, int64_t t_ns)
{
    if (t->has_greatest && t_ns < t->greatest_t_ns)
        tally(e, sensor, TALLY_LATE);
    if (!t->has_greatest || t_ns > t->greatest_t_ns)
        t->greatest_t_ns = t_ns;
    t->has_greatest = true;
    track_confirm(t);
    if (!t->is_touched) {
        t->is_touched = true;
        e->touched[e->n_touched++] = t->place;
    }
}

void engine_take(struct engine *e, const struct measurement *m,
                 const struct sender *from)
{
    if (m->mark != MARK_NONE) {
        e->counts->marks++;
        speak_mark(e, m, m->has_t ? m->t_ns : e->now_ns);
        return;
    }
    struct door d;
    address(e, m, &d);
    bool is_again =
        d.sensor >= 0 && m->has_seq && seq_seen(e, d.sensor, m->seq);
    enum outcome o = examine(e, m, &d);
    if (o == OUTCOME_PENDING)
        o = place(e, m, &d, from);
    e->counts->total.outcome[o]++;
    if (d.sensor < 0)
        return;
    e->counts->sensor[d.sensor].outcome[o]++;
    if (o != OUTCOME_PENDING && o != OUTCOME_NO_READING)
        return;
    if (m->n_u > 0 || m->has_cov)
        tally(e, d.sensor, TALLY_U_IGNORED);
    if (is_again && o == OUTCOME_PENDING)
        tally(e, d.sensor, TALLY_SEQ_CONFLICT);
    if (d.track)
        heard(e, d.track, d.sensor);
    if (o == OUTCOME_PENDING)
        taken(e, d.track, d.sensor, d.t_ns);
}

/* --- when tracks move on ----------------------------------------------------
 */

/* What settles next was laid a horizon ago and has left the processor's cache:
 * asked for now, it is there when it is due. */
static void fetch(const struct track *t, int next)
{
    enum { LINE = 64, STEPS = 3 };
    for (int i = next; i < next + STEPS && i < t->n; i++) {
        const char *step = (const char *)track_step(t, i);
        for (size_t at = 0; at < t->step_bytes; at += LINE)
            __builtin_prefetch(step + at);
    }
}

void intake_schedule(struct engine *e, struct track *t)
{
    int64_t due = DUE_NEVER;
    if (!t->is_used) {
        due = DUE_NEVER;
    } else if (!t->is_confirmed) {
        if (t->n > 0)
            due = track_step(t, 0)->t_ns + TRACK_CANDIDATE_NS +
                  e->rig->horizon_ns + 1;
    } else {
        if (t->n_laid < t->n)
            due = track_step(t, t->n_laid)->t_ns + e->rig->hold_ns;
        int next = track_next_settled(t);
        if (next >= 0) {
            int64_t settle = track_step(t, next)->t_ns + e->rig->horizon_ns + 1;
            fetch(t, next);
            due = settle < due ? settle : due;
        }
    }
    due_set(&e->due, t->place, due);
}
