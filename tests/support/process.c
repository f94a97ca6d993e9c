/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/support/process.h"

#include <arpa/inet.h>
#include <cjson/cJSON.h>
#include <check.h>
#include <fcntl.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/socket.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

static void nap(long ms)
{
    nanosleep(&(struct timespec){ms / 1000, ms % 1000 * 1000000}, NULL);
}

void folder_make(char *path, size_t size)
{
    snprintf(path, size, "/tmp/ropewalk-test-XXXXXX");
    ck_assert_ptr_nonnull(mkdtemp(path));
}

void folder_remove(const char *path)
{
    char *argv[] = {"/bin/rm", "-rf", (char *)(size_t)path, NULL};
    if (strncmp(path, "/tmp/ropewalk-test-", 19) == 0)
        process_run(argv, NULL, NULL);
}

static void redirect(const char *path, int to)
{
    int fd =
        open(path ? path : "/dev/null", O_WRONLY | O_CREAT | O_TRUNC, 0644);
    if (fd >= 0)
        dup2(fd, to);
}

pid_t process_start(char *const argv[], const char *out, const char *err)
{
    fflush(NULL);
    pid_t pid = fork();
    ck_assert_int_ge(pid, 0);
    if (pid == 0) {
        redirect(out, STDOUT_FILENO);
        redirect(err, STDERR_FILENO);
        execv(argv[0], argv);
        _exit(127);
    }
    return pid;
}

int process_wait(pid_t pid, double seconds)
{
    int result;
    for (double waited = 0;; waited += 0.005) {
        pid_t got = waitpid(pid, &result, WNOHANG);
        if (got == pid)
            return WIFEXITED(result) ? WEXITSTATUS(result)
                                     : 1000 + WTERMSIG(result);
        if (waited >= seconds)
            return -1;
        nap(5);
    }
}

int process_run(char *const argv[], const char *out, const char *err)
{
    return process_wait(process_start(argv, out, err), 280);
}

struct daemon_ports daemon_start(const char *rig, const char *folder)
{
    struct daemon_ports d = {0};
    char ports[600], log[600], capture[700];
    snprintf(ports, sizeof ports, "%s/ports.json", folder);
    snprintf(log, sizeof log, "%s/daemon.log", folder);
    snprintf(capture, sizeof capture, "capture.folder=\"%s/captures\"", folder);
    unlink(ports);
    char *argv[] = {DAEMON_PATH,   (char *)(size_t)rig,
                    "--set",       "receive.udp=\"127.0.0.1:0\"",
                    "--set",       "serve.tcp=\"127.0.0.1:0\"",
                    "--set",       capture,
                    "--set",       "capture.floor=\"1 MiB\"",
                    "--port-file", ports,
                    NULL};
    d.pid = process_start(argv, NULL, log);
    for (int i = 0; access(ports, R_OK) != 0; i++) {
        int code = process_wait(d.pid, 0);
        char *text = code == -1 ? NULL : file_read(log, NULL);
        ck_assert_msg(code == -1 && i < 1000, "the daemon ended: %d\n%s", code,
                      text ? text : "");
        nap(10);
    }
    char *text = file_read(ports, NULL);
    cJSON *root = cJSON_Parse(text);
    ck_assert_ptr_nonnull(root);
    d.udp = cJSON_GetObjectItem(root, "udp")->valueint;
    d.tcp = cJSON_GetObjectItem(root, "tcp")->valueint;
    snprintf(d.capture, sizeof d.capture, "%s",
             cJSON_GetObjectItem(root, "capture")->valuestring);
    cJSON_Delete(root);
    free(text);
    return d;
}

static int connect_to(int port, int type)
{
    struct sockaddr_in at = {.sin_family = AF_INET,
                             .sin_port = htons((uint16_t)port),
                             .sin_addr = {htonl(INADDR_LOOPBACK)}};
    int fd = socket(AF_INET, type, 0);
    ck_assert_int_ge(fd, 0);
    ck_assert_int_eq(connect(fd, (struct sockaddr *)&at, sizeof at), 0);
    return fd;
}

int connect_tcp(int port)
{
    return connect_to(port, SOCK_STREAM);
}

int connect_udp(int port)
{
    return connect_to(port, SOCK_DGRAM);
}

char *file_read(const char *path, size_t *len)
{
    FILE *f = fopen(path, "rb");
    ck_assert_msg(f != NULL, "%s", path);
    fseek(f, 0, SEEK_END);
    size_t n = (size_t)ftell(f);
    rewind(f);
    char *text = malloc(n + 1);
    n = fread(text, 1, n, f);
    text[n] = 0;
    fclose(f);
    if (len)
        *len = n;
    return text;
}

void lines_said(char *text)
{
    static const char *const left_out[] = {
        "{\"type\":\"description\"", "{\"type\":\"heartbeat\"",
        "{\"type\":\"bye\"", "{\"type\":\"summary\"", "{\"type\":\"host\""};
    char *to = text;
    for (char *line = text, *end; *line; line = end) {
        end = strchr(line, '\n');
        end = end ? end + 1 : line + strlen(line);
        bool is_kept = true;
        for (int i = 0; i < 5; i++)
            is_kept =
                is_kept && strncmp(line, left_out[i], strlen(left_out[i])) != 0;
        if (!is_kept)
            continue;
        memmove(to, line, (size_t)(end - line));
        to += end - line;
    }
    *to = 0;
}
