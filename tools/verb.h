/* verb.h - what a verb of the ropewalk tool is: one row of a table.
 *
 * `--help`, the man pages and the parser all come from these rows, so they
 * cannot disagree.  Each verb is one file verb_NAME.c that defines
 * `const struct verb verb_NAME`; verbs.c lists them.
 *
 * Every verb: data on stdout, talk on stderr, exit codes of enum exit_code.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_VERB_H
#define TOOLS_VERB_H

#include <stdbool.h>
#include <stdint.h>

#include "config/load.h"

enum exit_code {
    EXIT_FINE = 0,
    EXIT_PROBLEM = 1, /* the check found a problem, the run was not good */
    EXIT_WRONG_USE = 64,
    EXIT_NOT_THERE = 69, /* daemon not running, file not found           */
    EXIT_BAD_SETTINGS = 78
};

struct option_row {
    const char *name;     /* "seed"; NULL ends the table                  */
    const char *argument; /* "N", or NULL for a flag                      */
    const char *help;     /* one sentence                                 */
    bool repeats;         /* may be given more than once                  */
};

struct call;

struct verb {
    const char *name;
    const char *summary;    /* "lays a capture through the engine again"    */
    const char *arguments;  /* "RIG.json CAPTURE..."                        */
    int min_args, max_args; /* max -1: any number                          */
    const char *text;       /* paragraphs for --help and the man page       */
    const char *examples;   /* lines, each "command   # what it does"       */
    bool takes_rig;         /* adds --set and --without, shared by all      */
    const struct option_row *options;
    int (*run)(const struct call *call);
};

/* The parsed command line of one verb. */
int call_n_args(const struct call *call);
const char *call_arg(const struct call *call, int i);

/* NULL when the option was not given; "" for a flag that was. */
const char *call_option(const struct call *call, const char *name);
/* The i-th value of a repeating option, NULL past the last. */
const char *call_option_at(const struct call *call, const char *name, int i);

/* Number options with a message and EXIT_WRONG_USE via *bad on nonsense. */
double call_number(const struct call *call, const char *name, double otherwise,
                   bool *bad);
/* "12 ms", "2 min", bare = seconds. */
int64_t call_time_ns(const struct call *call, const char *name,
                     int64_t otherwise_ns, bool *bad);

/* Loads the rig in argument i with --set and --without laid over it; prints
 * all problems on stderr and returns NULL on failure. */
struct settings *call_rig(const struct call *call, int i);

/* One line on stderr, "ropewalk VERB: ...". */
void call_say(const struct call *call, const char *fmt, ...)
    __attribute__((format(printf, 2, 3)));

#endif
