/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/math/real.h"

static double seconds(int64_t ns)
{
    return (double)ns * 1e-9;
}

/* The polynomial c after s seconds: value, rate, accel and jerk; out may be
 * c. */
static void glide(const double c[4], double s, double out[4])
{
    double value = c[0] + s * (c[1] + s / 2 * (c[2] + s / 3 * c[3]));
    out[1] = c[1] + s * (c[2] + s / 2 * c[3]);
    out[2] = c[2] + s * c[3];
    out[3] = c[3];
    out[0] = value;
}

/* --- the script ----------------------------------------------------------- */

static void add_piece(struct scene_block *b, int64_t at_ns, const double c[4])
{
    struct scene_piece *p = &b->piece[b->n_pieces++];
    p->at_ns = at_ns;
    memcpy(p->c, c, sizeof p->c);
}

static void begin_move(const struct scene_move *m, double c[4])
{
    double for_s = seconds(m->for_ns);
    c[3] = 0;
    switch (m->kind) {
    case SCENE_JERK:
        c[3] = m->value;
        break;
    case SCENE_ACCEL:
        c[2] = m->value;
        break;
    case SCENE_SPEED:
        c[2] = m->for_ns > 0 ? (m->value - c[1]) / for_s : 0;
        break;
    case SCENE_VALUE:
        c[1] = m->for_ns > 0 ? (m->value - c[0]) / for_s : 0;
        c[2] = 0;
        break;
    }
}

static void end_move(const struct scene_move *m, double c[4])
{
    c[3] = 0;
    if (m->kind != SCENE_JERK)
        c[2] = 0;
    if (m->kind == SCENE_SPEED)
        c[1] = m->value;
    if (m->kind == SCENE_VALUE) {
        c[0] = m->value;
        c[1] = 0;
    }
}

/* The pieces of one block.  Its moves follow each other without overlap. */
static void lay_pieces(const struct scene_track *t, struct scene_block *b,
                       int block, const double start[4])
{
    double c[4];
    b->n_pieces = 0;
    memcpy(c, start, sizeof c);
    add_piece(b, 0, c);
    for (int i = 0; i < t->n_moves; i++) {
        const struct scene_move *m = &t->move[i];
        if (m->block != block)
            continue;
        const struct scene_piece *last = &b->piece[b->n_pieces - 1];
        glide(last->c, seconds(m->at_ns - last->at_ns), c);
        begin_move(m, c);
        add_piece(b, m->at_ns, c);
        glide(c, seconds(m->for_ns), c);
        end_move(m, c);
        add_piece(b, m->at_ns + m->for_ns, c);
    }
}

/* Last piece that begins at or before t. */
static const struct scene_piece *piece_at(const struct scene_block *b,
                                          int64_t t_ns)
{
    int low = 0, high = b->n_pieces;
    while (high - low > 1) {
        int middle = (low + high) / 2;
        if (b->piece[middle].at_ns <= t_ns)
            low = middle;
        else
            high = middle;
    }
    return &b->piece[low];
}

/* --- what wanders --------------------------------------------------------- */

/* Where the noise enters: the rate, the accel or the jerk. */
static int noise_place(const struct block *b)
{
    switch (b->model) {
    case BLOCK_CONSTANT:
    case BLOCK_RANDOM_WALK:
    case BLOCK_GAUSS_MARKOV:
    case BLOCK_LINEAR:
    case BLOCK_LAG:
        return 1;
    case BLOCK_CONSTANT_VELOCITY:
    case BLOCK_OSCILLATOR:
        return 2;
    case BLOCK_CONSTANT_ACCELERATION:
    case BLOCK_SINGER:
        return 3;
    }
    return 1;
}

/* What wanders, s seconds after its last noise was drawn. */
static void wander_after(const struct block *b, const struct scene_wander *w,
                         double s, double out[4])
{
    if (b->model != BLOCK_GAUSS_MARKOV) {
        glide(w->c, s, out);
        return;
    }
    double end = w->noise * b->tau_s, was = w->c[0];
    memset(out, 0, 4 * sizeof *out);
    out[0] = end + (was - end) * real_exp(-s / b->tau_s); /* x' = w - x/tau */
}

