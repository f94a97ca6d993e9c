/* Options and arguments as numbers, times and rigs. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "config/quantity.h"
#include "core/wire/decode.h"
#include "daemon/capture.h"

double call_number(const struct call *call, const char *name, double otherwise,
                   bool *bad)
{
    const char *text = call_option(call, name);
    double value = otherwise;
    if (text == NULL)
        return otherwise;
    if (!wire_parse_number(text, strlen(text), &value)) {
        call_say(call, "--%s: '%s' is not a number; write it as 12 or 0.5",
                 name, text);
        *bad = true;
        return otherwise;
    }
    return value;
}

int64_t call_time_ns(const struct call *call, const char *name,
                     int64_t otherwise_ns, bool *bad)
{
    const char *text = call_option(call, name);
    if (text == NULL)
        return otherwise_ns;
    struct err err = {ST_OK, ""};
    int64_t t_ns = otherwise_ns;
    struct quantity_units *units = quantity_units_new(&err);
    if (units == NULL || quantity_time_ns(units, text, &t_ns, &err) != ST_OK) {
        call_say(call, "--%s: %s", name, err.text);
        *bad = true;
        t_ns = otherwise_ns;
    }
    quantity_units_free(units);
    return t_ns;
}

/* --set a.b=c as a change; false when there is no '='. */
static bool split_set(const struct call *call, char *text,
                      struct settings_change *change)
{
    char *equals = strchr(text, '=');
    if (equals == NULL || equals == text) {
        call_say(call,
                 "--set %s: needs PATH=VALUE, as in "
                 "--set sensors.laser.rate=50",
                 text);
        return false;
    }
    *equals = '\0';
    *change = (struct settings_change){text, equals + 1};
    return true;
}

static int count_given(const struct call *call, const char *name)
{
    int n = 0;
    while (call_option_at(call, name, n) != NULL)
        n++;
    return n;
}

struct settings *call_rig_path(const struct call *call, const char *path)
{
    if (capture_look(path) != CAPTURE_NONE) { /* arguments in wrong order */
        call_say(call, "%s: is a capture; the rig file comes first", path);
        return NULL;
    }
    int n_set = count_given(call, "set"), n = 0;
    int n_all = n_set + count_given(call, "without");
    struct settings_change *change = calloc((size_t)n_all + 1, sizeof *change);
    char **text = calloc((size_t)n_all + 1, sizeof *text);
    struct settings *s = NULL;
    struct problems problems;
    problems_init(&problems);
    bool ok = change != NULL && text != NULL;
    for (; ok && n < n_all; n++) {
        bool is_set = n < n_set;
        const char *given = is_set ? call_option_at(call, "set", n)
                                   : call_option_at(call, "without", n - n_set);
        ok = asprintf(&text[n], is_set ? "%s" : "sensors.%s", given) >= 0;
        if (ok && is_set)
            ok = split_set(call, text[n], &change[n]);
        else if (ok)
            change[n] = (struct settings_change){text[n], "null"};
    }
    if (ok && settings_load(&s, path, change, n_all, &problems) != ST_OK) {
        fputs(problems.text == NULL ? "out of memory\n" : problems.text,
              stderr);
        s = NULL;
    }
    problems_fini(&problems);
    for (int k = 0; text != NULL && k < n_all; k++)
        free(text[k]);
    free(text);
    free(change);
    return s;
}

struct settings *call_rig(const struct call *call, int i)
{
    return call_rig_path(call, call_arg(call, i));
}

int call_rig_exit(const char *path)
{
    return access(path, R_OK) == 0 ? EXIT_BAD_SETTINGS : EXIT_NOT_THERE;
}
