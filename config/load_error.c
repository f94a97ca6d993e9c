/* What stands between what a sensor reads and what it says:
 *     reading = scale * lag(reads) + offset + plus + noise.
 * What is not known exactly becomes a state of the track, named after the
 * sensor. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

struct erring {
    struct loading *l;
    const cJSON *sensor;
    struct rig_kind *kind;
    struct rig_sensor *s;
    const char *unit; /* of what is read                                   */
    int i;            /* component                                         */
};

/* {mean, u, tau} of an error; tau 0: it is constant. */
struct unknown {
    bool is_state;
    double mean, u, tau_s;
};

static bool check_keys(struct loading *l, const cJSON *object,
                       const char *const *keys)
{
    const cJSON *node;
    int n = l->problems->n;
    cJSON_ArrayForEach(node, object)
    {
        int k = 0;
        while (keys[k] != NULL && strcmp(keys[k], node->string) != 0)
            k++;
        if (keys[k] == NULL)
            loading_unknown(l, node, true, "setting", node->string, keys);
    }
    return l->problems->n == n;
}

/* A value, or {mean, u, tau}; `mean` is its default. */
static bool take_unknown(struct erring *e, const cJSON *node, const char *unit,
                         double mean, struct unknown *out)
{
    static const char *const keys[] = {"mean", "u", "tau", NULL};
    const cJSON *u = loading_get(node, "u"), *tau = loading_get(node, "tau");
    const cJSON *given = loading_get(node, "mean");
    *out = (struct unknown){cJSON_IsObject(node), mean, 0, 0};
    if (!out->is_state)
        return loading_quantity(e->l, node, unit, QUANTITY_DIFFERENCE,
                                &out->mean);
    if (!check_keys(e->l, node, keys))
        return false;
    if (u == NULL) {
        loading_error(e->l, node,
                      "an error that is estimated needs \"u\", how large it "
                      "may be; give {\"u\": ..}, with \"tau\" if it drifts");
        return false;
    }
    return loading_size(e->l, u, unit, true, &out->u) &&
           (given == NULL ||
            loading_quantity(e->l, given, unit, QUANTITY_DIFFERENCE,
                             &out->mean)) &&
           (tau == NULL || loading_size(e->l, tau, "s", true, &out->tau_s));
}

/* A state of the sensor's own; -1 and a report when there is no room. */
static int add_state(struct erring *e, const cJSON *node, const char *what,
                     const char *unit, struct block b)
{
    struct rig_kind *kind = e->kind;
    char part[16] = "";
    if (e->s->reads.m > 1)
        snprintf(part, sizeof part, ".%d", e->i + 1);
    if (kind->n == RIG_STATES_MAX || kind->n_blocks == RIG_BLOCKS_MAX) {
        loading_error(e->l, node,
                      "a track holds %d states in %d blocks at most, those of "
                      "its sensors included; leave some out",
                      RIG_STATES_MAX, RIG_BLOCKS_MAX);
        return -1;
    }
    struct rig_state *s = &kind->state[kind->n];
    if (strlen(e->s->name) + strlen(what) + strlen(part) + 2 > sizeof s->name) {
        loading_error(e->l, node,
                      "the sensor's name is too long for the states that are "
                      "named after it; shorten it");
        return -1;
    }
    snprintf(s->name, sizeof s->name, "%.40s.%s%s", e->s->name, what, part);
    snprintf(s->unit, sizeof s->unit, "%s", unit);
    s->is_constant = b.model == BLOCK_CONSTANT;
    b.at = kind->n++;
    b.n = 1;
    kind->block[kind->n_blocks++] = b;
    return b.at;
}

/* Constant, or with a correlation time; it starts at its mean and u. */
static int add_unknown(struct erring *e, const cJSON *node, const char *what,
                       const char *unit, const struct unknown *v)
{
    struct block b = {.model = BLOCK_CONSTANT};
    if (v->tau_s > 0)
        b = (struct block){.model = BLOCK_GAUSS_MARKOV,
                           .tau_s = v->tau_s,
                           .mean = v->mean,
                           .q = 2 * v->u * v->u / v->tau_s}; /* u^2 = q tau/2 */
    int state = add_state(e, node, what, unit, b);
    if (state >= 0) {
        e->kind->state[state].has_prior = true;
        e->kind->state[state].prior_mean = v->mean;
        e->kind->state[state].prior_u = v->u;
    }
    return state;
}

static struct reads_row *row_of(const struct erring *e)
{
    return &e->s->reads.row[e->i];
}

static struct reads_error *error_of(const struct erring *e)
{
    struct reads_error *error = &row_of(e)->error;
    if (!error->has_any)
        *error =
            (struct reads_error){.has_any = true, .scale = -1, .factor = 1};
    return error;
}

/* Sums of states stay sums, which need no iteration. */
static bool is_sum(const struct erring *e)
{
    return row_of(e)->kind == READS_LINEAR && !row_of(e)->error.has_any;
}

static void add_to_reading(struct erring *e, const cJSON *node, int state)
{
    struct reads_row *row = row_of(e);
    bool is_linear = is_sum(e);
    if (state < 0)
        return;
    if (is_linear ? row->n_terms == READS_TERMS_MAX
                  : error_of(e)->n_added == READS_ADDED_MAX)
        loading_error(e->l, node,
                      "too many states in one reading; leave some "
                      "out");
    else if (is_linear)
        row->term[row->n_terms++] = (struct reads_term){state, 1};
    else
        error_of(e)->added[error_of(e)->n_added++] = state;
}

/* --- each error
 * ---------------------------------------------------------------- */

