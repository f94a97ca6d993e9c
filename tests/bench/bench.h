/* bench.h - clocks, medians and verdicts of the benches.
 *
 * Every bench compares with something ideal that runs interleaved in the same
 * minute, by CPU time, and judges the ratio of the medians: a busy machine
 * slows both. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_BENCH_BENCH_H
#define TESTS_BENCH_BENCH_H

#include <stdbool.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

/* A process that cannot run is no verdict: exit status 1. */
#define BENCH_NEEDS(condition, what)                                           \
    do {                                                                       \
        if (!(condition)) {                                                    \
            perror(what);                                                      \
            exit(1);                                                           \
        }                                                                      \
    } while (0)

static inline int64_t bench_clock_ns(clockid_t clock)
{
    struct timespec t;
    BENCH_NEEDS(clock_gettime(clock, &t) == 0, "clock");
    return (int64_t)t.tv_sec * 1000000000 + t.tv_nsec;
}

static inline int64_t bench_cpu_ns(void)
{
    return bench_clock_ns(CLOCK_PROCESS_CPUTIME_ID);
}

static inline int bench_compare(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* Sorts v. */
static inline double bench_median(double *v, int n)
{
    qsort(v, (size_t)n, sizeof *v, bench_compare);
    return n % 2 == 1 ? v[n / 2] : (v[n / 2 - 1] + v[n / 2]) / 2;
}

/* Other work on the machine only adds to CPU time: the least of several rounds
 * is nearest to what the code costs. */
static inline double bench_least(const double *v, int n)
{
    double least = v[0];
    for (int i = 1; i < n; i++)
        least = v[i] < least ? v[i] : least;
    return least;
}

static inline void bench_verdict(const char *name, double ratio, double limit,
                                 bool is_good)
{
    printf("%s ratio %.2f limit %.2f: %s\n", name, ratio, limit,
           is_good ? "ok" : "MISSED");
}

/* A program of the same build: beside this one, unless `given` is. */
static inline const char *bench_program(const char *given, const char *name)
{
    static char path[4096];
    if (given != NULL)
        return given;
    ssize_t len = readlink("/proc/self/exe", path, sizeof path - 256);
    BENCH_NEEDS(len > 0, "/proc/self/exe");
    path[len] = '\0';
    char *slash = strrchr(path, '/');
    snprintf(slash + 1, 256, "%s", name);
    BENCH_NEEDS(access(path, X_OK) == 0, path);
    return path;
}

/* --- a measurement on the wire -----------------------------------------------
 */

enum { BENCH_DATAGRAM_MAX = 96 };

static inline uint8_t *bench_put(uint8_t *at, int head, uint64_t value,
                                 int n_bytes)
{
    *at++ = (uint8_t)head;
    for (int shift = 8 * (n_bytes - 1); shift >= 0; shift -= 8)
        *at++ = (uint8_t)(value >> shift);
    return at;
}

static inline uint8_t *bench_put_text(uint8_t *at, const char *text)
{
    size_t len = strlen(text);
    *at++ = (uint8_t)(0xa0 | len);
    memcpy(at, text, len);
    return at + len;
}

static inline uint8_t *bench_put_number(uint8_t *at, double value)
{
    uint64_t bits;
    memcpy(&bits, &value, sizeof bits);
    return bench_put(at, 0xcb, bits, 8);
}

/* {"sensor": "fix", "track": "t-NNN", "ns", "seq", "z": [x, y]} in
 * MessagePack; returns its length, the same for all. */
static inline size_t bench_datagram(uint8_t out[BENCH_DATAGRAM_MAX], int track,
                                    int64_t t_ns, uint32_t seq, double x,
                                    double y)
{
    char id[8] = {'t',
                  '-',
                  (char)('0' + track / 100 % 10),
                  (char)('0' + track / 10 % 10),
                  (char)('0' + track % 10),
                  0};
    uint8_t *at = out;
    *at++ = 0x85;
    at = bench_put_text(bench_put_text(at, "sensor"), "fix");
    at = bench_put_text(bench_put_text(at, "track"), id);
    at = bench_put(bench_put_text(at, "ns"), 0xcf, (uint64_t)t_ns, 8);
    at = bench_put(bench_put_text(at, "seq"), 0xce, seq, 4);
    at = bench_put_text(at, "z");
    *at++ = 0x92;
    at = bench_put_number(bench_put_number(at, x), y);
    return (size_t)(at - out);
}

/* What the rig of these measurements says: two constant-velocity axes a
 * track.  Head and tail of the file are the caller's. */
#define BENCH_Q 1.0
#define BENCH_R 0.01 /* u = 0.1 m */
#define BENCH_TRACKS                                                           \
    "\"tracks\": {\"t-*\": {\"state\": ["                                      \
    "{\"model\": \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\","     \
    " \"q\": \"1 m2/s3\"},"                                                    \
    "{\"model\": \"constant-velocity\", \"name\": \"y\", \"unit\": \"m\","     \
    " \"q\": \"1 m2/s3\"}]}},"                                                 \
    "\"sensors\": {\"fix\": {\"track\": \"t-*\", \"reads\": [\"x\", \"y\"],"   \
    " \"unit\": \"m\", \"u\": \"0.1 m\", \"gate\": \"off\","

#endif
