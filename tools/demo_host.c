/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/demo_host.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <stdlib.h>
#include <string.h>
#include <sys/prctl.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

#include "config/textpos.h"
#include "tools/rehearsal.h"

enum {
    FILE_BYTES_MAX = 4 << 20,
    START_WAIT_MS = 15000, /* for the daemon to serve                     */
    STOP_WAIT_MS = 15000,
    PAUSE_MS = 20
};

#define ANY_PORT "\"127.0.0.1:0\""

static void pause_once(void)
{
    struct timespec pause = {0, PAUSE_MS * 1000000L};
    nanosleep(&pause, NULL);
}

/* "FOLDER/NAME"; false when it does not fit. */
static bool join(char *out, const char *folder, const char *name)
{
    int n = snprintf(out, SETTINGS_PATH_SIZE, "%s/%s", folder, name);
    return n > 0 && n < SETTINGS_PATH_SIZE;
}

/* The folder of this program. */
static bool own_folder(char *out)
{
    ssize_t len = readlink("/proc/self/exe", out, SETTINGS_PATH_SIZE - 1);
    if (len <= 0)
        return false;
    out[len] = '\0';
    char *slash = strrchr(out, '/');
    if (slash != NULL)
        *slash = '\0';
    return slash != NULL;
}

/* --- files ---------------------------------------------------------------- */

static char *read_file(const char *path, size_t *len)
{
    FILE *from = fopen(path, "rb");
    char *text = from == NULL ? NULL : calloc(FILE_BYTES_MAX + 1, 1);
    if (text != NULL)
        *len = fread(text, 1, FILE_BYTES_MAX, from);
    if (from != NULL)
        fclose(from);
    return text;
}

static bool write_file(const char *path, const char *text, size_t len)
{
    FILE *to = fopen(path, "wb");
    if (to == NULL)
        return false;
    bool is_ok = fwrite(text, 1, len, to) == len;
    return fclose(to) == 0 && is_ok;
}

/* The text with the address at tree.room.key replaced by one whose port the
 * system chooses; the caller frees it.  NULL when there is none. */
static char *open_port(const char *text, size_t *len, const char *room,
                       const char *key)
{
    char *plain = calloc(*len + 1, 1), *out = NULL;
    cJSON *tree = NULL;
    if (plain == NULL)
        return NULL;
    memcpy(plain, text, *len);
    if (textpos_strip(plain, *len) == TEXTPOS_NONE)
        tree = cJSON_ParseWithLength(plain, *len);
    if (tree != NULL)
        textpos_mark(tree, plain);
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(
        cJSON_GetObjectItemCaseSensitive(tree, room), key);
    if (cJSON_IsString(value)) {
        size_t at = (size_t)value->valueint, size = *len + sizeof ANY_PORT;
        size_t end = at + 1 + strcspn(plain + at + 1, "\"") + 1;
        out = calloc(size, 1);
        if (out != NULL)
            *len = (size_t)snprintf(out, size, "%.*s" ANY_PORT "%s", (int)at,
                                    text, text + end);
    }
    cJSON_Delete(tree);
    free(plain);
    return out;
}

static int copy_rig(const struct call *call, const struct demo_host *h,
                    const char *from)
{
    size_t len = 0;
    char *text = read_file(from, &len);
    char *one = text == NULL ? NULL : open_port(text, &len, "receive", "udp");
    char *both = one == NULL ? NULL : open_port(one, &len, "serve", "tcp");
    int code = EXIT_FINE;
    if (text == NULL) {
        call_say(call, "%s: %s", from, strerror(errno));
        code = EXIT_NOT_THERE;
    } else if (both == NULL) {
        call_say(call, "%s: needs receive.udp and serve.tcp; add them", from);
        code = EXIT_BAD_SETTINGS;
    } else if (!write_file(h->rig, both, len)) {
        call_say(call, "%s: %s", h->rig, strerror(errno));
        code = EXIT_PROBLEM;
    }
    free(text);
    free(one);
    free(both);
    return code;
}

static int copy_rehearsal(const struct call *call, const struct demo_host *h,
                          const char *rig)
{
    char from[SETTINGS_PATH_SIZE];
    size_t len = 0;
    char *text =
        rehearsal_path(rig, from, sizeof from) ? read_file(from, &len) : NULL;
    int code = EXIT_FINE;
    if (text == NULL) {
        call_say(call, "%s: %s; the demo needs it beside the rig file", from,
                 strerror(errno));
        code = EXIT_NOT_THERE;
    } else if (!write_file(h->rehearsal, text, len)) {
        call_say(call, "%s: %s", h->rehearsal, strerror(errno));
        code = EXIT_PROBLEM;
    }
    free(text);
    return code;
}

/* --- where things are ----------------------------------------------------- */

/* A file as it is named, or NAME.json among the rigs that came with the
 * program. */
static bool find_rig(const char *rig, char *out)
{
    static const char *const places[] = {"../share/ropewalk/rigs",
                                         "../config/rigs", "../../config/rigs"};
    char own[SETTINGS_PATH_SIZE], name[2 * RIG_ID_SIZE + 64];
    snprintf(out, SETTINGS_PATH_SIZE, "%s", rig);
    if (access(out, R_OK) == 0)
        return true;
    if (strchr(rig, '/') != NULL || strlen(rig) >= RIG_ID_SIZE)
        return false;
    for (size_t i = 0; i < sizeof places / sizeof *places; i++) {
        snprintf(name, sizeof name, "%s/%s.json", places[i], rig);
        if (own_folder(own) && join(out, own, name) && access(out, R_OK) == 0)
            return true;
    }
    snprintf(out, SETTINGS_PATH_SIZE, "config/rigs/%s.json", rig);
    return access(out, R_OK) == 0;
}

