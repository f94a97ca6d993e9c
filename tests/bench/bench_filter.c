/* ns per kf_predict + kf_update beside ideal kernels of the same form. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <math.h>

#include "core/filter/kf.h"
#include "tests/bench/bench.h"
/* Packing two doubles that were just stored apart stalls: without it the ideal
 * is faster. */
#ifndef __clang__
#pragma GCC optimize("no-tree-slp-vectorize")
#endif

#define AXES   1
#define LEVELS 2
#define KERNEL ideal_2_1
#include "tests/bench/kernels.h"
#define AXES   2
#define LEVELS 2
#define KERNEL ideal_4_2
#include "tests/bench/kernels.h"
#define AXES   3
#define LEVELS 2
#define KERNEL ideal_6_3
#include "tests/bench/kernels.h"
#define AXES   3
#define LEVELS 3
#define KERNEL ideal_9_3
#include "tests/bench/kernels.h"
#define AXES   6
#define LEVELS 2
#define KERNEL ideal_12_6
#include "tests/bench/kernels.h"

enum { TRACKS = 16, STEPS = 4000, ROUNDS = 9, DTS = 8, LIMIT_TENTHS = 25 };

static const double q = 1, r = 0.01;

/* Steps that differ, so that nothing can be kept from one to the next. */
static int64_t dt_ns(int i)
{
    return 100000000 + (int64_t)(i % DTS) * 1000003;
}

/* The same for all tracks of a step: what is timed is the filter. */
static void measure(int i, int axes, double *z)
{
    for (int k = 0; k < axes; k++)
        z[k] = 0.3 * k + 1e-3 * (double)(i % 13);
}

/* --- the ideal -------------------------------------------------------------
 */

enum { STATES_MAX = 12 };

/* CPU ns per step; x and D get the end of track 0. */
#define RUN(kernel, n, axes)                                                   \
    static double kernel##_run(double *x, double *D)                           \
    {                                                                          \
        static struct kernel##_state s[TRACKS];                                \
        double z[READS_MAX];                                                   \
        memset(s, 0, sizeof s);                                                \
        for (int k = 0; k < TRACKS; k++)                                       \
            for (int i = 0; i < (n); i++)                                      \
                s[k].D[i] = 100;                                               \
        int64_t begin_ns = bench_cpu_ns();                                     \
        for (int i = 0; i < STEPS; i++) {                                      \
            int64_t step_ns = dt_ns(i);                                        \
            measure(i, axes, z);                                               \
            for (int k = 0; k < TRACKS; k++)                                   \
                kernel##_step(&s[k], z, r, q, (double)step_ns * 1e-9);         \
        }                                                                      \
        int64_t took_ns = bench_cpu_ns() - begin_ns;                           \
        memcpy(x, s[0].x, sizeof s[0].x);                                      \
        memcpy(D, s[0].D, sizeof s[0].D);                                      \
        return (double)took_ns / (STEPS * TRACKS);                             \
    }

RUN(ideal_2_1, 2, 1)
RUN(ideal_4_2, 4, 2)
RUN(ideal_6_3, 6, 3)
RUN(ideal_9_3, 9, 3)
RUN(ideal_12_6, 12, 6)

static const struct size {
    int axes, levels;
    double (*ideal)(double *x, double *D);
} sizes[] = {{1, 2, ideal_2_1_run},
             {2, 2, ideal_4_2_run},
             {3, 2, ideal_6_3_run},
             {3, 3, ideal_9_3_run},
             {6, 2, ideal_12_6_run}};
enum { N_SIZES = sizeof sizes / sizeof sizes[0] };

/* --- ours -------------------------------------------------------------------
 */

struct ours {
    struct rig_kind kind;
    struct reads reads;
    struct kf_work work;
    struct kf *f[TRACKS];
    double r[READS_MAX];
};

