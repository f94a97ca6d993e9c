/* track.h - one thing that is estimated: its measurements in canonical order
 * and the filter laid over them.
 *
 * Canonical order is total: (t, sensor, seq, values), no seq before any seq.
 * A late measurement is put in its place and everything behind it is laid
 * again from the checkpoint before.  Checkpoints stand at every step while a
 * state is no larger than a measurement (n <= TRACK_DENSE_STATES), at every
 * TRACK_STRIDE-th otherwise.
 *
 *   settled | laid | held          in the ring, oldest first
 *
 * Settled steps are final; the newest checkpoint among them is kept as the
 * ground that everything else is laid from.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_ENGINE_TRACK_H
#define CORE_ENGINE_TRACK_H

#include "core/engine/arena.h"
#include "core/filter/kf.h"
#include "core/model/message.h"

enum { TRACK_DENSE_STATES = 6, TRACK_STRIDE = 8, TRACK_RESTART_AFTER = 3 };

/* A prefix track that gets no second measurement within this is none. */
#define TRACK_CANDIDATE_NS 1000000000
/* A prefix track gives its place back when it was lost for so long. */
#define TRACK_RETIRE_NS 60000000000

enum step_flag {
    STEP_ACCEPTED = 1,
    STEP_BIRTH = 2,
    STEP_WIDENED = 4,
    STEP_RESTARTED = 8
};

/* A measurement in its place.  Behind it stand z (m_max values, as sent) and
 * the innovation variances (m_max values). */
struct step {
    int64_t t_ns;
    uint64_t seq, u_mark; /* u_mark: 0, or a digest of the reported u   */
    double nis;           /* at the prediction, before any widening     */
    double nis_used;      /* of the update that was committed           */
    int32_t state;        /* checkpoint after this step, -1 = none      */
    uint16_t refused;     /* in a row, this one included                */
    int16_t sensor;
    uint8_t has_seq, flags, dof, unused;
    double v[];
};

/* What a re-run depends on: lives in checkpoints, changes at measurements. */
struct track_state {
    int64_t refused_since_ns, outvoted_since_ns;
    uint64_t heard, refusing; /* sensors, by local number: when last heard  */
    uint16_t refused;         /* in a row                                   */
    uint16_t waited;          /* of these, since the last recovery          */
    uint16_t outvoted;        /* refused while most sensors refuse          */
    uint8_t widened;          /* times in a row without an accepted one     */
    uint8_t is_born;
    uint8_t is_floating; /* takes its time from the next measurement   */
    struct kf kf;
};

/* What a track knows of one sensor. */
struct watch {
    int64_t heard_ns;     /* arrival of its last valid measurement      */
    int64_t settled_t_ns; /* stamp of its last settled one              */
    int32_t pending;      /* its measurements that are not settled      */
    bool is_silent, is_aside;
    uint16_t refused, agreed; /* settled in a row: by the gate; while aside  */
    int64_t refused_since_ns; /* stamp of the first of them                */
    struct sensor_summary summary;
};

/* A verdict as it was last said, live or settled. */
struct judged {
    uint8_t verdict, n_why;
    bool is_started;
    struct reason why[MESSAGE_REASONS_MAX];
};

struct track {
    char id[RIG_ID_SIZE];
    const struct rig_kind *kind;
    int kind_index;
    int place;         /* in the engine's table                      */
    int sender;        /* who brought it, -1 for tracks of the file  */
    bool is_used;      /* the place holds a track                    */
    bool is_confirmed; /* of the file, or had its second measurement */
    bool is_touched;   /* something new since the last release       */
    int n_laid_before; /* n_laid when it was touched                 */

    int capacity, head, n, n_settled, n_laid;
    int scratch_at; /* scratch is the state after so many laid
                       steps, -1 = it is not                     */
    int32_t *order; /* ring of slots in canonical order           */
    int32_t *free_slot;
    int n_free_slots;
    char *slots; /* capacity x step_bytes                      */
    size_t step_bytes;
    int m_max;