/* Names in the folder: the rig's own, and its companions'. */
static bool name_files(struct demo_host *h, const char *rig)
{
    const char *slash = strrchr(rig, '/');
    return join(h->rig, h->folder, slash == NULL ? rig : slash + 1) &&
           rehearsal_path(h->rig, h->rehearsal, sizeof h->rehearsal) &&
           join(h->log, h->folder, "ropewalkd.log");
}

static void default_folder(char *out)
{
    time_t now = time(NULL);
    struct tm utc;
    gmtime_r(&now, &utc);
    strftime(out, SETTINGS_PATH_SIZE, "ropewalk-demo-%Y%m%dT%H%M%SZ", &utc);
}

int demo_host_prepare(const struct call *call, struct demo_host *h,
                      const char *rig, const char *folder)
{
    char found[SETTINGS_PATH_SIZE], own[SETTINGS_PATH_SIZE];
    memset(h, 0, sizeof *h);
    if (!find_rig(rig, found)) {
        call_say(call,
                 "%s: no such file, and no rig of that name came with "
                 "the program; name a file",
                 rig);
        return EXIT_NOT_THERE;
    }
    if (!own_folder(own) || !join(h->daemon, own, "ropewalkd") ||
        access(h->daemon, X_OK) != 0) {
        call_say(call,
                 "%s: the daemon is not there; install it beside this "
                 "program",
                 h->daemon);
        return EXIT_NOT_THERE;
    }
    if (folder == NULL)
        default_folder(h->folder);
    else
        snprintf(h->folder, sizeof h->folder, "%s", folder);
    if (mkdir(h->folder, 0755) != 0) {
        call_say(call, "%s: %s; name another with --folder", h->folder,
                 strerror(errno));
        return EXIT_PROBLEM;
    }
    if (!name_files(h, found)) {
        call_say(call, "%s: the name is too long", h->folder);
        return EXIT_WRONG_USE;
    }
    int code = copy_rig(call, h, found);
    return code == EXIT_FINE ? copy_rehearsal(call, h, found) : code;
}

/* --- the daemon ----------------------------------------------------------- */

/* It gets a process group of its own, so that Ctrl-C reaches only us and we
 * stop it in order; if we are killed it stops too. */
static void become_daemon(const struct demo_host *h, const char *port_file)
{
    int log = open(h->log, O_WRONLY | O_CREAT | O_TRUNC | O_CLOEXEC, 0644);
    setpgid(0, 0);
    prctl(PR_SET_PDEATHSIG, SIGTERM);
    if (log >= 0 && dup2(log, STDOUT_FILENO) >= 0 &&
        dup2(log, STDERR_FILENO) >= 0)
        execl(h->daemon, "ropewalkd", h->rig, "--port-file", port_file,
              (char *)NULL);
    _exit(127);
}

static bool read_ports(struct demo_host *h, const char *port_file)
{
    size_t len = 0;
    char *text = read_file(port_file, &len);
    cJSON *tree = text == NULL ? NULL : cJSON_Parse(text);
    const cJSON *udp = cJSON_GetObjectItemCaseSensitive(tree, "udp");
    const cJSON *tcp = cJSON_GetObjectItemCaseSensitive(tree, "tcp");
    const char *capture =
        cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(tree, "capture"));
    h->udp_port = cJSON_IsNumber(udp) ? (int)udp->valuedouble : 0;
    h->tcp_port = cJSON_IsNumber(tcp) ? (int)tcp->valuedouble : 0;
    snprintf(h->capture, sizeof h->capture, "%s",
             capture == NULL ? "" : capture);
    cJSON_Delete(tree);
    free(text);
    return h->udp_port > 0 && h->tcp_port > 0;
}

bool demo_host_lives(struct demo_host *h)
{
    if (h->pid > 0 && waitpid(h->pid, NULL, WNOHANG) == h->pid)
        h->pid = 0;
    return h->pid > 0;
}

/* The last lines of the daemon's log, where it says why. */
static void show_log(const struct demo_host *h)
{
    size_t len = 0;
    char *text = read_file(h->log, &len);
    if (text != NULL)
        fprintf(stderr, "%s", len > 2000 ? text + len - 2000 : text);
    free(text);
}

int demo_host_start(const struct call *call, struct demo_host *h)
{
    char port_file[SETTINGS_PATH_SIZE];
    if (!join(port_file, h->folder, "ports.json"))
        return EXIT_PROBLEM;
    h->pid = fork();
    if (h->pid == 0)
        become_daemon(h, port_file);
    if (h->pid < 0) {
        h->pid = 0;
        call_say(call, "%s: %s", h->daemon, strerror(errno));
        return EXIT_PROBLEM;
    }
    for (int ms = 0; ms < START_WAIT_MS && demo_host_lives(h); ms += PAUSE_MS) {
        if (access(port_file, R_OK) == 0 && read_ports(h, port_file))
            return EXIT_FINE;
        pause_once();
    }
    call_say(call, "%s does not serve; its log %s says:", h->daemon, h->log);
    show_log(h);
    return EXIT_PROBLEM;
}

bool demo_host_stop(struct demo_host *h)
{
    int result = 0;
    if (!demo_host_lives(h))
        return false;
    kill(h->pid, SIGTERM);
    for (int ms = 0; ms < STOP_WAIT_MS; ms += PAUSE_MS) {
        if (waitpid(h->pid, &result, WNOHANG) == h->pid) {
            h->pid = 0;
            return WIFEXITED(result) && WEXITSTATUS(result) == 0;
        }
        pause_once();
    }
    kill(h->pid, SIGKILL);
    waitpid(h->pid, NULL, 0);
    h->pid = 0;
    return false;
}
