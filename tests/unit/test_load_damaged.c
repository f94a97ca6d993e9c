/* Rig files that are damaged or missing, and what the table of settings says of
 * itself. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "tests/suite.h"
#include "tests/unit/load_case.h"

/* Sets one byte at 50 places over the file: either it is refused, or (inside
 * a comment) nothing differs. */
START_TEST(a_corrupt_byte_is_refused_or_changes_nothing)
{
    static const char bytes[] = {'\x01', '\x00', '\xff'};
    struct settings *good = load_file(), *s;
    char *text = malloc(good->text_len + 1);
    int n_refused = 0;
    for (int i = 0; i < 50; i++) {
        size_t at = good->text_len * (size_t)i / 50 + 1;
        struct problems p;
        memcpy(text, good->text, good->text_len + 1);
        text[at] = bytes[i % 3];
        problems_init(&p);
        status st = settings_parse(&s, load_complete, text, good->text_len,
                                   NULL, 0, &p);
        n_refused += st == ST_SCHEMA;
        ck_assert_int_eq(st == ST_OK, p.n == 0);
        if (st == ST_OK) {
            memcpy(s->rig.file_hash, good->rig.file_hash, 65);
            ck_assert_mem_eq(&s->rig, &good->rig, sizeof s->rig);
        }
        settings_free(s);
        problems_fini(&p);
    }
    ck_assert_int_gt(n_refused, 40);
    free(text);
    settings_free(good);
}
END_TEST

/* Every end and every doubled byte: refused or loaded, never a crash. */
START_TEST(a_torn_file_is_refused)
{
    struct settings *s;
    for (size_t n = 0; n < sizeof load_small - 1; n += 3) {
        struct problems p;
        problems_init(&p);
        ck_assert_int_eq(
            settings_parse(&s, "rig.json", load_small, n, NULL, 0, &p),
            ST_SCHEMA);
        ck_assert_int_eq(p.n, 1);
        problems_fini(&p);
    }
}
END_TEST

START_TEST(a_missing_file_is_named_with_the_reason)
{
    struct settings *s;
    struct problems p;
    problems_init(&p);
    ck_assert_int_eq(settings_load(&s, "tests/none.json", NULL, 0, &p), ST_IO);
    ck_assert_str_eq(p.text,
                     "tests/none.json: error: No such file or directory\n");
    ck_assert_ptr_null(s);
    problems_fini(&p);
    problems_init(&p);
    ck_assert_int_eq(settings_load(&s, "tests", NULL, 0, &p), ST_IO);
    ck_assert_ptr_nonnull(strstr(p.text, "tests: error: "));
    problems_fini(&p);
}
END_TEST

static void compare_line(void *ctx, const char *text)
{
    FILE *file = ctx;
    char line[2048] = "";
    ck_assert_ptr_nonnull(fgets(line, sizeof line, file));
    line[strcspn(line, "\n")] = '\0';
    ck_assert_str_eq(line, text);
}

START_TEST(the_schema_file_is_what_the_table_makes)
{
    FILE *file = fopen("config/rig.schema.json", "r");
    ck_assert_ptr_nonnull(file);
    settings_schema(compare_line, file);
    ck_assert_int_eq(fgetc(file), EOF);
    fclose(file);
}
END_TEST

static void keep_first(void *ctx, const char *text)
{
    char *first = ctx;
    if (first[0] == '\0')
        snprintf(first, 200, "%s", text);
}

START_TEST(help_finds_a_key_by_pattern_or_by_name)
{
    char first[200] = "";
    ck_assert(settings_help("sensors.laser.silent_after", keep_first, first));
    ck_assert_str_eq(first, "sensors.*.silent_after");
    first[0] = '\0';
    ck_assert(settings_help("tracks.*.state.q", keep_first, first));
    ck_assert_str_eq(first, "tracks.*.state.q");
    ck_assert(settings_help(NULL, keep_first, first));
    ck_assert(!settings_help("sensors.laser.colour", keep_first, first));
}
END_TEST

Suite *suite(void)
{
    Suite *s = suite_create("load_damaged");
    TCase *t = tcase_create("load_damaged");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, a_corrupt_byte_is_refused_or_changes_nothing);
    tcase_add_test(t, a_torn_file_is_refused);
    tcase_add_test(t, a_missing_file_is_named_with_the_reason);
    tcase_add_test(t, the_schema_file_is_what_the_table_makes);
    tcase_add_test(t, help_finds_a_key_by_pattern_or_by_name);
    suite_add_tcase(s, t);
    return s;
}
