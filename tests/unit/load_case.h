/* load_case.h - rig files from text, for the test_load programs. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_UNIT_LOAD_CASE_H
#define TESTS_UNIT_LOAD_CASE_H

#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "config/load.h"

static const char load_complete[] = "tests/data/rigs/complete.json";

static const char load_small[] =
    "{\"tracks\": {\"carriage\": {\"state\": {\"model\": \"random-walk\","
    " \"name\": \"x\", \"unit\": \"m\", \"q\": 1}}},\n"
    " \"sensors\": {\"laser\": {\"reads\": \"x\", \"u\": \"2 mm\"}}}";

/* The file of all settings; free it with settings_free. */
static inline struct settings *load_file(void)
{
    struct settings *s;
    struct problems p;
    problems_init(&p);
    status st = settings_load(&s, load_complete, NULL, 0, &p);
    ck_assert_msg(st == ST_OK, "%s", p.text);
    ck_assert_int_eq(p.n, 0);
    problems_fini(&p);
    return s;
}

/* The reports on a text with n changes, "" and *s when it loads; the caller
 * frees them. */
static inline char *load_text(struct settings **s, const char *text,
                              const struct settings_change *changes, int n)
{
    struct problems p;
    problems_init(&p);
    status st =
        settings_parse(s, "rig.json", text, strlen(text), changes, n, &p);
    ck_assert_int_eq(st, p.n == 0 ? ST_OK : ST_SCHEMA);
    ck_assert((*s != NULL) == (p.n == 0));
    char *said = strdup(p.text != NULL ? p.text : "");
    problems_fini(&p);
    return said;
}

#endif
