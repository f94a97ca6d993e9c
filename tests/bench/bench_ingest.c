/* CPU per datagram of the whole daemon (stamps, decoding, order, filter,
 * recorder) beside a bare sink that only receives in batches with stamps on
 * and decodes.  usage: bench_ingest [PATH OF ropewalkd]
 *
 * Both get the same datagrams at the same pace: bursts of 1024 at most, each
 * only when the kernel shows the receiver's socket queue empty, so nothing is
 * lost.  The sender has one core, the receivers (all threads of the daemon)
 * the other.
 *
 * Judged: a sender that merges 64 into one send (UDP_SEGMENT), so that it is
 * never the bottleneck, against a sink that takes single datagrams.  Printed
 * beside it: a sink that takes them merged (UDP_GRO) as the daemon does, and
 * a sender of single datagrams. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <arpa/inet.h>
#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <netinet/in.h>
#include <netinet/udp.h>
#include <sched.h>
#include <signal.h>
#include <sys/prctl.h>
#include <sys/socket.h>
#include <sys/wait.h>

#include "tests/bench/sink.h"

#ifndef UDP_SEGMENT
#define UDP_SEGMENT 103
#endif

enum {
    BATCH = SINK_BATCH,
    BURST = 16 * BATCH,
    TRACKS = 128,
    ROUNDS = 7,
    N_SINGLE = 256 * BURST,
    N_MERGED = 768 * BURST
};

static const double limit = 0.65; /* the final goal is 0.80 */
static char folder[] = "/tmp/bench_ingest.XXXXXX";

/* --- receivers as processes
 * ---------------------------------------------------- */

struct receiver {
    pid_t pid;
    int port;
    clockid_t cpu;
};

static void pin(size_t core)
{
    cpu_set_t set;
    CPU_ZERO(&set);
    CPU_SET(core, &set);
    BENCH_NEEDS(sched_setaffinity(0, sizeof set, &set) == 0, "two cores");
}

/* In a receiver's process: it ends with the bench. */
static void give_way(void)
{
    prctl(PR_SET_PDEATHSIG, SIGTERM);
    pin(1);
}

static void adopt(struct receiver *r)
{
    BENCH_NEEDS(clock_getcpuclockid(r->pid, &r->cpu) == 0, "cpu clock");
}

static void sink_start(struct receiver *r, bool is_merging)
{
    int fd = sink_socket(&r->port, is_merging);
    r->pid = fork();
    BENCH_NEEDS(r->pid >= 0, "fork");
    if (r->pid == 0) {
        give_way();
        sink_run(fd);
    }
    close(fd);
    adopt(r);
}

static const char *in_folder(const char *name)
{
    static char path[2][128];
    static int next;
    char *p = path[next++ % 2];
    snprintf(p, sizeof path[0], "%s/%s", folder, name);
    return p;
}

static void write_rig(void)
{
    const char *path = in_folder("rig.json");
    FILE *to = fopen(path, "w");
    BENCH_NEEDS(to != NULL, path);
    fprintf(
        to,
        "{\"receive\": {\"udp\": \"127.0.0.1:0\", \"buffer\": \"4 MiB\"},"
        " \"serve\": {\"tcp\": \"127.0.0.1:0\"},"
        " \"capture\": {\"folder\": \"captures\"},"
        " \"order\": {\"horizon\": \"20 ms\", \"ahead\": \"20 ms\"},"
        " \"limits\": {\"tracks\": %d, \"ids_per_sender\": %d}," BENCH_TRACKS
        " \"rate\": \"100 kHz\"}}}\n",
        TRACKS, TRACKS);
    BENCH_NEEDS(fclose(to) == 0, path);
}

static bool read_port(int *port)
{
    FILE *from = fopen(in_folder("ports"), "r");
    if (from == NULL)
        return false;
    bool ok = fscanf(from, "{\"udp\":%d", port) == 1;
    fclose(from);
    return ok;
}

static void daemon_start(struct receiver *r, const char *program)
{
    write_rig();
    r->pid = fork();
    BENCH_NEEDS(r->pid >= 0, "fork");
    if (r->pid == 0) {
        give_way();
        int log = open(in_folder("log"), O_WRONLY | O_CREAT | O_TRUNC, 0600);
        dup2(log, STDOUT_FILENO);
        dup2(log, STDERR_FILENO);
        execl(program, "ropewalkd", in_folder("rig.json"), "--port-file",
              in_folder("ports"), (char *)NULL);
        _exit(127);
    }
    for (int i = 0; !read_port(&r->port); i++) {
        if (i == 1000 || waitpid(r->pid, NULL, WNOHANG) == r->pid) {
            fprintf(stderr, "%s does not start; its words are in %s/log\n",
                    program, folder);
            exit(1);
        }
        usleep(10000);
    }
    adopt(r);
}

/* --- the receiver's queue, as the kernel sees it
 * ----------------------------------- */

struct queue {
    unsigned long bytes, drops;
};

