/* replay.h - what a replay wrote: its last message and its estimates. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_CHECKS_REPLAY_H
#define TESTS_CHECKS_REPLAY_H

#include <stdbool.h>

#include "tests/checks/values.h"
#include "tests/support/tool.h"

/* Makes a capture of a table. */
static inline const char *replay_import(const char *rig, const char *table)
{
    const char *capture = tool_path("a.pcap");
    int code = rig == NULL ? TOOL("import", table, capture)
                           : TOOL("import", "--rig", rig, table, capture);
    ck_assert_msg(code == 0, "import: %s", tool_said);
    return capture;
}

/* Calls `take` for every line, then gives the summary; cJSON_Delete it. */
static inline cJSON *replay_lines(const char *path,
                                  void (*take)(void *ctx, const cJSON *line),
                                  void *ctx)
{
    char *text = values_text(path), *next = NULL;
    cJSON *last = NULL;
    for (char *line = text; *line != '\0'; line = next) {
        next = strchr(line, '\n');
        ck_assert_ptr_nonnull(next);
        *next++ = '\0';
        cJSON_Delete(last);
        last = cJSON_Parse(line);
        ck_assert_ptr_nonnull(last);
        take(ctx, last);
    }
    free(text);
    ck_assert_ptr_nonnull(last);
    ck_assert_str_eq(values_at(last, "type")->valuestring, "summary");
    return last;
}

static inline bool replay_is_settled(const cJSON *line)
{
    const cJSON *stream = cJSON_GetObjectItemCaseSensitive(line, "stream");
    return stream != NULL && strcmp(stream->valuestring, "settled") == 0;
}

#endif
