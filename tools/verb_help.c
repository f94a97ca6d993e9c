/* help: a verb, a key of the rig file, or the man pages. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <string.h>

static void print_line(void *ctx, const char *text)
{
    fprintf(ctx, "%s\n", text);
}

static int run(const struct call *call)
{
    const char *folder = call_option(call, "man");
    if (folder != NULL)
        return man_write(call, folder);
    if (call_option(call, "schema") != NULL) {
        settings_schema(print_line, stdout);
        return EXIT_FINE;
    }
    if (call_option(call, "keys") != NULL) {
        settings_help(NULL, print_line, stdout);
        return EXIT_FINE;
    }
    const char *word = call_arg(call, 0);
    if (word == NULL) {
        help_tool(stdout);
        return EXIT_FINE;
    }
    const struct verb *verb = verb_find(word);
    if (verb != NULL) {
        help_verb(stdout, verb);
        return EXIT_FINE;
    }
    if (settings_help(word, print_line, stdout))
        return EXIT_FINE;
    call_say(call,
             "%s: neither a verb nor a key of the rig file; "
             "ropewalk help --keys lists every key",
             word);
    return EXIT_WRONG_USE;
}

static const struct option_row options[] = {
    {"keys", NULL, "every key of the rig file", false},
    {"schema", NULL, "the JSON Schema of the rig file, for editors", false},
    {"man", "FOLDER", "writes the manual pages into a folder", false},
    {NULL, NULL, NULL, false},
};

const struct verb verb_help = {
    .name = "help",
    .summary = "explains a verb, or a key of the rig file",
    .arguments = "[VERB | KEY]",
    .max_args = 1,
    .text = "Explains one verb, or one key of the rig file with its unit, "
            "range and default.",
    .examples =
        "ropewalk help replay                 # one verb\n"
        "ropewalk help sensors.*.silent_after # one key of the rig file\n"
        "ropewalk help --keys                 # every key",
    .options = options,
    .run = run,
};