/* The line of /proc/net/udp with our port. */
static struct queue queue_of(int port)
{
    static int fd = -1;
    static char text[1 << 16];
    struct queue q = {0, 0};
    char key[32];
    if (fd < 0)
        fd = open("/proc/net/udp", O_RDONLY);
    ssize_t len = pread(fd, text, sizeof text - 1, 0);
    BENCH_NEEDS(len > 0, "/proc/net/udp");
    text[len] = '\0';
    /* ": OWN-ADDRESS "; a sender's line has it as the other's */
    snprintf(key, sizeof key, ": 0100007F:%04X ", (unsigned)port);
    char *line = strstr(text, key);
    BENCH_NEEDS(line != NULL, "socket in /proc/net/udp");
    char *end = strchr(line, '\n');
    /* own address, the other's, state, bytes to send : waiting */
    BENCH_NEEDS(sscanf(line + 2, "%*s %*s %*s %*8x:%lx", &q.bytes) == 1, key);
    while (end > line && end[-1] == ' ')
        end--;
    char *last = end;
    while (last[-1] != ' ')
        last--;
    q.drops = strtoul(last, NULL, 10);
    return q;
}

/* --- the sender
 * ---------------------------------------------------------------------- */

struct sender_state {
    int fd;
    uint8_t bytes[BATCH * BENCH_DATAGRAM_MAX];
    struct mmsghdr message[BATCH];
    struct iovec piece[BATCH];
    uint32_t seq;
    size_t len;
};

static void sender_fill(struct sender_state *s)
{
    int64_t now_ns = bench_clock_ns(CLOCK_REALTIME);
    for (int i = 0; i < BATCH; i++, s->seq++) {
        uint8_t *at = s->bytes + (size_t)i * s->len;
        s->len = bench_datagram(at, (int)(s->seq % TRACKS), now_ns + 10 * i,
                                s->seq, 1 + 0.01 * (s->seq % 7), 2);
        s->piece[i] = (struct iovec){at, s->len};
    }
}

static void sender_open(struct sender_state *s, int port, bool is_merged)
{
    struct sockaddr_in to = {.sin_family = AF_INET,
                             .sin_port = htons((uint16_t)port),
                             .sin_addr.s_addr = htonl(INADDR_LOOPBACK)};
    uint8_t one[BENCH_DATAGRAM_MAX];
    s->len = bench_datagram(one, 0, 0, 0, 0, 0);
    s->fd = socket(AF_INET, SOCK_DGRAM, 0);
    BENCH_NEEDS(connect(s->fd, (struct sockaddr *)&to, sizeof to) == 0,
                "connect");
    for (int i = 0; i < BATCH; i++) {
        memset(&s->message[i], 0, sizeof s->message[i]);
        s->message[i].msg_hdr.msg_iov = &s->piece[i];
        s->message[i].msg_hdr.msg_iovlen = 1;
    }
    int segment = (int)s->len;
    BENCH_NEEDS(!is_merged || setsockopt(s->fd, IPPROTO_UDP, UDP_SEGMENT,
                                         &segment, sizeof segment) == 0,
                "UDP_SEGMENT");
}

static void sender_batch(struct sender_state *s, bool is_merged)
{
    sender_fill(s);
    if (is_merged) {
        while (send(s->fd, s->bytes, BATCH * s->len, 0) < 0)
            BENCH_NEEDS(errno == ENOBUFS || errno == EAGAIN, "send");
        return;
    }
    for (int sent = 0; sent < BATCH;) {
        int n = sendmmsg(s->fd, s->message + sent, (unsigned)(BATCH - sent), 0);
        BENCH_NEEDS(n > 0 || errno == ENOBUFS || errno == EAGAIN, "sendmmsg");
        sent += n > 0 ? n : 0;
    }
}

/* --- where the CPU goes
 * ------------------------------------------------------------------ */

enum { THREADS_MAX = 16 };

struct threads {
    int n;
    char name[THREADS_MAX][20];
    double ns[THREADS_MAX];
};

static bool read_line(int pid, const char *thread, const char *file, char *out,
                      size_t size)
{
    char path[320];
    snprintf(path, sizeof path, "/proc/%d/task/%s/%s", pid, thread, file);
    FILE *from = fopen(path, "r");
    bool ok = from != NULL && fgets(out, (int)size, from) != NULL;
    if (from != NULL)
        fclose(from);
    return ok;
}

/* CPU of every thread so far, in the order of the folder. */
static void read_threads(int pid, struct threads *t)
{
    char path[64], text[128];
    snprintf(path, sizeof path, "/proc/%d/task", pid);
    DIR *folder_of = opendir(path);
    t->n = 0;
    for (struct dirent *e; folder_of && (e = readdir(folder_of)) != NULL;) {
        if (e->d_name[0] == '.' || t->n == THREADS_MAX)
            continue;
        if (!read_line(pid, e->d_name, "comm", text, sizeof text))
            continue;
        snprintf(t->name[t->n], sizeof t->name[0], "%.*s",
                 (int)strcspn(text, "\n"), text);
        if (read_line(pid, e->d_name, "schedstat", text, sizeof text))
            t->ns[t->n++] = strtod(text, NULL);
    }
    if (folder_of)
        closedir(folder_of);
}