/* A noise of density q held for h has variance q / h. */
static void draw(const struct block *b, double q, struct scene_wander *w)
{
    double *c = w->c, omega = b->omega_rad_s;
    w->noise = random_normal(&w->random) * sqrt(q / seconds(SCENE_STEP_NS));
    if (b->model != BLOCK_GAUSS_MARKOV)
        c[noise_place(b)] = w->noise;
    if (b->model == BLOCK_OSCILLATOR) {
        /* accel = w - omega^2 x - 2 zeta omega rate, and its derivative. */
        c[2] -= omega * (omega * c[0] + 2 * b->zeta * c[1]);
        c[3] = -omega * (omega * c[1] + 2 * b->zeta * c[2]);
    } else if (b->model == BLOCK_SINGER) {
        c[3] -= c[2] / b->tau_s; /* jerk = w - accel/tau */
    }
}

/* What settled long before begins anywhere in its spread. */
static void settle_wander(const struct block *b, double q,
                          struct scene_wander *w)
{
    double omega = b->omega_rad_s;
    if (b->model == BLOCK_GAUSS_MARKOV) /* u^2 = q tau / 2       */
        w->c[0] = random_normal(&w->random) * sqrt(q * b->tau_s / 2);
    if (b->model == BLOCK_SINGER)
        w->c[2] = random_normal(&w->random) * sqrt(q * b->tau_s / 2);
    if (b->model != BLOCK_OSCILLATOR || !(b->zeta > 0))
        return;
    double rate_u = sqrt(q / (4 * b->zeta * omega));
    w->c[0] = random_normal(&w->random) * rate_u / omega;
    w->c[1] = random_normal(&w->random) * rate_u;
}

static void begin_wander(const struct scene *s, const struct scene_track *t,
                         const struct block *b, struct scene_block *truth)
{
    char of[2 * RIG_ID_SIZE + 2];
    struct scene_wander *w = &truth->wander;
    snprintf(of, sizeof of, "%s/%s", t->id,
             s->rig->kind[t->kind].state[b->at].name);
    scene_random(s, "wander", of, &w->random);
    memset(w->c, 0, sizeof w->c);
    w->step = 0;
    settle_wander(b, truth->q, w);
    draw(b, truth->q, w);
}

static void wander_to(const struct scene *s, struct scene_track *t, int block,
                      int64_t t_ns)
{
    const struct block *b = &s->rig->kind[t->kind].block[block];
    struct scene_block *truth = &t->block[block];
    struct scene_wander *w = &truth->wander;
    int64_t step = t_ns / SCENE_STEP_NS;
    if (w->step < 0 || w->step > step)
        begin_wander(s, t, b, truth);
    for (; w->step < step; w->step++) {
        wander_after(b, w, seconds(SCENE_STEP_NS), w->c);
        draw(b, truth->q, w);
    }
}

/* --- the scene ------------------------------------------------------------ */

void scene_random(const struct scene *s, const char *purpose, const char *of,
                  struct random *random)
{
    uint64_t hash = 0xcbf29ce484222325; /* FNV-1a of both names */
    for (; *purpose != '\0'; purpose++)
        hash = (hash ^ (uint8_t)*purpose) * 0x100000001b3;
    for (hash = (hash ^ '/') * 0x100000001b3; *of != '\0'; of++)
        hash = (hash ^ (uint8_t)*of) * 0x100000001b3;
    random_init(random, s->seed, hash);
}

static status prepare_track(struct scene *s, struct scene_track *t)
{
    const struct rig_kind *kind = &s->rig->kind[t->kind];
    struct random random;
    double start[RIG_STATES_MAX];
    scene_random(s, "start", t->id, &random);
    for (int i = 0; i < kind->n; i++)
        start[i] = t->start[i] + t->start_u[i] * random_normal(&random);
    for (int i = 0; i < kind->n_blocks; i++) {
        const struct block *b = &kind->block[i];
        struct scene_block *truth = &t->block[i];
        double c[4] = {0};
        memcpy(c, start + b->at, (size_t)b->n * sizeof *c);
        if (truth->piece == NULL)
            truth->piece =
                calloc((size_t)t->n_moves * 2 + 1, sizeof *truth->piece);
        if (truth->piece == NULL)
            return ST_NOMEM;
        lay_pieces(t, truth, i, c);
        truth->wander.step = -1;
    }
    return ST_OK;
}

status scene_reseed(struct scene *s, uint64_t seed)
{
    status st = ST_OK;
    s->seed = seed;
    for (int i = 0; i < s->n_tracks && st == ST_OK; i++)
        st = prepare_track(s, &s->track[i]);
    return st;
}

