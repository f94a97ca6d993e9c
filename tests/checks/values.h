/* values.h - reference values from tests/data/checks, and how near is near. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_CHECKS_VALUES_H
#define TESTS_CHECKS_VALUES_H

#include <cjson/cJSON.h>
#include <check.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* The whole file, NUL-terminated; the caller frees it. */
static inline char *values_text(const char *path)
{
    FILE *from = fopen(path, "rb");
    ck_assert_msg(from != NULL, "%s: cannot open", path);
    ck_assert_int_eq(fseek(from, 0, SEEK_END), 0);
    long len = ftell(from);
    ck_assert_int_ge(len, 0);
    rewind(from);
    char *text = malloc((size_t)len + 1);
    ck_assert_ptr_nonnull(text);
    ck_assert_uint_eq(fread(text, 1, (size_t)len, from), (size_t)len);
    text[len] = '\0';
    fclose(from);
    return text;
}

/* tests/data/checks/NAME.json; cJSON_Delete it. */
static inline cJSON *values_load(const char *name)
{
    char path[256];
    snprintf(path, sizeof path, "tests/data/checks/%s.json", name);
    char *text = values_text(path);
    cJSON *all = cJSON_Parse(text);
    ck_assert_msg(all != NULL, "%s: not JSON", path);
    free(text);
    return all;
}

static inline const cJSON *values_at(const cJSON *object, const char *key)
{
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(object, key);
    ck_assert_msg(value != NULL, "no %s", key);
    return value;
}

/* The first case whose name begins so. */
static inline const cJSON *values_case(const cJSON *all, const char *name)
{
    const cJSON *c;
    cJSON_ArrayForEach(c, values_at(all, "cases"))
    {
        const char *own = values_at(c, "name")->valuestring;
        if (strncmp(own, name, strlen(name)) == 0)
            return c;
    }
    ck_abort_msg("no case %s", name);
    return NULL;
}

static inline double values_number(const cJSON *object, const char *key)
{
    const cJSON *value = values_at(object, key);
    ck_assert_msg(cJSON_IsNumber(value), "%s is no number", key);
    return value->valuedouble;
}

static inline int values_flatten(const cJSON *list, double *out, int max)
{
    if (cJSON_IsNumber(list)) {
        ck_assert_int_gt(max, 0);
        *out = list->valuedouble;
        return 1;
    }
    ck_assert(cJSON_IsArray(list));
    int n = 0;
    const cJSON *item;
    cJSON_ArrayForEach(item, list) n += values_flatten(item, out + n, max - n);
    return n;
}

/* Lists of lists row by row; returns how many numbers. */
static inline int values_list(const cJSON *object, const char *key, double *out,
                              int max)
{
    return values_flatten(values_at(object, key), out, max);
}

static inline int64_t values_ns(double t_s)
{
    return llround(t_s * 1e9);
}

/* --- nearness --------------------------------------------------------------
 */

/* max |got - want| / max(1, |want|). */
static inline double values_off(int n, const double *got, const double *want)
{
    double worst = 0;
    for (int i = 0; i < n; i++) {
        double off = fabs(got[i] - want[i]) / fmax(1, fabs(want[i]));
        if (!(off <= worst)) /* a NaN stays the worst */
            worst = off;
    }
    return worst;
}

/* max |got_ij - want_ij| / sqrt(want_ii want_jj), n x n. */
static inline double values_covariance_off(int n, const double *got,
                                           const double *want)
{
    double worst = 0;
    for (int i = 0; i < n; i++) {
        for (int j = 0; j < n; j++) {
            double size = sqrt(want[i * n + i] * want[j * n + j]);
            double off = fabs(got[i * n + j] - want[i * n + j]) / size;
            if (!(off <= worst))
                worst = off;
        }
    }
    return worst;
}

/* How many decimal digits of every element are right. */
static inline double values_digits(int n, const double *got, const double *want)
{
    double worst = 0;
    for (int i = 0; i < n; i++) {
        double off = fabs(got[i] - want[i]) / fabs(want[i]);
        if (!(off <= worst))
            worst = off;
    }
    return worst > 0 ? -log10(worst) : 17;
}

#define CHECK_NEAR(n, got, want, tol)                                          \
    ck_assert_double_le(values_off(n, got, want), tol)
#define CHECK_COVARIANCE(n, got, want, tol)                                    \
    ck_assert_double_le(values_covariance_off(n, got, want), tol)

#endif