    int n_states, n_free_states, stride;
    int32_t *free_state;
    char *states; /* checkpoints, n_states x state_bytes        */
    size_t state_bytes;
    struct track_state *base;    /* ground while the ring has none        */
    struct track_state *scratch; /* newest laid state without checkpoint  */
    struct track_state *final;   /* newest settled state without one      */

    int64_t greatest_t_ns; /* of any measurement taken in                */
    bool has_greatest;
    uint64_t n_live, n_final; /* messages said                            */
    struct kf_total total;
    uint64_t n_used;
    int n_silent, n_aside; /* of its sensors                             */
    int64_t used_ns;       /* arrival line when a measurement was last used */
    struct judged live, settled;
    struct watch *watch; /* by local sensor number                     */
};

/* Sizes of the kinds that a place must fit. */
struct track_size {
    int capacity, n_states, stride, m_max, n_watches;
    size_t step_bytes, state_bytes;
};

/* What a track of this kind needs. */
struct track_size track_size(const struct rig *rig, int kind);

void track_layout(struct track *t, const struct track_size *size,
                  struct arena *arena);

/* Empties the place and gives it to a track; counts and n begin anew. */
void track_open(struct track *t, const struct rig *rig, int kind,
                const char *id, size_t len, int64_t now_ns);

/* The i-th step of the ring. */
static inline struct step *track_step(const struct track *t, int i)
{
    int at = t->head + i;
    at -= at < t->capacity ? 0 : t->capacity;
    return (struct step *)(void *)(t->slots +
                                   (size_t)t->order[at] * t->step_bytes);
}

static inline double *step_z(struct step *s)
{
    return s->v;
}

/* Where `s` belongs; *is_duplicate if its equal stands there. */
int track_find(const struct track *t, const struct step *s, bool *is_duplicate);

/* Puts a copy of *s in at i; false when the ring is full. */
bool track_insert(struct track *t, int i, const struct step *s);

/* What laying needs from the engine. */
struct lay {
    const struct rig *rig;
    struct kf_work *work;
    const int16_t *local; /* by sensor: its number within its track   */
    uint64_t *steps;      /* counted up by every filter step            */
};

/* Lays steps until the first with t > until_ns; returns how many. */
int track_lay(struct track *t, const struct lay *lay, int64_t until_ns);

/* State after the newest laid step; NULL before the first. */
const struct track_state *track_tip(const struct track *t);

/* True if a prefix track is over after so long without a measurement. */
static inline bool track_is_over(const struct track *t, int64_t gap_ns)
{
    return t->kind->is_prefix &&
           gap_ns > t->kind->lost_after_ns + TRACK_RETIRE_NS;
}

/* The next step settles: returns it with the state after it.  The ground
 * moves on; the step stays valid until the next call on this track. */
struct step *track_settle(struct track *t, const struct lay *lay,
                          const struct track_state **state);

/* A prefix track is one from its first two measurements on that lie no more
 * than TRACK_CANDIDATE_NS apart. */
void track_confirm(struct track *t);

/* The step whose stamp decides when something settles next, -1 = none is
 * laid.  The first of a prefix track settles with the second, so that the
 * order of what settles is a matter of stamps alone. */
int track_next_settled(const struct track *t);

/* Forgets the oldest step, whatever it is. */
void track_drop_first(struct track *t);

/* The checkpoint after a step that has one, and giving it back. */
static inline struct track_state *track_checkpoint(const struct track *t,
                                                   const struct step *s)
{
    return (struct track_state *)(void *)(t->states +
                                          (size_t)s->state * t->state_bytes);
}
void track_free_checkpoint(struct track *t, struct step *s);

/* The line jumped: all steps are settled; what is known stays only in the
 * constants, widened. */
void track_reanchor(struct track *t, const struct rig *rig,
                    struct kf_work *work);

#endif
