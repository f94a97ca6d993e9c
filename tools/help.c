/* Help as text: the same rows that the parser reads. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <string.h>

enum { HELP_WIDTH = 78 };

/* Prints `text` broken at blanks, each line after the first with `indent`
 * blanks before it; `at` is where the first line stands. */
static void print_wrapped(FILE *to, const char *text, int at, int indent)
{
    bool line_begins = true;
    while (*text != '\0') {
        int len = (int)strcspn(text, " \n");
        if (!line_begins && at + 1 + len > HELP_WIDTH) {
            fprintf(to, "\n%*s", indent, "");
            at = indent;
        } else if (!line_begins) {
            fputc(' ', to);
            at++;
        }
        fprintf(to, "%.*s", len, text);
        at += len;
        text += len;
        line_begins = strncmp(text, "\n\n", 2) == 0;
        if (line_begins) {
            fprintf(to, "\n\n%*s", indent, "");
            at = indent;
            text++;
        }
        if (*text != '\0')
            text++;
    }
    fputc('\n', to);
}

/* Lines "command   # what it does", the remarks under each other. */
static void print_examples(FILE *to, const char *examples)
{
    fputs("Examples:\n", to);
    while (*examples != '\0') {
        int len = (int)strcspn(examples, "\n");
        fprintf(to, "  %.*s\n", len, examples);
        examples += len;
        if (*examples == '\n')
            examples++;
    }
}

static void print_option(FILE *to, const struct option_row *row)
{
    char head[80];
    int len = snprintf(head, sizeof head, "  --%s%s%s", row->name,
                       row->argument == NULL ? "" : " ",
                       row->argument == NULL ? "" : row->argument);
    if (len < 24)
        len = fprintf(to, "%-24s", head);
    else
        fprintf(to, "%s\n%*s", head, 24, "");
    char text[400];
    snprintf(text, sizeof text, "%s%s", row->help,
             row->repeats ? " (may be repeated)" : "");
    print_wrapped(to, text, len, 24);
}

void help_usage(FILE *to, const struct verb *verb)
{
    bool has_options = verb->takes_rig ||
                       (verb->options != NULL && verb->options[0].name != NULL);
    fprintf(to, "ropewalk %s%s%s%s\n", verb->name,
            verb->arguments[0] == '\0' ? "" : " ", verb->arguments,
            has_options ? " [options]" : "");
}

void help_verb(FILE *to, const struct verb *verb)
{
    print_examples(to, verb->examples);
    fputs("\nUsage: ", to);
    help_usage(to, verb);
    fputc('\n', to);
    print_wrapped(to, verb->text, 0, 0);
    fputs("\nOptions:\n", to);
    const struct option_row *row = verb->options;
    for (; row != NULL && row->name != NULL; row++)
        print_option(to, row);
    row = verb->takes_rig ? call_rig_options : NULL;
    for (; row != NULL && row->name != NULL; row++)
        print_option(to, row);
    static const struct option_row help = {"help", NULL, "shows this help",
                                           false};
    print_option(to, &help);
}

void help_tool(FILE *to)
{
    fputs("ropewalk lays many sensor feeds into one estimate.\n\n"
          "Examples:\n"
          "  ropewalk demo                        # see it work, in one "
          "command\n"
          "  ropewalk check RIG.json              # is this rig file right?\n"
          "  ropewalk send laser 1.25             # one measurement to the "
          "daemon\n"
          "  ropewalk follow                      # watch the estimates\n"
          "  ropewalk replay RIG.json captures    # the same numbers again\n\n"
          "Usage: ropewalk VERB [arguments] [options]\n\nVerbs:\n",
          to);
    for (int i = 0; verb_list[i] != NULL; i++)
        fprintf(to, "  %-10s%s\n", verb_list[i]->name, verb_list[i]->summary);
    fputs("\nropewalk VERB --help shows one verb, ropewalk help KEY one key of "
          "the rig\nfile, ropewalk --version the version.  Data goes to "
          "standard output, talk to\nstandard error.\n\n"
          "Exit status: 0 fine, 1 a problem was found, 64 wrong use, 69 not "
          "there,\n78 wrong settings.\n",
          to);
}