void scene_free(struct scene *s)
{
    if (s == NULL)
        return;
    for (int i = 0; s->track != NULL && i < s->n_tracks; i++) {
        for (int k = 0; k < RIG_BLOCKS_MAX; k++)
            free(s->track[i].block[k].piece);
        free(s->track[i].move);
    }
    free(s->track);
    free(s);
}

int scene_find_track(const struct scene *s, const char *id)
{
    for (int i = 0; i < s->n_tracks; i++)
        if (strcmp(s->track[i].id, id) == 0)
            return i;
    return -1;
}

/* One block's states at t. */
static void block_truth(struct scene *s, struct scene_track *t, int i,
                        int64_t t_ns, double out[4])
{
    const struct block *b = &s->rig->kind[t->kind].block[i];
    struct scene_block *truth = &t->block[i];
    const struct scene_piece *p = piece_at(truth, t_ns);
    double wander[4] = {0};
    glide(p->c, seconds(t_ns - p->at_ns), out);
    if (truth->q > 0 && t_ns >= 0) {
        wander_to(s, t, i, t_ns);
        wander_after(b, &truth->wander,
                     seconds(t_ns - truth->wander.step * SCENE_STEP_NS),
                     wander);
    }
    for (int k = 0; k < b->n; k++)
        out[k] += wander[k];
}

static double state_truth(struct scene *s, struct scene_track *t, int state,
                          int64_t t_ns)
{
    const struct rig_kind *kind = &s->rig->kind[t->kind];
    double x[4];
    int k = 0;
    while (state >= kind->block[k].at + kind->block[k].n)
        k++;
    block_truth(s, t, k, t_ns, x);
    return x[state - kind->block[k].at];
}

/* --- what follows slowly ----------------------------------------------------
 */

/* What the lag of this block goes towards. */
static double followed(struct scene *s, struct scene_track *t, int block,
                       int64_t t_ns)
{
    const struct rig_kind *kind = &s->rig->kind[t->kind];
    const struct block *b = &kind->block[block];
    double sum = 0;
    for (int i = 0; i < kind->n_couplings; i++)
        if (kind->coupling[i].state == b->at)
            sum += kind->coupling[i].rate * b->tau_s *
                   state_truth(s, t, kind->coupling[i].on, t_ns);
    return sum;
}

/* y' = (target - y) / tau over one step, the target taken at its middle. */
static void follow_step(struct scene *s, struct scene_track *t, int block)
{
    const struct block *b = &s->rig->kind[t->kind].block[block];
    struct scene_wander *w = &t->block[block].wander;
    int64_t middle_ns = w->step * SCENE_STEP_NS + SCENE_STEP_NS / 2;
    double part = -real_expm1(-seconds(SCENE_STEP_NS) / b->tau_s);
    w->c[0] += part * (followed(s, t, block, middle_ns) - w->c[0]);
    w->step++;
}

/* All that follows goes step by step together: what is followed wanders
 * forward only. */
static void follow_to(struct scene *s, struct scene_track *t, int64_t t_ns)
{
    const struct rig_kind *kind = &s->rig->kind[t->kind];
    int64_t step = t_ns < 0 ? 0 : t_ns / SCENE_STEP_NS, from = step;
    for (int i = 0; i < kind->n_blocks; i++) {
        struct scene_wander *w = &t->block[i].wander;
        if (kind->block[i].model != BLOCK_LAG)
            continue;
        if (w->step < 0 || w->step > step) {
            w->step = 0;
            w->c[0] = followed(s, t, i, 0); /* at rest before           */
        }
        from = w->step < from ? w->step : from;
    }
    for (int64_t k = from; k < step; k++)
        for (int i = 0; i < kind->n_blocks; i++)
            if (kind->block[i].model == BLOCK_LAG)
                follow_step(s, t, i);
}

void scene_truth(struct scene *s, int track, int64_t t_ns, double *x)
{
    struct scene_track *t = &s->track[track];
    const struct rig_kind *kind = &s->rig->kind[t->kind];
    follow_to(s, t, t_ns);
    for (int i = 0; i < kind->n_blocks; i++) {
        const struct block *b = &kind->block[i];
        double own[4];
        if (b->model == BLOCK_LAG) {
            const struct scene_wander *w = &t->block[i].wander;
            double left_s = seconds(t_ns - w->step * SCENE_STEP_NS);
            own[0] = w->c[0] - real_expm1(-left_s / b->tau_s) *
                                   (followed(s, t, i, t_ns) - w->c[0]);
        } else {
            block_truth(s, t, i, t_ns, own);
        }
        memcpy(x + b->at, own, (size_t)b->n * sizeof *own);
    }
}
