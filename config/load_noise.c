/* Noise of state blocks: densities, and the words that stand for them. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <ctype.h>
#include <stdio.h>
#include <string.h>

#include "core/math/real.h"

const char *const loading_models[] = {"constant",
                                      "random-walk",
                                      "gauss-markov",
                                      "constant-velocity",
                                      "constant-acceleration",
                                      "oscillator",
                                      "singer",
                                      "linear",
                                      NULL};

/* The unit of q: the state unit squared, over seconds to the power. */
void loading_density_unit(const char *unit, int seconds, char *out, size_t size)
{
    bool is_word = true;
    for (const char *s = unit; *s != '\0'; s++)
        is_word = is_word && isalpha((unsigned char)*s);
    char over[12] = "";
    if (seconds > 1)
        snprintf(over, sizeof over, "%d", seconds);
    if (strcmp(unit, "1") == 0)
        snprintf(out, size, "1/s%s", over);
    else
        snprintf(out, size, is_word ? "%s2/s%s" : "(%s)^2/s%s", unit, over);
}

/* What an unmodelled motion is called, and how often it is integrated. */
static const char *unmodelled_key(enum block_model model)
{
    switch (model) {
    case BLOCK_RANDOM_WALK:
        return "rate";
    case BLOCK_CONSTANT_VELOCITY:
        return "accel";
    case BLOCK_CONSTANT_ACCELERATION:
        return "jerk";
    case BLOCK_OSCILLATOR:
        return "accel";
    case BLOCK_CONSTANT:
    case BLOCK_GAUSS_MARKOV:
    case BLOCK_SINGER:
    case BLOCK_LINEAR:
    case BLOCK_LAG:
        break;
    }
    return NULL;
}

/* q = a^2 lasts. */
static void unmodelled(struct loading *l, const cJSON *object, struct block *b,
                       const char *unit)
{
    const char *key = unmodelled_key(b->model);
    const cJSON *lasts = loading_get(object, "lasts");
    const cJSON *node = loading_get(object, key), *each;
    char motion[2 * RIG_UNIT_SIZE];
    double a, t_s;
    if (!cJSON_IsObject(object))
        return;
    cJSON_ArrayForEach(each, object)
    {
        if (each != node && each != lasts &&
            (strcmp(each->string, "rate") == 0 ||
             strcmp(each->string, "accel") == 0 ||
             strcmp(each->string, "jerk") == 0))
            loading_error_key(l, each,
                              "\"%s\" does not belong to %s; give "
                              "\"%s\"",
                              each->string, loading_models[b->model], key);
    }
    if (node == NULL || lasts == NULL) {
        loading_error_key(l, object,
                          "\"unmodelled\" needs \"%s\" and "
                          "\"lasts\"; give both",
                          key);
        return;
    }
    quantity_derivative_unit(unit, b->n, motion, sizeof motion);
    if (loading_size(l, node, motion, false, &a) &&
        loading_size(l, lasts, "s", false, &t_s))
        b->q = a * a * t_s; /* q = a^2 lasts */
}

/* Keys that another model has. */
static void refuse_key(struct loading *l, const cJSON *node, const char *key,
                       const struct block *b)
{
    const cJSON *at = loading_get(node, key);
    if (at != NULL)
        loading_error_key(l, at,
                          "\"%s\" does not belong to the model %s; "
                          "remove it",
                          key, loading_models[b->model]);
}

static void gauss_markov(struct loading *l, const cJSON *node, struct block *b,
                         struct rig_state *state)
{
    const cJSON *tau = loading_get(node, "tau"), *u = loading_get(node, "u");
    const cJSON *q = loading_get(node, "q"), *mean = loading_get(node, "mean");
    char unit[2 * RIG_UNIT_SIZE];
    double spread;
    refuse_key(l, node, "unmodelled", b);
    loading_density_unit(state->unit, 1, unit, sizeof unit);
    if (mean != NULL)
        loading_quantity(l, mean, state->unit, QUANTITY_POINT, &b->mean);
    if (tau == NULL || (u == NULL) == (q == NULL)) {
        loading_error_key(l, node,
                          "the gauss-markov state \"%s\" needs "
                          "\"tau\" and either \"u\" or \"q\"; give them",
                          state->name);
        return;
    }
    if (!loading_size(l, tau, "s", true, &b->tau_s))
        return;
    if (u != NULL && loading_size(l, u, state->unit, true, &spread))
        b->q = 2 * spread * spread / b->tau_s; /* u^2 = q tau / 2 */
    if (q != NULL)
        loading_size(l, q, unit, true, &b->q);
}

/* The damped oscillation about a mean: frequency, damping, and its spread u,
 * its density q, or words. */
