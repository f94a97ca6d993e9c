/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

const struct option_row call_rig_options[] = {
    {"set", "PATH=VALUE",
     "lays a value over the rig file, as in --set sensors.laser.u=\"3 mm\"",
     true},
    {"without", "SENSOR", "leaves a sensor out", true},
    {NULL, NULL, NULL, false},
};

/* --- nearest names ------------------------------------------------------- */

enum { NEAREST_LEN_MAX = 63 };

/* Letters to change, add, drop or swap with a neighbour, from a to b. */
static int edit_distance(const char *a, const char *b)
{
    int row[3][NEAREST_LEN_MAX + 2];
    int n = (int)strlen(a), m = (int)strlen(b);
    if (n > NEAREST_LEN_MAX || m > NEAREST_LEN_MAX)
        return NEAREST_LEN_MAX;
    for (int j = 0; j <= m; j++)
        row[0][j] = j;
    for (int i = 1; i <= n; i++) {
        int *now = row[i % 3], *was = row[(i + 2) % 3];
        const int *before = row[(i + 1) % 3];
        now[0] = i;
        for (int j = 1; j <= m; j++) {
            int best = was[j - 1] + (a[i - 1] != b[j - 1]);
            best = was[j] + 1 < best ? was[j] + 1 : best;
            best = now[j - 1] + 1 < best ? now[j - 1] + 1 : best;
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] &&
                a[i - 2] == b[j - 1] && before[j - 2] + 1 < best)
                best = before[j - 2] + 1;
            now[j] = best;
        }
    }
    return row[n % 3][m];
}

const char *call_nearest(const char *word,
                         const char *(*name)(const void *ctx, int i),
                         const void *ctx)
{
    const char *best = NULL, *candidate;
    int limit = strlen(word) < 4 ? 1 : 2, best_distance = limit + 1;
    for (int i = 0; (candidate = name(ctx, i)) != NULL; i++) {
        int distance = edit_distance(word, candidate);
        if (distance < best_distance) {
            best = candidate;
            best_distance = distance;
        }
    }
    return best;
}

static const char *verb_name(const void *ctx, int i)
{
    (void)ctx;
    return verb_list[i] == NULL ? NULL : verb_list[i]->name;
}

/* Option rows of a verb one after the other: its own, then the shared ones,
 * then help. */
static const struct option_row *option_row(const struct verb *verb, int i)
{
    static const struct option_row help = {"help", NULL, "shows this help",
                                           false};
    const struct option_row *row = verb->options;
    for (; row != NULL && row->name != NULL; row++)
        if (i-- == 0)
            return row;
    row = verb->takes_rig ? call_rig_options : NULL;
    for (; row != NULL && row->name != NULL; row++)
        if (i-- == 0)
            return row;
    return i == 0 ? &help : NULL;
}

static const char *option_name(const void *ctx, int i)
{
    const struct option_row *row = option_row(ctx, i);
    return row == NULL ? NULL : row->name;
}

const struct verb *verb_find(const char *name)
{
    for (int i = 0; verb_list[i] != NULL; i++)
        if (strcmp(verb_list[i]->name, name) == 0)
            return verb_list[i];
    return NULL;
}

/* --- parsing ------------------------------------------------------------- */

static int unknown_option(const struct call *call, const char *name, size_t len)
{
    char word[NEAREST_LEN_MAX + 1];
    snprintf(word, sizeof word, "%.*s", (int)len, name);
    const char *near = call_nearest(word, option_name, call->verb);
    if (near != NULL)
        call_say(call, "--%s: no such option; did you mean --%s?", word, near);
    else
        call_say(call,
                 "--%s: no such option; see the list in ropewalk %s --help",
                 word, call->verb->name);
    return EXIT_WRONG_USE;
}

static int take_option(struct call *call, const struct option_row *row,
                       const char *value)
{
    if (strcmp(row->name, "help") == 0) {
        call->wants_help = true;
        return EXIT_FINE;
    }
    if (!row->repeats && call_option(call, row->name) != NULL) {
        call_say(call, "--%s: given twice; leave one out", row->name);
        return EXIT_WRONG_USE;
    }
    call->given[call->n_given++] =
        (struct call_given){row->name, value == NULL ? "" : value};
    return EXIT_FINE;
}

/* The option at argv[*i], which begins with "--"; moves *i over its value. */
static int parse_option(struct call *call, int argc, char **argv, int *i)
{
    const char *name = argv[*i] + 2, *equals = strchr(name, '=');
    size_t len = equals == NULL ? strlen(name) : (size_t)(equals - name);
    const struct option_row *row;
    for (int k = 0; (row = option_row(call->verb, k)) != NULL; k++)
        if (strlen(row->name) == len && memcmp(row->name, name, len) == 0)
            break;
    if (row == NULL)
        return unknown_option(call, name, len);
    if (row->argument == NULL && equals != NULL) {
        call_say(call, "--%s: takes no value; write it alone", row->name);
        return EXIT_WRONG_USE;
    }
    if (row->argument == NULL)
        return take_option(call, row, NULL);
    if (equals != NULL)
        return take_option(call, row, equals + 1);
    if (*i + 1 >= argc || strncmp(argv[*i + 1], "--", 2) == 0) {
        call_say(call, "--%s: needs a value; write --%s %s", row->name,
                 row->name, row->argument);
        return EXIT_WRONG_USE;
    }
    return take_option(call, row, argv[++*i]);
}

