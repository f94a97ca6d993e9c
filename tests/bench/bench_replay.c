/* Records per second of `ropewalk replay` beside an ideal loop: the mapped
 * file parsed by hand, decoded by hand, laid by a kernel that the compiler
 * knows.  usage: bench_replay [PATH OF ropewalk] */
/* SPDX-License-Identifier: Apache-2.0 */
#include <fcntl.h>
#include <math.h>
#include <sys/mman.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>

#include "core/wire/pcap.h"
#include "tests/bench/bench.h"
#include "tests/bench/ideal.h"

#ifndef __clang__ /* see bench_filter.c */
#pragma GCC optimize("no-tree-slp-vectorize")
#endif
#define AXES   2
#define LEVELS 2
#define KERNEL ideal_4_2
#include "tests/bench/kernels.h"

enum { RECORDS = 1000000, TRACKS = 16, ROUNDS = 7 };
#define BEGIN_NS ((int64_t)1700000000 * 1000000000)
#define EVERY_NS 100000 /* between records */

static const double limit = 0.40; /* the final goal is 0.75 */

static const char rig[] =
    "{\"order\": {\"horizon\": \"50 ms\", \"ahead\": \"50 ms\"},"
    " \"limits\": {\"tracks\": 16, \"ids_per_sender\": 16}," BENCH_TRACKS
    " \"rate\": \"1 kHz\"}}}\n";

static char folder[] = "/tmp/bench_replay.XXXXXX";
static char rig_path[64], capture_path[64];

/* --- the capture -------------------------------------------------------------
 */

static void write_rig(void)
{
    FILE *to = fopen(rig_path, "w");
    BENCH_NEEDS(to != NULL, rig_path);
    BENCH_NEEDS(fputs(rig, to) >= 0 && fclose(to) == 0, rig_path);
}

static void write_capture(void)
{
    struct sender from = {4, {127, 0, 0, 1}, 40000};
    struct sender to = {4, {127, 0, 0, 1}, 8410};
    uint8_t head[PCAP_RECORD_HEAD_MAX], body[BENCH_DATAGRAM_MAX];
    uint8_t file_head[PCAP_FILE_HEAD_SIZE];
    FILE *file = fopen(capture_path, "wb");
    BENCH_NEEDS(file != NULL, capture_path);
    pcap_write_file_head(file_head);
    fwrite(file_head, sizeof file_head, 1, file);
    for (int i = 0; i < RECORDS; i++) {
        int64_t a_ns = BEGIN_NS + (int64_t)i * EVERY_NS;
        double phase = 1e-5 * i;
        size_t len =
            bench_datagram(body, i % TRACKS, a_ns - 300000, (uint32_t)i,
                           3 * sin(phase), 3 * cos(phase));
        size_t n = pcap_write_record_head(head, a_ns, &from, &to, body, len);
        fwrite(head, n, 1, file);
        fwrite(body, len, 1, file);
    }
    BENCH_NEEDS(!ferror(file) && fclose(file) == 0, capture_path);
}

/* --- the ideal
 * ---------------------------------------------------------------- */

struct track {
    struct ideal_4_2_state s;
    int64_t t_ns;
    bool is_born;
};

static void lay(struct track *t, const struct ideal_measurement *m)
{
    if (!t->is_born) {
        memset(t, 0, sizeof *t);
        t->is_born = true;
        t->s.x[0] = m->z[0];
        t->s.x[2] = m->z[1];
        for (int i = 0; i < 4; i++)
            t->s.D[i] = i % 2 == 0 ? BENCH_R : 100;
    } else {
        ideal_4_2_step(&t->s, m->z, BENCH_R, BENCH_Q,
                       (double)(m->t_ns - t->t_ns) * 1e-9);
    }
    t->t_ns = m->t_ns;
}

static uint32_t little(const uint8_t *at)
{
    uint32_t value;
    memcpy(&value, at, sizeof value);
    return le32toh(value);
}

/* IPv4 and UDP to our port; the payload and its length. */
static const uint8_t *payload(const uint8_t *ip, size_t len, size_t *out)
{
    size_t head = (size_t)(ip[0] & 0x0f) * 4;
    if (len < head + 8 || ip[0] >> 4 != 4 || ip[9] != 17)
        return NULL;
    const uint8_t *udp = ip + head;
    if ((udp[2] << 8 | udp[3]) != 8410)
        return NULL;
    *out = (size_t)(udp[4] << 8 | udp[5]) - 8;
    return *out <= len - head - 8 ? udp + 8 : NULL;
}

