/* State blocks: their names, units and matrices. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <ctype.h>
#include <stdio.h>
#include <string.h>

static bool is_state_name(const char *name)
{
    size_t n = strspn(name, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUV"
                            "WXYZ0123456789_");
    return isalpha((unsigned char)name[0]) && name[n] == '\0' && n <= 48 &&
           strcmp(name, "at") != 0;
}

/* A name and a unit; false if either was reported. */
static bool check_names(struct loading *l, const cJSON *node, const cJSON *name,
                        const cJSON *unit, const struct rig_kind *kind)
{
    double scale, shift;
    struct err err;
    int n = l->problems->n;
    if (cJSON_IsArray(name) || cJSON_IsArray(unit))
        loading_error(l, node,
                      "only a linear block lists names and units; give one of "
                      "each");
    else if (name == NULL)
        loading_error(l, node,
                      "a state block has no name; give \"name\": "
                      "\"x\"");
    else if (cJSON_IsString(name) && !is_state_name(name->valuestring))
        loading_error(l, name,
                      "\"%.64s\" cannot name a state; use a letter, "
                      "then letters, digits and _ (not \"at\")",
                      name->valuestring);
    else if (loading_state(kind, loading_text(name)) >= 0)
        loading_error(l, name, "the state \"%s\" stands twice; rename one",
                      name->valuestring);
    if (unit == NULL)
        loading_error(l, node,
                      "the state \"%.64s\" has no unit; give "
                      "\"unit\": \"m\", or \"1\" for none",
                      loading_text(name));
    else if (strlen(loading_text(unit)) >= RIG_UNIT_SIZE - 4)
        loading_error(l, unit, "a unit may have 27 bytes; shorten it");
    else if (cJSON_IsString(unit) &&
             quantity_convert(l->units, unit->valuestring, unit->valuestring,
                              &scale, &shift, &err) != ST_OK)
        loading_error(l, unit, "%s", err.text);
    return l->problems->n == n && cJSON_IsString(name) && cJSON_IsString(unit);
}

static bool has_room(struct loading *l, const cJSON *node,
                     const struct rig_kind *kind, int n)
{
    bool is_good =
        kind->n + n <= RIG_STATES_MAX && kind->n_blocks < RIG_BLOCKS_MAX;
    if (!is_good)
        loading_error(l, node,
                      "a track holds %d states in %d blocks at most; "
                      "leave some out",
                      RIG_STATES_MAX, RIG_BLOCKS_MAX);
    return is_good;
}

/* --- linear ------------------------------------------------------------------
 */

/* The i-th of a list, or the one value; NULL beyond the end. */
static const cJSON *item(const cJSON *node, int i)
{
    if (cJSON_IsArray(node))
        return cJSON_GetArrayItem(node, i);
    return i == 0 ? node : NULL;
}

static int count(const cJSON *node)
{
    return cJSON_IsArray(node) ? cJSON_GetArraySize(node) : node != NULL;
}

/* n rows of numbers, as many in each: returns how many, 0 and a report if it
 * is none.  `out` has room for n * most. */
static int matrix(struct loading *l, const cJSON *object, const char *key,
                  int n, int most, double *out)
{
    const cJSON *node = loading_get(object, key);
    int width = count(item(node, 0));
    bool is_good = count(node) == n && width >= 1 && width <= most;
    for (int i = 0; i < n && is_good; i++) {
        const cJSON *row = item(node, i);
        is_good = count(row) == width;
        for (int j = 0; j < width && is_good; j++) {
            is_good = cJSON_IsNumber(item(row, j));
            if (is_good)
                out[i * width + j] = item(row, j)->valuedouble;
        }
    }
    if (is_good)
        return width;
    loading_error_key(l, node != NULL ? node : object,
                      "\"%s\" of a linear block must be %d rows of numbers, "
                      "in the declared units per second; write it like "
                      "[[0, 1], [-4, -0.2]]",
                      key, n);
    return 0;
}

/* W = G diag(q) G'. */
static void linear_noise(struct loading *l, const cJSON *node,
                         const struct rig_kind *kind, int at, int n, double *W)
{
    const cJSON *q = loading_get(node, "q");
    double G[RIG_LINEAR_MAX * RIG_LINEAR_MAX] = {0}, density[RIG_LINEAR_MAX];
    bool has_G = loading_get(node, "G") != NULL;
    char unit[2 * RIG_UNIT_SIZE];
    int width = n;
    for (int i = 0; i < n; i++)
        G[i * n + i] = 1;
    if (has_G)
        width = matrix(l, node, "G", n, RIG_LINEAR_MAX, G);
    if (width > 0 && count(q) != width) {
        loading_error_key(l, q != NULL ? q : node,
                          "\"q\" of a linear block lists %d densities, one "
                          "for each %s; correct it",
                          width, has_G ? "column of G" : "state");
        return;
    }
    for (int k = 0; k < width; k++) {
        loading_density_unit(kind->state[at + k % n].unit, 1, unit,
                             sizeof unit);
        if (!loading_size(l, item(q, k), has_G ? "1" : unit, false,
                          &density[k]))
            return;
    }
    for (int i = 0; i < n; i++)
        for (int j = 0; j < n; j++) {
            W[i * n + j] = 0;
            for (int k = 0; k < width; k++) /* W = G diag(q) G' */
                W[i * n + j] +=
                    G[i * width + k] * density[k] * G[j * width + k];
        }
}