static int check_arguments(const struct call *call)
{
    const struct verb *verb = call->verb;
    bool too_few = call->n_args < verb->min_args;
    bool too_many = verb->max_args >= 0 && call->n_args > verb->max_args;
    if (!too_few && !too_many)
        return EXIT_FINE;
    if (too_few)
        call_say(call, "%d arguments given, %d needed", call->n_args,
                 verb->min_args);
    else
        call_say(call, "argument '%s' is one too many",
                 call->arg[verb->max_args]);
    fputs("usage: ", stderr);
    help_usage(stderr, verb);
    return EXIT_WRONG_USE;
}

/* "-1.25" is a reading, not an option. */
static bool is_option(const char *word)
{
    return word[0] == '-' && word[1] != '\0' && word[1] != '.' &&
           !(word[1] >= '0' && word[1] <= '9');
}

int call_parse(struct call *call, const struct verb *verb, int argc,
               char **argv)
{
    *call = (struct call){.verb = verb};
    call->arg = calloc((size_t)argc + 1, sizeof *call->arg);
    call->given = calloc((size_t)argc + 1, sizeof *call->given);
    if (call->arg == NULL || call->given == NULL) {
        call_say(call, "out of memory");
        return EXIT_PROBLEM;
    }
    bool options_end = false;
    for (int i = 2; i < argc; i++) {
        int code = EXIT_FINE;
        if (options_end || !is_option(argv[i]))
            call->arg[call->n_args++] = argv[i];
        else if (strcmp(argv[i], "--") == 0)
            options_end = true;
        else if (strcmp(argv[i], "-h") == 0)
            call->wants_help = true;
        else if (strncmp(argv[i], "--", 2) == 0)
            code = parse_option(call, argc, argv, &i);
        else
            code = unknown_option(call, argv[i] + 1, strlen(argv[i] + 1));
        if (code != EXIT_FINE)
            return code;
    }
    return call->wants_help ? EXIT_FINE : check_arguments(call);
}

void call_fini(struct call *call)
{
    free(call->arg);
    free(call->given);
    *call = (struct call){.verb = call->verb};
}

/* --- what a verb asks ---------------------------------------------------- */

int call_n_args(const struct call *call)
{
    return call->n_args;
}

const char *call_arg(const struct call *call, int i)
{
    return i >= 0 && i < call->n_args ? call->arg[i] : NULL;
}

const char *call_option(const struct call *call, const char *name)
{
    return call_option_at(call, name, 0);
}

const char *call_option_at(const struct call *call, const char *name, int i)
{
    for (int k = 0; k < call->n_given; k++)
        if (strcmp(call->given[k].name, name) == 0 && i-- == 0)
            return call->given[k].value;
    return NULL;
}

/* --- main ---------------------------------------------------------------- */

static int unknown_verb(const char *word)
{
    const char *near = call_nearest(word, verb_name, NULL);
    if (near != NULL)
        fprintf(stderr, "ropewalk: %s: no such verb; did you mean %s?\n", word,
                near);
    else
        fprintf(stderr,
                "ropewalk: %s: no such verb; ropewalk --help lists them\n",
                word);
    return EXIT_WRONG_USE;
}

/* A full disk must not look like success. */
static int flush_stdout(int code)
{
    if (fflush(stdout) == 0 && !ferror(stdout))
        return code;
    fprintf(stderr, "ropewalk: standard output: %s\n", strerror(errno));
    return code == EXIT_FINE ? EXIT_PROBLEM : code;
}

int call_main(int argc, char **argv)
{
    if (argc < 2) {
        help_tool(stderr);
        return EXIT_WRONG_USE;
    }
    if (strcmp(argv[1], "--help") == 0 || strcmp(argv[1], "-h") == 0) {
        help_tool(stdout);
        return flush_stdout(EXIT_FINE);
    }
    if (strcmp(argv[1], "--version") == 0) {
        printf("ropewalk %s\n", ROPEWALK_BUILD);
        return flush_stdout(EXIT_FINE);
    }
    const struct verb *verb = verb_find(argv[1]);
    if (verb == NULL)
        return unknown_verb(argv[1]);
    struct call call;
    int code = call_parse(&call, verb, argc, argv);
    if (code == EXIT_FINE && call.wants_help)
        help_verb(stdout, verb);
    else if (code == EXIT_FINE)
        code = verb->run(&call);
    call_fini(&call);
    return flush_stdout(code);
}
