/* SPDX-License-Identifier: Apache-2.0 */
#include "tests/support/tool.h"

#include <check.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

enum { ARGUMENTS_MAX = 24 };

char tool_folder[] = "/tmp/test_tool.XXXXXX";
char tool_out[TOOL_OUTPUT_MAX], tool_said[TOOL_OUTPUT_MAX];
size_t tool_out_len;

const char tool_rig[] =
    "{\n"
    "  // a tank gauge\n"
    "  \"rig\": \"level day\",\n"
    "  \"receive\": {\"udp\": \"127.0.0.1:8410\"},\n"
    "  \"tracks\": {\"tank\": {\"state\": [{\"model\": \"random-walk\", "
    "\"name\": \"level\", \"unit\": \"m\", \"q\": \"1e-4 m2/s\"}]}},\n"
    "  \"sensors\": {\"gauge\": {\"track\": \"tank\", \"reads\": \"level\", "
    "\"unit\": \"mm\", \"u\": \"5 mm\", \"rate\": \"10 Hz\"}}\n"
    "}\n";

const char tool_table[] = "time_ns,arrival_ns,sensor,z0\n"
                          "0,,gauge,1000\n"
                          "100000000,130000000,gauge,1002\n"
                          "110000000,220000000,gauge,1003\n"
                          "200000000,,gauge,1004\n"
                          "300000000,,other,1\n";

const char *tool_path(const char *name)
{
    static char paths[64][256];
    static int next;
    char *path = paths[next++ % 64];
    snprintf(path, 256, "%s/%s", tool_folder, name);
    return path;
}

const char *tool_write(const char *name, const char *text)
{
    const char *path = tool_path(name);
    FILE *to = fopen(path, "w");
    ck_assert_ptr_nonnull(to);
    fputs(text, to);
    fclose(to);
    return path;
}

size_t tool_read(const char *path, char *buf)
{
    FILE *from = fopen(path, "r");
    ck_assert_ptr_nonnull(from);
    size_t len = fread(buf, 1, TOOL_OUTPUT_MAX - 1, from);
    buf[len] = '\0';
    fclose(from);
    return len;
}

static void redirect(const char *path, const char *mode, int fd)
{
    FILE *file = fopen(path, mode);
    if (file == NULL || dup2(fileno(file), fd) < 0)
        _exit(127);
}

pid_t tool_start(const char *const argv[], const char *input)
{
    const char *input_path = tool_write("stdin", input);
    const char *out_path = tool_path("stdout");
    const char *said_path = tool_path("stderr");
    pid_t pid = fork();
    if (pid == 0) {
        redirect(input_path, "r", STDIN_FILENO);
        redirect(out_path, "w", STDOUT_FILENO);
        redirect(said_path, "w", STDERR_FILENO);
        execv(TOOL_PATH, (char *const *)(const void *)argv);
        _exit(127);
    }
    ck_assert_int_gt(pid, 0);
    return pid;
}

int tool_end(pid_t pid)
{
    int status;
    ck_assert_int_eq(waitpid(pid, &status, 0), pid);
    tool_out_len = tool_read(tool_path("stdout"), tool_out);
    tool_read(tool_path("stderr"), tool_said);
    ck_assert_msg(WIFEXITED(status), "killed by a signal: %s", tool_said);
    return WEXITSTATUS(status);
}

int tool_run(const char *input, ...)
{
    const char *argv[ARGUMENTS_MAX] = {"ropewalk"};
    va_list list;
    va_start(list, input);
    for (int i = 1; i < ARGUMENTS_MAX; i++)
        if ((argv[i] = va_arg(list, const char *)) == NULL)
            break;
    va_end(list);
    return tool_end(tool_start(argv, input));
}

void tool_folder_make(void)
{
    memcpy(tool_folder + strlen(tool_folder) - 6, "XXXXXX", 6);
    ck_assert_ptr_nonnull(mkdtemp(tool_folder));
}

void tool_folder_remove(void)
{
    char command[300];
    snprintf(command, sizeof command, "rm -r '%s'", tool_folder);
    ck_assert_int_eq(system(command), 0);
}
