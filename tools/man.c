/* Manual pages in mdoc from the rows that the parser reads. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <errno.h>
#include <string.h>

/* The day that the words of these pages were last gone over. */
static const char man_date[] = "December 1, 2026";

struct page {
    FILE *to;
    const char *name, *section, *summary;
};

/* Text as text: nothing in it is a macro, an escape or a dash to dress up. */
static void put_text(FILE *to, const char *text, size_t len)
{
    for (size_t i = 0; i < len; i++) {
        bool begins = i == 0 || text[i - 1] == '\n' || text[i - 1] == ' ';
        if (begins && (text[i] == '.' || text[i] == '\''))
            fputs("\\&", to);
        if (text[i] == '\\')
            fputs("\\e", to);
        else if (text[i] == '-')
            fputs("\\-", to);
        else if (text[i] == '"')
            fputs("\\(dq", to);
        else
            fputc(text[i], to);
    }
}

/* Words behind a macro: each with \& before it, so that none is a macro. */
static void put_words(FILE *to, const char *text)
{
    while (*text != '\0') {
        size_t len = strcspn(text, " ");
        fputs("\\&", to);
        put_text(to, text, len);
        text += len;
        if (*text != '\0') {
            fputc(' ', to);
            text++;
        }
    }
}

/* Each sentence on a line of its own, as mdoc wants it. */
static void put_sentences(FILE *to, const char *text, size_t len)
{
    size_t first = 0;
    for (size_t i = 0; i + 2 < len; i++) {
        bool ends = text[i] == '.' && text[i + 1] == ' ' &&
                    text[i + 2] >= 'A' && text[i + 2] <= 'Z';
        if (!ends)
            continue;
        put_text(to, text + first, i + 1 - first);
        fputc('\n', to);
        first = i + 2;
    }
    put_text(to, text + first, len - first);
    fputc('\n', to);
}

static void put_paragraphs(FILE *to, const char *text)
{
    while (*text != '\0') {
        const char *end = strstr(text, "\n\n");
        size_t len = end == NULL ? strlen(text) : (size_t)(end - text);
        put_sentences(to, text, len);
        text += len;
        if (end != NULL) {
            fputs(".Pp\n", to);
            text += 2;
        }
    }
}

static void put_examples(FILE *to, const char *examples)
{
    fputs(".Sh EXAMPLES\n.Bd -literal\n", to);
    put_text(to, examples, strlen(examples));
    fputs("\n.Ed\n", to);
}

static void put_exit_status(FILE *to)
{
    fputs(".Sh EXIT STATUS\n.Bl -tag -width Ds\n"
          ".It 0\nFine.\n"
          ".It 1\nA problem was found, or the run was not good.\n"
          ".It 64\nThe command line is wrong.\n"
          ".It 69\nSomething is not there: the daemon does not run, "
          "a file cannot be opened.\n"
          ".It 78\nThe rig file is wrong.\n.El\n",
          to);
}

static bool page_open(const struct call *call, struct page *page,
                      const char *folder)
{
    char path[1024], title[64];
    snprintf(path, sizeof path, "%s/%s.%s", folder, page->name, page->section);
    page->to = fopen(path, "w");
    if (page->to == NULL) {
        call_say(call, "%s: %s; name a folder that exists", path,
                 strerror(errno));
        return false;
    }
    snprintf(title, sizeof title, "%s", page->name);
    for (char *c = title; *c != '\0'; c++)
        if (*c >= 'a' && *c <= 'z')
            *c = (char)(*c - 'a' + 'A');
    fprintf(page->to,
            ".\\\" SPDX-License-Identifier: Apache-2.0\n"
            ".Dd %s\n.Dt %s %s\n.Os\n.Sh NAME\n.Nm %s\n.Nd ",
            man_date, title, page->section, page->name);
    put_text(page->to, page->summary, strlen(page->summary));
    fputc('\n', page->to);
    return true;
}

static bool page_close(const struct call *call, struct page *page)
{
    bool failed = ferror(page->to) != 0;
    failed = fclose(page->to) != 0 || failed;
    if (failed)
        call_say(call, "%s.%s: cannot be written: %s", page->name,
                 page->section, strerror(errno));
    return !failed;
}

static void put_option(FILE *to, const struct option_row *row)
{
    fprintf(to, ".It Fl \\-%s", row->name);
    if (row->argument != NULL) {
        fputs(" Ar ", to);
        put_words(to, row->argument);
    }
    fputc('\n', to);
    put_text(to, row->help, strlen(row->help));
    fputs(row->repeats ? ".\nIt may be repeated.\n" : ".\n", to);
}

static void put_options(FILE *to, const struct option_row *row)
{
    for (; row != NULL && row->name != NULL; row++)
        put_option(to, row);
}

static bool write_verb(const struct call *call, const char *folder,
                       const struct verb *verb)
{
    char name[64];
    snprintf(name, sizeof name, "ropewalk-%s", verb->name);
    struct page page = {NULL, name, "1", verb->summary};
    if (!page_open(call, &page, folder))
        return false;
    FILE *to = page.to;
    fprintf(to, ".Sh SYNOPSIS\n.Nm ropewalk Cm %s\n.Op options\n", verb->name);
    if (verb->arguments[0] != '\0') {
        fputs(".Ar ", to);
        put_words(to, verb->arguments);
        fputc('\n', to);
    }
    fputs(".Sh DESCRIPTION\n", to);
    put_paragraphs(to, verb->text);
    fputs(".Pp\nThe options are as follows:\n.Bl -tag -width Ds\n", to);
    put_options(to, verb->options);
    put_options(to, verb->takes_rig ? call_rig_options : NULL);
    fputs(".It Fl \\-help\nShows the same in short.\n.El\n", to);
    put_exit_status(to);
    put_examples(to, verb->examples);
    fputs(".Sh SEE ALSO\n.Xr ropewalk 1 ,\n.Xr ropewalk\\-rig 5 ,\n"
          ".Xr ropewalkd 8\n",
          to);
    return page_close(call, &page);
}