static void make_ours(struct ours *o, const struct size *size)
{
    memset(o, 0, sizeof *o);
    o->kind.n_blocks = size->axes;
    o->kind.n = size->axes * size->levels;
    o->reads.m = size->axes;
    for (int i = 0; i < size->axes; i++) {
        o->kind.block[i] = (struct block){
            .model = size->levels == 2 ? BLOCK_CONSTANT_VELOCITY
                                       : BLOCK_CONSTANT_ACCELERATION,
            .at = i * size->levels,
            .n = size->levels,
            .q = q};
        o->reads.row[i].kind = READS_LINEAR;
        o->reads.row[i].n_terms = 1;
        o->reads.row[i].term[0] = (struct reads_term){i * size->levels, 1};
        o->r[i] = r;
    }
    for (int i = 0; i < o->kind.n; i++) {
        o->kind.state[i].has_prior = true;
        o->kind.state[i].prior_u = 10;
    }
    rig_prepare_kind(&o->kind);
    for (int k = 0; k < TRACKS; k++) {
        o->f[k] = calloc(1, kf_bytes(&o->kind));
        BENCH_NEEDS(o->f[k] != NULL, "memory");
    }
}

static double run_ours(struct ours *o)
{
    double z[READS_MAX];
    struct kf_seen seen;
    for (int k = 0; k < TRACKS; k++)
        kf_birth(&o->kind, 0, o->f[k]);
    int64_t begin_ns = bench_cpu_ns();
    for (int i = 0; i < STEPS; i++) {
        int64_t step_ns = dt_ns(i);
        measure(i, o->reads.m, z);
        for (int k = 0; k < TRACKS; k++) {
            struct kf *f = o->f[k];
            kf_predict(&o->kind, &o->work, f, f->t_ns + step_ns, f);
            kf_update(&o->kind, &o->work, f, &o->reads, z, o->r, NULL, &seen);
        }
    }
    return (double)(bench_cpu_ns() - begin_ns) / (STEPS * TRACKS);
}

/* --- side by side ------------------------------------------------------------
 */

/* Both must have computed the same thing, or the ratio says nothing. */
static void compare(const struct ours *o, const double *x, const double *D)
{
    for (int i = 0; i < o->kind.n; i++) {
        double own_x = o->f[0]->v[i];
        double own_D = o->f[0]->v[o->kind.n + UD_AT(i, i)];
        if (fabs(own_x - x[i]) <= 1e-9 && fabs(own_D / D[i] - 1) <= 1e-9)
            continue;
        fprintf(stderr, "state %d: ours %.17g, ideal %.17g\n", i, own_x, x[i]);
        exit(1);
    }
}

static double side_by_side(const struct size *size)
{
    static struct ours ours;
    double a[ROUNDS], b[ROUNDS], x[STATES_MAX], D[STATES_MAX];
    make_ours(&ours, size);
    for (int i = 0; i < ROUNDS; i++) {
        a[i] = size->ideal(x, D);
        b[i] = run_ours(&ours);
        compare(&ours, x, D);
    }
    for (int k = 0; k < TRACKS; k++)
        free(ours.f[k]);
    double ideal_ns = bench_least(a, ROUNDS), ours_ns = bench_least(b, ROUNDS);
    printf("n %2d m %d: ideal %7.1f ns, ours %7.1f ns, ratio %.2f\n",
           size->axes * size->levels, size->axes, ideal_ns, ours_ns,
           ours_ns / ideal_ns);
    return ours_ns / ideal_ns;
}

int main(void)
{
    double worst = 0, limit = LIMIT_TENTHS / 10.0;
    printf("ns per step (predict and update, dt varying), least of %d\n",
           ROUNDS);
    for (int i = 0; i < N_SIZES; i++) {
        double ratio = side_by_side(&sizes[i]);
        worst = ratio > worst ? ratio : worst;
    }
    bench_verdict("bench_filter", worst, limit, worst <= limit);
    return 0;
}