static void print_threads(const struct threads *before,
                          const struct threads *after, double n)
{
    printf("  of these by thread:");
    for (int i = 0; i < after->n && before->n == after->n; i++)
        printf(" %s %.0f ns", after->name[i],
               (after->ns[i] - before->ns[i]) / n);
    printf("\n");
}

/* --- a round
 * ---------------------------------------------------------------------------
 */

struct outcome_of_round {
    double cpu_ns, per_s; /* CPU per datagram; datagrams per second           */
};

static struct outcome_of_round run_round(const struct receiver *r,
                                         bool is_merged)
{
    static struct sender_state s;
    int n = is_merged ? N_MERGED : N_SINGLE; /* multiples of BURST */
    struct queue before = queue_of(r->port);
    sender_open(&s, r->port, is_merged);
    int64_t cpu_ns = bench_clock_ns(r->cpu);
    int64_t begin_ns = bench_clock_ns(CLOCK_MONOTONIC);
    for (int sent = 0; sent < n; sent += BURST) {
        for (int k = 0; k < BURST; k += BATCH)
            sender_batch(&s, is_merged);
        while (queue_of(r->port).bytes > 0)
            usleep(20);
    }
    int64_t end_ns = bench_clock_ns(CLOCK_MONOTONIC);
    usleep(100000); /* the last ones settle and are written */
    struct outcome_of_round o = {(double)(bench_clock_ns(r->cpu) - cpu_ns) / n,
                                 1e9 * n / (double)(end_ns - begin_ns)};
    close(s.fd);
    unsigned long drops = queue_of(r->port).drops - before.drops;
    if (drops > 0)
        fprintf(stderr, "%lu datagrams were dropped: not a fair round\n",
                drops);
    return o;
}

static double compare(const char *what, const struct receiver *sink,
                      const struct receiver *daemon, bool is_merged)
{
    double a[ROUNDS], b[ROUNDS], rate_a[ROUNDS], rate_b[ROUNDS];
    struct threads before, after;
    read_threads(daemon->pid, &before);
    for (int i = 0; i < ROUNDS; i++) {
        struct outcome_of_round o = run_round(sink, is_merged);
        a[i] = o.cpu_ns;
        rate_a[i] = o.per_s;
        o = run_round(daemon, is_merged);
        b[i] = o.cpu_ns;
        rate_b[i] = o.per_s;
    }
    double sink_ns = bench_median(a, ROUNDS);
    double daemon_ns = bench_median(b, ROUNDS);
    printf("%s: sink %.0f ns (%.0f/s), daemon %.0f ns (%.0f/s), sink/daemon "
           "%.2f; daemon %.2f M datagrams per CPU second\n",
           what, sink_ns, bench_median(rate_a, ROUNDS), daemon_ns,
           bench_median(rate_b, ROUNDS), sink_ns / daemon_ns, 1e3 / daemon_ns);
    read_threads(daemon->pid, &after);
    print_threads(&before, &after,
                  ROUNDS * (double)(is_merged ? N_MERGED : N_SINGLE));
    return sink_ns / daemon_ns;
}

/* --- life
 * --------------------------------------------------------------------------------
 */

static void clean(void)
{
    char command[160];
    snprintf(command, sizeof command, "rm -r '%s'", folder);
    if (system(command) != 0)
        fprintf(stderr, "%s is left behind\n", folder);
}

static void stop(const struct receiver *r, int signal_number)
{
    int code;
    kill(r->pid, signal_number);
    waitpid(r->pid, &code, 0);
}

/* What the daemon warned of. */
static void show_log(void)
{
    char line[512];
    FILE *from = fopen(in_folder("log"), "r");
    while (from && fgets(line, sizeof line, from))
        if (strstr(line, " warn ") != NULL)
            fprintf(stderr, "%s", line);
    if (from)
        fclose(from);
}

int main(int argc, char **argv)
{
    const char *program = bench_program(argc > 1 ? argv[1] : NULL, "ropewalkd");
    struct receiver sink, merging, daemon;
    BENCH_NEEDS(mkdtemp(folder) != NULL, folder);
    atexit(clean);
    pin(0);
    daemon_start(&daemon, program);
    sink_start(&sink, false);
    sink_start(&merging, true);
    printf("CPU per datagram, median of %d interleaved rounds\n", ROUNDS);
    double ratio = compare("64 in a send, bare sink   ", &sink, &daemon, true);
    compare("64 in a send, merging sink", &merging, &daemon, true);
    compare("one in a send, bare sink  ", &sink, &daemon, false);
    stop(&sink, SIGKILL);
    stop(&merging, SIGKILL);
    stop(&daemon, SIGTERM);
    show_log();
    bench_verdict("bench_ingest", ratio, limit, ratio >= limit);
    return 0;
}