static bool write_tool(const struct call *call, const char *folder)
{
    struct page page = {NULL, "ropewalk", "1",
                        "lays many sensor feeds into one estimate"};
    if (!page_open(call, &page, folder))
        return false;
    FILE *to = page.to;
    fputs(".Sh SYNOPSIS\n.Nm\n.Ar verb\n.Op arguments\n.Op options\n"
          ".Nm\n.Fl \\-version\n.Sh DESCRIPTION\n"
          "One tool for what comes before, during and after a run of the "
          "daemon\n.Xr ropewalkd 8 .\n"
          "Data goes to standard output, talk to standard error.\n"
          "Nothing here is a safety function: no interlock, limit or "
          "protective stop may hang on an estimate.\n"
          ".Pp\nThe verbs are as follows:\n.Bl -tag -width Ds\n",
          to);
    for (int i = 0; verb_list[i] != NULL; i++) {
        fprintf(to, ".It Cm %s\n", verb_list[i]->name);
        put_text(to, verb_list[i]->summary, strlen(verb_list[i]->summary));
        fprintf(to, ";\nsee\n.Xr ropewalk\\-%s 1 .\n", verb_list[i]->name);
    }
    fputs(".El\n.Sh ENVIRONMENT\n.Bl -tag -width NO_COLOR\n.It Ev NO_COLOR\n"
          "If set and not empty, nothing is coloured or redrawn.\n.El\n",
          to);
    put_exit_status(to);
    fputs(".Sh SEE ALSO\n.Xr ropewalk\\-rig 5 ,\n.Xr ropewalkd 8\n", to);
    return page_close(call, &page);
}

/* What ropewalkd --help says, as rows. */
static const struct option_row daemon_options[] = {
    {"check", NULL, "only says whether the rig file is good", false},
    {"set", "PATH=VALUE", "changes a setting of the rig file", true},
    {"no-capture", NULL, "keeps no record of what arrives", false},
    {"port-file", "FILE", "writes the ports in use there, once ready", false},
    {"version", NULL, "names the build", false},
    {NULL, NULL, NULL, false},
};

static bool write_daemon(const struct call *call, const char *folder)
{
    struct page page = {NULL, "ropewalkd", "8",
                        "estimates live from sensor datagrams"};
    if (!page_open(call, &page, folder))
        return false;
    FILE *to = page.to;
    fputs(".Sh SYNOPSIS\n.Nm\n.Ar RIG.json\n.Op options\n.Sh DESCRIPTION\n"
          "Receives measurements as UDP datagrams, lays them in order of "
          "their own time, and serves one estimate per track with its "
          "standard uncertainty and a verdict.\n"
          "Every datagram is written to a capture first, from which\n"
          ".Xr ropewalk\\-replay 1\ngives the same numbers again.\n"
          ".Pp\nThe rig file says where it receives and serves:\n"
          ".Xr ropewalk\\-rig 5 .\n"
          "It is not a safety function: no interlock, limit or protective "
          "stop may hang on an estimate.\n"
          ".Pp\nThe options are as follows:\n.Bl -tag -width Ds\n",
          to);
    put_options(to, daemon_options);
    fputs(".El\n.Sh SIGNALS\n.Bl -tag -width SIGTERM\n.It Dv SIGTERM , SIGINT\n"
          "Ends the line: everything settles, the capture is closed, and the "
          "exit status is 0.\nA second one ends it at once.\n.El\n",
          to);
    put_exit_status(to);
    fputs(".Sh SEE ALSO\n.Xr ropewalk 1 ,\n.Xr ropewalk\\-rig 5\n", to);
    return page_close(call, &page);
}

static void put_literal_line(void *ctx, const char *text)
{
    put_text(ctx, text, strlen(text));
    fputc('\n', ctx);
}

static bool write_rig(const struct call *call, const char *folder)
{
    struct page page = {NULL, "ropewalk-rig", "5",
                        "the rig file: tracks, sensors, addresses"};
    if (!page_open(call, &page, folder))
        return false;
    FILE *to = page.to;
    fputs(".Sh DESCRIPTION\n"
          "A rig file is JSON; comments are allowed, and every quantity may "
          "carry its unit as a string.\n"
          "An unknown key, a wrong unit or a wrong size is refused with its "
          "place and a remedy;\n.Xr ropewalk\\-check 1\n"
          "reports all of them at once.\n"
          "Only tracks and sensors are required.\n"
          ".Sh KEYS\n.Bd -literal\n",
          to);
    settings_help(NULL, put_literal_line, to);
    fputs(".Ed\n.Sh SEE ALSO\n.Xr ropewalk 1 ,\n.Xr ropewalk\\-check 1 ,\n"
          ".Xr ropewalkd 8\n",
          to);
    return page_close(call, &page);
}

int man_write(const struct call *call, const char *folder)
{
    bool ok = write_tool(call, folder) && write_daemon(call, folder) &&
              write_rig(call, folder);
    for (int i = 0; ok && verb_list[i] != NULL; i++)
        ok = write_verb(call, folder, verb_list[i]);
    return ok ? EXIT_FINE : EXIT_NOT_THERE;
}