/* dy/dt = (sum - y) / tau; y is read instead. */
static void lag(struct erring *e)
{
    const cJSON *node = loading_component(e->l, loading_get(e->sensor, "lag"),
                                          e->i, e->s->reads.m);
    struct reads_row *row = row_of(e);
    double tau_s;
    if (node == NULL)
        return;
    if (cJSON_IsObject(node) || row->kind != READS_LINEAR) {
        loading_error(e->l, node,
                      cJSON_IsObject(node)
                          ? "a lag that is estimated is not built yet; give "
                            "one time"
                          : "a lag of anything but a sum of states is not "
                            "built yet; remove it");
        return;
    }
    if (!loading_size(e->l, node, "s", true, &tau_s))
        return;
    if (e->kind->n_couplings + row->n_terms > RIG_COUPLINGS_MAX) {
        loading_error(e->l, node, "too many lags in one track; leave some out");
        return;
    }
    int y = add_state(e, node, "lag", e->unit,
                      (struct block){.model = BLOCK_LAG, .tau_s = tau_s});
    if (y < 0)
        return;
    for (int k = 0; k < row->n_terms; k++)
        e->kind->coupling[e->kind->n_couplings++] = (struct rig_coupling){
            y, row->term[k].state, row->term[k].value / tau_s};
    row->n_terms = 1;
    row->term[0] = (struct reads_term){y, 1};
}

static void scale(struct erring *e)
{
    const cJSON *node = loading_component(e->l, loading_get(e->sensor, "scale"),
                                          e->i, e->s->reads.m);
    struct unknown v;
    if (node == NULL || !take_unknown(e, node, "1", 1, &v))
        return;
    if (v.is_state) {
        error_of(e)->scale = add_unknown(e, node, "scale", "1", &v);
        return;
    }
    if (v.mean == 0)
        loading_error(e->l, node, "a scale of 0 reads nothing; correct it");
    if (!is_sum(e))
        error_of(e)->factor *= v.mean;
    for (int k = 0; k < row_of(e)->n_terms && is_sum(e); k++)
        row_of(e)->term[k].value *= v.mean;
}

static void offset(struct erring *e)
{
    const cJSON *node = loading_component(
        e->l, loading_get(e->sensor, "offset"), e->i, e->s->reads.m);
    struct unknown v;
    if (node == NULL || !take_unknown(e, node, e->unit, 0, &v))
        return;
    if (v.is_state)
        add_to_reading(e, node, add_unknown(e, node, "offset", e->unit, &v));
    else if (is_sum(e))
        e->s->shift[e->i] -= v.mean;
    else
        error_of(e)->constant += v.mean;
}

static void plus_one(struct erring *e, const cJSON *node)
{
    const char *list[RIG_STATES_MAX + 1];
    const char *name = loading_text(node);
    double to_scale, shift;
    struct err err;
    int state = loading_state(e->kind, name);
    if (state < 0) {
        loading_state_names(e->kind, list);
        loading_unknown(e->l, node, false, "state", name, list);
    } else if (quantity_convert(e->l->units, e->kind->state[state].unit,
                                e->unit, &to_scale, &shift, &err) != ST_OK) {
        loading_error(e->l, node, "%s", err.text);
    } else if (fabs(to_scale - 1) > 1e-12) {
        loading_error(e->l, node,
                      "\"%s\" is in %s, but %s is read; declare both in one "
                      "unit",
                      name, e->kind->state[state].unit, e->unit);
    } else {
        add_to_reading(e, node, state);
    }
}

static void plus(struct erring *e)
{
    const cJSON *node = loading_get(e->sensor, "plus"), *each;
    if (cJSON_IsString(node))
        plus_one(e, node);
    cJSON_ArrayForEach(each, node) plus_one(e, each);
}

/* Noise that follows itself: rho after `every`, or tau.  u is all of it; what
 * stays white is the resolution, or a thousandth. */
static void noise(struct erring *e)
{
    const cJSON *node = loading_get(e->sensor, "noise");
    const cJSON *rho = loading_get(node, "rho");
    const cJSON *every = loading_get(node, "every");
    const cJSON *tau = loading_get(node, "tau");
    struct unknown v = {true, 0, 0, 0};
    double every_s, white = 1e-6 * e->s->r[e->i];
    if (node == NULL)
        return;
    if ((tau == NULL) == (rho == NULL) || (rho == NULL) != (every == NULL)) {
        loading_error(e->l, node,
                      "\"noise\" needs \"tau\", or \"rho\" and \"every\"; give "
                      "the correlation between readings so far apart");
        return;
    }
    if (tau != NULL && !loading_size(e->l, tau, "s", true, &v.tau_s))
        return;
    if (rho != NULL) {
        if (!(rho->valuedouble > 0 && rho->valuedouble < 1)) {
            loading_error(e->l, rho,
                          "\"rho\" must lie between 0 and 1; "
                          "correct it");
            return;
        }
        if (!loading_size(e->l, every, "s", true, &every_s))
            return;
        v.tau_s = -every_s / log(rho->valuedouble); /* rho = e^(-every/tau) */
    }
    v.u = sqrt(e->s->r[e->i] - white);
    e->s->r[e->i] = white;
    add_to_reading(e, node, add_unknown(e, node, "noise", e->unit, &v));
}

void loading_errors(struct loading *l, const cJSON *sensor,
                    struct rig_sensor *s, char units[READS_MAX][RIG_UNIT_SIZE])
{
    struct erring e = {l, sensor, &l->s->rig.kind[s->kind], s, NULL, 0};
    for (; e.i < s->reads.m; e.i++) {
        e.unit = units[e.i];
        lag(&e);
        scale(&e);
        plus(&e);
        offset(&e);
        noise(&e);
    }
}