/* c = -A mean: what the block returns to. */
static void linear_mean(struct loading *l, const cJSON *node,
                        const struct rig_kind *kind, int at, int n,
                        const double *A, double *c)
{
    const cJSON *mean = loading_get(node, "mean");
    double m[RIG_LINEAR_MAX] = {0};
    if (mean != NULL && count(mean) != n)
        loading_error_key(l, mean,
                          "\"mean\" lists %d values, one for each "
                          "state; correct it",
                          n);
    for (int i = 0; i < n && count(mean) == n; i++)
        loading_quantity(l, item(mean, i), kind->state[at + i].unit,
                         QUANTITY_POINT, &m[i]);
    for (int i = 0; i < n; i++) {
        c[i] = 0;
        for (int j = 0; j < n; j++)
            c[i] -= A[i * n + j] * m[j];
    }
}

/* A block of the user's own A, G and q. */
static void linear(struct loading *l, const cJSON *node, struct rig_kind *kind)
{
    const cJSON *name = loading_get(node, "name");
    const cJSON *unit = loading_get(node, "unit");
    int n = count(name), at = kind->n, problems = l->problems->n;
    if (n < 1 || n > RIG_LINEAR_MAX ||
        (count(unit) != n && cJSON_IsArray(unit))) {
        loading_error_key(l, node,
                          "a linear block needs \"name\" with 1 to %d names "
                          "and \"unit\" with as many, or one for all; write "
                          "it like \"name\": [\"core\", \"rim\"]",
                          RIG_LINEAR_MAX);
        return;
    }
    if (!has_room(l, node, kind, n))
        return;
    for (int i = 0; i < n; i++) {
        const cJSON *own = cJSON_IsArray(unit) ? item(unit, i) : unit;
        if (!check_names(l, node, item(name, i), own, kind))
            return;
        struct rig_state *s = &kind->state[kind->n++];
        snprintf(s->name, sizeof s->name, "%.50s", loading_text(item(name, i)));
        snprintf(s->unit, sizeof s->unit, "%s", loading_text(own));
    }
    struct block b = {
        .model = BLOCK_LINEAR, .at = at, .n = n, .own = kind->n_own};
    double *A = kind->own + b.own;
    if (kind->n_own + 2 * n * n + n > RIG_OWN_MAX) {
        loading_error(l, node,
                      "the linear blocks of a track are too large; "
                      "leave some out");
        return;
    }
    if (matrix(l, node, "A", n, n, A) == n && l->problems->n == problems) {
        linear_noise(l, node, kind, at, n, A + n * n);
        linear_mean(l, node, kind, at, n, A, A + 2 * n * n);
    }
    kind->n_own += 2 * n * n + n;
    kind->block[kind->n_blocks++] = b;
}

/* --- any
 * ----------------------------------------------------------------------- */

void loading_block(struct loading *l, const cJSON *node, struct rig_kind *kind)
{
    static const char *const suffix[] = {"", ".rate", ".accel"};
    const cJSON *model = loading_get(node, "model");
    int at = kind->n, m = 0;
    if (model == NULL)
        loading_error(l, node,
                      "a state block has no model; give \"model\": "
                      "\"constant-velocity\" or another");
    while (loading_models[m] != NULL &&
           strcmp(loading_models[m], loading_text(model)) != 0)
        m++;
    if (loading_models[m] != NULL && m == BLOCK_LINEAR) {
        linear(l, node, kind);
        return;
    }
    if (!check_names(l, node, loading_get(node, "name"),
                     loading_get(node, "unit"), kind) ||
        loading_models[m] == NULL)
        return;
    struct block b = {.model = (enum block_model)m, .at = at};
    b.n = block_states(b.model);
    if (!has_room(l, node, kind, b.n))
        return;
    for (int i = 0; i < b.n; i++) {
        struct rig_state *s = &kind->state[at + i];
        snprintf(s->name, sizeof s->name, "%.50s%s",
                 loading_text(loading_get(node, "name")), suffix[i]);
        quantity_derivative_unit(loading_text(loading_get(node, "unit")), i,
                                 s->unit, sizeof s->unit);
        s->is_constant = b.model == BLOCK_CONSTANT;
    }
    kind->n += b.n;
    loading_noise(l, node, &b, &kind->state[at]);
    kind->block[kind->n_blocks++] = b;
}
