/* SPDX-License-Identifier: Apache-2.0 */
#include "core/model/block.h"

#include <math.h>

#include "core/math/real.h"

int block_states(enum block_model model)
{
    switch (model) {
    case BLOCK_CONSTANT:
    case BLOCK_RANDOM_WALK:
    case BLOCK_GAUSS_MARKOV:
    case BLOCK_LAG:
        return 1;
    case BLOCK_CONSTANT_VELOCITY:
    case BLOCK_OSCILLATOR:
        return 2;
    case BLOCK_CONSTANT_ACCELERATION:
    case BLOCK_SINGER:
        return 3;
    case BLOCK_LINEAR:
        break;
    }
    return 0;
}

bool block_is_general(enum block_model model)
{
    return model == BLOCK_OSCILLATOR || model == BLOCK_SINGER ||
           model == BLOCK_LINEAR || model == BLOCK_LAG;
}

bool block_is_stationary(const struct block *b, int i, double *mean, double *u)
{
    double w = b->omega_rad_s;
    *mean = i == 0 ? b->mean : 0;
    if (b->model == BLOCK_GAUSS_MARKOV ||
        (b->model == BLOCK_SINGER && i == 2)) {
        *u = sqrt(b->q * b->tau_s / 2); /* u^2 = q tau / 2       */
        return true;
    }
    if (b->model != BLOCK_OSCILLATOR || !(b->zeta > 0))
        return false;
    *u = sqrt(b->q / (4 * b->zeta * w)) / (i == 0 ? w : 1);
    return true;
}

void block_system(const struct block *b, int stride, double *A, double *W,
                  double *c)
{
    int last = b->n - 1;
    for (int i = 0; i < b->n; i++) {
        c[i] = 0;
        for (int j = 0; j < b->n; j++) {
            A[i * stride + j] = j == i + 1;
            W[i * stride + j] = 0;
        }
    }
    W[last * stride + last] = b->q;
    if (b->model == BLOCK_OSCILLATOR) {
        double w = b->omega_rad_s;
        A[stride] = -w * w;
        A[stride + 1] = -2 * b->zeta * w;
        c[1] = w * w * b->mean;
    } else if (b->model == BLOCK_GAUSS_MARKOV || b->model == BLOCK_SINGER ||
               b->model == BLOCK_LAG) {
        A[last * stride + last] = -1 / b->tau_s;
        c[last] = b->mean / b->tau_s;
    }
}

static void scalar(struct transition *t, int i, double phi, double q)
{
    t->Phi[i * t->n + i] = phi;
    t->Qu[i * t->n + i] = 1;
    t->Qd[i] = q;
}

/* Phi = [1 T; 0 1],  Q = q [T^3/3 T^2/2; T^2/2 T] = Qu diag(q T^3/12, q T) Qu'
 * with Qu = [1 T/2; 0 1]. */
static void velocity(const struct block *b, double T, struct transition *t)
{
    int n = t->n;
    double *Phi = t->Phi + b->at * n + b->at, *Qu = t->Qu + b->at * n + b->at;
    double qT = b->q * T;
    Phi[0] = 1;
    Phi[1] = T;
    Phi[n] = 0;
    Phi[n + 1] = 1;
    Qu[0] = 1;
    Qu[1] = T / 2;
    Qu[n] = 0;
    Qu[n + 1] = 1;
    t->Qd[b->at] = qT * T * T * (1.0 / 12);
    t->Qd[b->at + 1] = qT;
}

/* Phi = [1 T T^2/2; 0 1 T; 0 0 1],  Q = q [T^5/20 T^4/8 T^3/6; . T^3/3 T^2/2;
 * . . T] = Qu diag(q T^5/720, q T^3/12, q T) Qu' with
 * Qu = [1 T/2 T^2/6; 0 1 T/2; 0 0 1]. */
static void acceleration(const struct block *b, double T, struct transition *t)
{
    int n = t->n;
    double *Phi = t->Phi + b->at * n + b->at, *Qu = t->Qu + b->at * n + b->at;
    double qT = b->q * T, T2 = T * T;
    for (int i = 0; i < 3; i++)
        for (int j = 0; j < 3; j++)
            Phi[i * n + j] = Qu[i * n + j] = i == j ? 1 : 0;
    Phi[1] = Phi[n + 2] = T;
    Phi[2] = T2 / 2;
    Qu[1] = Qu[n + 2] = T / 2;
    Qu[2] = T2 * (1.0 / 6);
    t->Qd[b->at] = qT * T2 * T2 * (1.0 / 720);
    t->Qd[b->at + 1] = qT * T2 * (1.0 / 12);
    t->Qd[b->at + 2] = qT;
}

/* Phi = e^(-T/tau),  Q = q tau/2 (1 - e^(-2T/tau)). */
static void gauss_markov(const struct block *b, double T, struct transition *t)
{
    double x = T / b->tau_s;
    scalar(t, b->at, real_exp(-x), -b->q * b->tau_s / 2 * real_expm1(-2 * x));
}

void block_transition(const struct block *b, double dt_s, struct transition *t)
{
    switch (b->model) {
    case BLOCK_CONSTANT:
        scalar(t, b->at, 1, 0);
        break;
    case BLOCK_RANDOM_WALK:
        scalar(t, b->at, 1, b->q * dt_s);
        break;
    case BLOCK_GAUSS_MARKOV:
        gauss_markov(b, dt_s, t);
        break;
    case BLOCK_CONSTANT_VELOCITY:
        velocity(b, dt_s, t);
        break;
    case BLOCK_CONSTANT_ACCELERATION:
        acceleration(b, dt_s, t);
        break;
    case BLOCK_OSCILLATOR:
    case BLOCK_SINGER:
    case BLOCK_LINEAR:
    case BLOCK_LAG: /* lti.h */
        break;
    }
}

void block_move(const struct block *b, const struct transition *t, double *x)
{
    double m = b->model == BLOCK_GAUSS_MARKOV ? b->mean : 0, was[3];
    double *x0 = x + b->at;
    for (int i = 0; i < b->n; i++)
        was[i] = x0[i] - m;
    for (int i = 0; i < b->n; i++) {
        const double *Phi = t->Phi + (b->at + i) * t->n + b->at;
        double sum = 0;
        for (int j = i; j < b->n; j++)
            sum += Phi[j] * was[j];
        x0[i] = m + sum; /* x = m + Phi (x - m)   */
    }
}