static void oscillator(struct loading *l, const cJSON *node, struct block *b,
                       struct rig_state *state)
{
    const cJSON *frequency = loading_get(node, "frequency");
    const cJSON *damping = loading_get(node, "damping");
    const cJSON *u = loading_get(node, "u"), *q = loading_get(node, "q");
    const cJSON *words = loading_get(node, "unmodelled");
    const cJSON *mean = loading_get(node, "mean");
    char unit[2 * RIG_UNIT_SIZE];
    double frequency_hz = 0, spread = 0;
    if (frequency == NULL || damping == NULL ||
        (u != NULL) + (q != NULL) + (words != NULL) != 1) {
        loading_error_key(l, node,
                          "the oscillator \"%s\" needs \"frequency\", "
                          "\"damping\" and one of \"u\", \"q\", "
                          "\"unmodelled\"; give them",
                          state->name);
        return;
    }
    if (mean != NULL)
        loading_quantity(l, mean, state->unit, QUANTITY_POINT, &b->mean);
    if (!loading_size(l, frequency, "Hz", true, &frequency_hz) ||
        !loading_size(l, damping, "1", false, &b->zeta))
        return;
    b->omega_rad_s = 2 * REAL_PI * frequency_hz;
    double w = b->omega_rad_s;
    if (u != NULL && !(b->zeta > 0))
        loading_error(l, u,
                      "an undamped oscillator has no spread of its own; give "
                      "\"q\" or \"unmodelled\", or a \"damping\"");
    else if (u != NULL && loading_size(l, u, state->unit, true, &spread))
        b->q = 4 * b->zeta * w * w * w * spread * spread; /* q / (4 zeta w^3) */
    loading_density_unit(state->unit, 3, unit, sizeof unit);
    if (q != NULL)
        loading_size(l, q, unit, false, &b->q);
    unmodelled(l, words, b, state->unit);
}

/* An acceleration that fades: tau, and its spread u or density q. */
static void singer(struct loading *l, const cJSON *node, struct block *b,
                   struct rig_state *state)
{
    const cJSON *tau = loading_get(node, "tau"), *u = loading_get(node, "u");
    const cJSON *q = loading_get(node, "q");
    char unit[2 * RIG_UNIT_SIZE];
    double spread = 0;
    refuse_key(l, node, "unmodelled", b);
    refuse_key(l, node, "mean", b);
    if (tau == NULL || (u == NULL) == (q == NULL)) {
        loading_error_key(l, node,
                          "the singer block \"%s\" needs \"tau\" and either "
                          "\"u\" of its acceleration or \"q\"; give them",
                          state->name);
        return;
    }
    if (!loading_size(l, tau, "s", true, &b->tau_s))
        return;
    if (u != NULL && loading_size(l, u, state[2].unit, true, &spread))
        b->q = 2 * spread * spread / b->tau_s; /* u^2 = q tau / 2 */
    loading_density_unit(state->unit, 5, unit, sizeof unit);
    if (q != NULL)
        loading_size(l, q, unit, false, &b->q);
}

/* Models that are noise of one density only. */
static void plain(struct loading *l, const cJSON *node, struct block *b,
                  struct rig_state *state)
{
    const cJSON *q = loading_get(node, "q");
    const cJSON *words = loading_get(node, "unmodelled");
    char unit[2 * RIG_UNIT_SIZE];
    refuse_key(l, node, "tau", b);
    refuse_key(l, node, "u", b);
    refuse_key(l, node, "mean", b);
    if (b->model == BLOCK_CONSTANT) {
        refuse_key(l, node, "q", b);
        refuse_key(l, node, "unmodelled", b);
        return;
    }
    if ((q == NULL) == (words == NULL)) {
        loading_error_key(l, node,
                          "the state \"%s\" needs either \"q\" or "
                          "\"unmodelled\"; give one, like \"unmodelled\": "
                          "{\"%s\": .., \"lasts\": ..}",
                          state->name, unmodelled_key(b->model));
        return;
    }
    loading_density_unit(state->unit, 2 * b->n - 1, unit, sizeof unit);
    if (q != NULL)
        loading_size(l, q, unit, false, &b->q);
    else
        unmodelled(l, words, b, state->unit);
}

void loading_noise(struct loading *l, const cJSON *node, struct block *b,
                   struct rig_state *state)
{
    if (cJSON_IsArray(loading_get(node, "q")) ||
        cJSON_IsArray(loading_get(node, "mean"))) {
        loading_error(l, node,
                      "only a linear block lists \"q\" and \"mean\"; "
                      "give one value");
        return;
    }
    static const char *const own[] = {"A", "G"};
    if (b->model != BLOCK_OSCILLATOR) {
        refuse_key(l, node, "frequency", b);
        refuse_key(l, node, "damping", b);
    } else {
        refuse_key(l, node, "tau", b);
    }
    for (int i = 0; i < 2; i++)
        refuse_key(l, node, own[i], b);
    switch (b->model) {
    case BLOCK_GAUSS_MARKOV:
        gauss_markov(l, node, b, state);
        break;
    case BLOCK_OSCILLATOR:
        oscillator(l, node, b, state);
        break;
    case BLOCK_SINGER:
        singer(l, node, b, state);
        break;
    default:
        plain(l, node, b, state);
    }
    for (int i = 0; i < b->n; i++) /* it starts from its own spread */
        state[i].has_prior =
            block_is_stationary(b, i, &state[i].prior_mean, &state[i].prior_u);
}