/* CPU ns per record. */
static double run_ideal(void)
{
    static struct track track[TRACKS];
    memset(track, 0, sizeof track);
    int64_t begin_ns = bench_cpu_ns();
    int fd = open(capture_path, O_RDONLY);
    struct stat about;
    BENCH_NEEDS(fd >= 0 && fstat(fd, &about) == 0, capture_path);
    size_t size = (size_t)about.st_size, at = PCAP_FILE_HEAD_SIZE;
    uint8_t *bytes = mmap(NULL, size, PROT_READ, MAP_PRIVATE, fd, 0);
    BENCH_NEEDS(bytes != MAP_FAILED, "mmap");
    int n = 0;
    while (size - at >= 16) {
        size_t len = little(bytes + at + 8), body_len;
        struct ideal_measurement m = {0};
        if (size - at - 16 < len)
            break;
        const uint8_t *body = payload(bytes + at + 16, len, &body_len);
        if (body != NULL && ideal_decode(body, body_len, &m)) {
            lay(&track[m.track % TRACKS], &m);
            n++;
        }
        at += 16 + len;
    }
    munmap(bytes, size);
    close(fd);
    double took_ns = (double)(bench_cpu_ns() - begin_ns);
    BENCH_NEEDS(n == RECORDS && fabs(track[0].s.x[0]) < 10, "ideal loop");
    return took_ns / RECORDS;
}

/* --- ours
 * ---------------------------------------------------------------------- */

static double cpu_of(const struct rusage *use)
{
    return 1e9 * (double)(use->ru_utime.tv_sec + use->ru_stime.tv_sec) +
           1e3 * (double)(use->ru_utime.tv_usec + use->ru_stime.tv_usec);
}

static double run_ours(const char *tool, double *wall_ns)
{
    int64_t begin_ns = bench_clock_ns(CLOCK_MONOTONIC);
    pid_t pid = fork();
    BENCH_NEEDS(pid >= 0, "fork");
    if (pid == 0) {
        int null = open("/dev/null", O_WRONLY);
        dup2(null, STDOUT_FILENO);
        dup2(null, STDERR_FILENO);
        execl(tool, "ropewalk", "replay", rig_path, capture_path, "--stream",
              "none", (char *)NULL);
        _exit(127);
    }
    struct rusage use;
    int code;
    BENCH_NEEDS(wait4(pid, &code, 0, &use) == pid, "wait");
    if (!WIFEXITED(code) || WEXITSTATUS(code) != 0) {
        fprintf(stderr, "%s replay ended with %d\n", tool, code);
        exit(1);
    }
    *wall_ns = (double)(bench_clock_ns(CLOCK_MONOTONIC) - begin_ns) / RECORDS;
    return cpu_of(&use) / RECORDS;
}

static void clean(void)
{
    unlink(rig_path);
    unlink(capture_path);
    rmdir(folder);
}

int main(int argc, char **argv)
{
    const char *tool = bench_program(argc > 1 ? argv[1] : NULL, "ropewalk");
    double a[ROUNDS], b[ROUNDS], wall[ROUNDS];
    BENCH_NEEDS(mkdtemp(folder) != NULL, folder);
    snprintf(rig_path, sizeof rig_path, "%s/rig.json", folder);
    snprintf(capture_path, sizeof capture_path, "%s/a.pcap", folder);
    atexit(clean);
    write_rig();
    write_capture();
    for (int i = 0; i < ROUNDS; i++) {
        a[i] = run_ideal();
        b[i] = run_ours(tool, &wall[i]);
    }
    double ideal_ns = bench_least(a, ROUNDS), ours_ns = bench_least(b, ROUNDS);
    printf("%d records, CPU ns per record, least of %d: ideal %.0f, replay "
           "%.0f (%.0f records/s by the clock)\n",
           RECORDS, ROUNDS, ideal_ns, ours_ns,
           1e9 / bench_median(wall, ROUNDS));
    double ratio = ideal_ns / ours_ns;
    bench_verdict("bench_replay", ratio, limit, ratio >= limit);
    return 0;
}
