/* SPDX-License-Identifier: Apache-2.0 */
#include "core/filter/joined.h"

#include <string.h>

#include "core/math/real.h"
#include "core/model/component.h"
#include "core/model/lti.h"

enum { KEPT = 8 };

/* A transition as the step needs it: x = Phi x + shift + e. */
struct kept {
    const struct rig_kind *kind; /* NULL: none yet                        */
    int64_t dt_ns;
    double *Phi, *Qu, *Qd, *shift; /* n x n, n x n, n, n                    */
};

struct joined {
    int next; /* to be replaced                                         */
    struct kept kept[KEPT];
    /* Of one component: */
    double *Phi, *Q, *ud, *shift, *scratch;
    double *U; /* n x n, rows                                          */
};

/* --- memory --------------------------------------------------------------- */

size_t joined_bytes(int n)
{
    size_t square = (size_t)(n * n), one = (size_t)n;
    size_t values = KEPT * (2 * square + 2 * one) + 3 * square + one +
                    UD_SIZE(one) + LTI_SCRATCH(n);
    return sizeof(struct joined) + values * sizeof(double);
}

static double *part(double **at, size_t n)
{
    double *begin = *at;
    *at += n;
    return begin;
}

struct joined *joined_init(void *memory, int n)
{
    struct joined *j = memory;
    size_t square = (size_t)(n * n), one = (size_t)n;
    memset(memory, 0, joined_bytes(n));
    double *at = (double *)(j + 1);
    for (int i = 0; i < KEPT; i++) {
        j->kept[i].Phi = part(&at, square);
        j->kept[i].Qu = part(&at, square);
        j->kept[i].Qd = part(&at, one);
        j->kept[i].shift = part(&at, one);
    }
    j->Phi = part(&at, square);
    j->Q = part(&at, square);
    j->U = part(&at, square);
    j->shift = part(&at, one);
    j->ud = part(&at, UD_SIZE(one));
    j->scratch = part(&at, LTI_SCRATCH(n));
    return j;
}

/* --- the transition ---------------------------------------------------------
 */

/* One component's Phi, factored Q and shift into the whole. */
static void put_component(const struct rig_kind *kind, int i, double dt_s,
                          struct joined *j, struct kept *k)
{
    const struct rig_component *c = &kind->component[i];
    int n = kind->n, m = c->n;
    lti_transition(m, component_A(kind, i), component_W(kind, i),
                   component_c(kind, i), dt_s, j->scratch, j->Phi, j->Q,
                   j->shift);
    /* Q of a long gap of a growing system may be no covariance: is_sound
     * will see that the result is not finite. */
    if (ud_factor(m, j->Q, j->ud) != ST_OK)
        for (int a = 0; a < m; a++)
            j->ud[UD_AT(a, a)] = real_nan();
    for (int a = 0; a < m; a++) {
        int row = c->state[a];
        k->shift[row] = j->shift[a];
        k->Qd[row] = j->ud[UD_AT(a, a)];
        for (int b = 0; b < m; b++) {
            k->Phi[row * n + c->state[b]] = j->Phi[a * m + b];
            if (b > a)
                k->Qu[row * n + c->state[b]] = j->ud[UD_AT(a, b)];
        }
    }
}

static void put_block(const struct block *b, double dt_s, int n, struct kept *k)
{
    struct transition t = {n, k->Phi, k->Qu, k->Qd};
    block_transition(b, dt_s, &t);
    if (b->model == BLOCK_GAUSS_MARKOV) /* m (1 - Phi) */
        k->shift[b->at] = b->mean - k->Phi[b->at * n + b->at] * b->mean;
}

static const struct kept *transition(const struct rig_kind *kind,
                                     struct joined *j, int64_t dt_ns)
{
    for (int i = 0; i < KEPT; i++)
        if (j->kept[i].kind == kind && j->kept[i].dt_ns == dt_ns)
            return &j->kept[i];
    struct kept *k = &j->kept[j->next];
    size_t n = (size_t)kind->n;
    double dt_s = (double)dt_ns * 1e-9;
    j->next = (j->next + 1) % KEPT;
    k->kind = kind;
    k->dt_ns = dt_ns;
    memset(k->Phi, 0, n * n * sizeof *k->Phi);
    memset(k->Qu, 0, n * n * sizeof *k->Qu);
    memset(k->shift, 0, n * sizeof *k->shift);
    for (size_t i = 0; i < n; i++)
        k->Qu[i * n + i] = 1;
    for (int i = 0; i < kind->n_blocks; i++)
        if (!kind->block[i].is_joined)
            put_block(&kind->block[i], dt_s, kind->n, k);
    for (int i = 0; i < kind->n_components; i++)
        put_component(kind, i, dt_s, j, k);
    return k;
}

/* --- the step ---------------------------------------------------------------
 */

/* W = Phi U. */
static void spread(int n, const double *Phi, const double *ud, double *U,
                   double *W)
{
    for (int c = 0; c < n; c++) {
        U[c * n + c] = 1;
        for (int j = c + 1; j < n; j++)
            U[c * n + j] = ud[UD_AT(c, j)];
    }
    memset(W, 0, (size_t)(n * n) * sizeof *W);
    for (int i = 0; i < n; i++)
        for (int c = 0; c < n; c++) {
            double phi = Phi[i * n + c];
            for (int j = c; j < n && phi != 0; j++)
                W[i * n + j] += phi * U[c * n + j];
        }
}

/* v = Phi v, plus shift if there is one. */
static void move(int n, const double *Phi, const double *shift, double *was,
                 double *v)
{
    memcpy(was, v, (size_t)n * sizeof *v);
    for (int i = 0; i < n; i++) {
        double sum = shift ? shift[i] : 0;
        for (int c = 0; c < n; c++)
            sum += Phi[i * n + c] * was[c];
        v[i] = sum;
    }
}

static bool is_sound(const struct kf *f)
{
    const double *ud = f->v + f->n;
    bool is_finite = true;
    for (int i = 0; i < f->n; i++)
        is_finite = is_finite && real_is_finite(f->v[i]) &&
                    real_is_finite(ud[UD_AT(i, i)]);
    return is_finite;
}

void joined_predict(const struct rig_kind *kind, struct kf_work *w,
                    const struct kf *from, int64_t dt_ns, struct kf *to)
{
    int n = kind->n;
    const struct kept *k = transition(kind, w->joined, dt_ns);
    double *V = w->W + n * n, D[UD_MAX];
    for (int i = 0; i < n; i++)
        D[i] = from->v[n + UD_AT(i, i)];
    spread(n, k->Phi, from->v + n, w->joined->U, w->W);
    memcpy(V, k->Qu, (size_t)(n * n) * sizeof *V);
    size_t kept = (size_t)n + UD_SIZE((size_t)n) + (size_t)(n * from->n_free);
    if (to != from)
        memcpy(to->v, from->v, kept * sizeof *to->v);
    to->n = n;
    to->n_free = from->n_free;
    to->t_ns = from->t_ns + dt_ns;
    move(n, k->Phi, k->shift, w->x, kf_x(to)); /* x = Phi x + shift */
    for (int c = 0; c < to->n_free; c++)
        move(n, k->Phi, NULL, w->x, kf_B(to) + n * c); /* B = Phi B */
    ud_predict(n, false, w->W, V, D, k->Qd, kf_ud(to));
    if (!is_sound(to))
        kf_forget(kind, to);
}
