/* call.h - one command line of the tool, parsed against the verb's rows.
 *
 * verb.h is what a verb sees; this is what the tool's own files share.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_CALL_H
#define TOOLS_CALL_H

#include <stdio.h>

#include "tools/verb.h"

struct call_given {
    const char *name, *value; /* value "" for a flag                      */
};

struct call {
    const struct verb *verb;
    int n_args, n_given;
    const char **arg;
    struct call_given *given;
    bool wants_help;
};

/* Every verb, in the order of --help; NULL ends it. */
extern const struct verb *const verb_list[];

/* The verb of this name, or NULL. */
const struct verb *verb_find(const char *name);

/* Options that every verb with takes_rig shares; ends with a NULL name. */
extern const struct option_row call_rig_options[];

/* argv[0] is the tool, argv[1] the verb.  Says what is wrong on stderr and
 * returns EXIT_WRONG_USE; *call needs call_fini in any case. */
int call_parse(struct call *call, const struct verb *verb, int argc,
               char **argv);
void call_fini(struct call *call);

/* What main does. */
int call_main(int argc, char **argv);

/* Nearest of the names to `word`, NULL when none is near enough.  `name` gives
 * the i-th name, NULL past the last. */
const char *call_nearest(const char *word,
                         const char *(*name)(const void *ctx, int i),
                         const void *ctx);

/* call_rig for a rig file that an option names. */
struct settings *call_rig_path(const struct call *call, const char *path);

/* After call_rig returned NULL: EXIT_NOT_THERE when the file cannot be opened,
 * EXIT_BAD_SETTINGS when its contents are wrong. */
int call_rig_exit(const char *path);

/* Colour and redrawing are for people: false off a terminal, with NO_COLOR
 * set and not empty, or on TERM=dumb. */
bool call_may_colour(FILE *to);

/* Says how far a verb is, twice a second, and only on a terminal.  *last_ns
 * begins as 0.  call_progress_end wipes the line. */
void call_progress(int64_t *last_ns, const char *fmt, ...)
    __attribute__((format(printf, 2, 3)));
void call_progress_end(const int64_t *last_ns);

/* help.c: the rows as text. */
void help_tool(FILE *to);
void help_verb(FILE *to, const struct verb *verb);
/* One line: "ropewalk replay RIG.json CAPTURE... [options]". */
void help_usage(FILE *to, const struct verb *verb);

/* man.c: one mdoc page per verb, and those of the tool, the daemon and the
 * rig file, into a folder that exists.  Returns an exit code. */
int man_write(const struct call *call, const char *folder);

#endif
