/* What a sensor reads: states, sums, products and polynomials of them. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/reading.h"

#include <stdio.h>
#include <string.h>

void reading_unknown_state(const struct reading *c, const cJSON *at,
                           bool at_key, const char *name)
{
    const char *list[RIG_STATES_MAX + 1];
    loading_state_names(c->kind, list);
    loading_unknown(c->l, at, at_key, "state", name, list);
}

/* A new row, or NULL when there are too many. */
struct reads_row *reading_add_row(const struct reading *c, const cJSON *node,
                                  enum reads_kind kind, const char *unit)
{
    struct reads *r = &c->s->reads;
    if (r->m == READS_MAX) {
        loading_error(c->l, node,
                      "a sensor reads %d components at most; make "
                      "two sensors of it",
                      READS_MAX);
        return NULL;
    }
    snprintf(c->units[r->m], RIG_UNIT_SIZE, "%s", unit);
    struct reads_row *row = &r->row[r->m++];
    row->kind = kind;
    return row;
}

static void read_state(const struct reading *c, const cJSON *node)
{
    int i = loading_state(c->kind, node->valuestring);
    if (i < 0) {
        reading_unknown_state(c, node, false, node->valuestring);
        return;
    }
    struct reads_row *row =
        reading_add_row(c, node, READS_LINEAR, c->kind->state[i].unit);
    if (row == NULL)
        return;
    row->n_terms = 1;
    row->term[0] = (struct reads_term){i, 1};
}

/* {"x": 1, "bias": 1}: the sum in the unit of the first state.  A state of
 * the same kind in another unit is converted; for any other the coefficient
 * carries the unit. */
static void read_sum(const struct reading *c, const cJSON *object)
{
    const cJSON *node;
    struct reads_row *row = NULL;
    const char *unit = "";
    cJSON_ArrayForEach(node, object)
    {
        double scale, shift;
        int i = loading_state(c->kind, node->string);
        if (i < 0) {
            reading_unknown_state(c, node, true, node->string);
            return;
        }
        if (!cJSON_IsNumber(node) || node->valuedouble == 0) {
            loading_error(c->l, node,
                          "the coefficient of \"%.64s\" must be a "
                          "number other than 0; correct it",
                          node->string);
            return;
        }
        if (row == NULL)
            unit = c->kind->state[i].unit;
        if (row == NULL &&
            (row = reading_add_row(c, object, READS_LINEAR, unit)) == NULL)
            return;
        if (row->n_terms == READS_TERMS_MAX) {
            loading_error_key(c->l, node,
                              "a sum has %d states at most; leave "
                              "some out",
                              READS_TERMS_MAX);
            return;
        }
        if (quantity_convert(c->l->units, c->kind->state[i].unit, unit, &scale,
                             &shift, NULL) != ST_OK)
            scale = 1;
        row->term[row->n_terms++] =
            (struct reads_term){i, node->valuedouble * scale};
    }
    if (row == NULL)
        loading_error(c->l, object, "\"reads\" names no state; name one");
}

/* {"product": ["wheel", "x.rate", 2]}: the unit is that of all states. */
static void read_product(const struct reading *c, const cJSON *form)
{
    const cJSON *node;
    char unit[4 * RIG_UNIT_SIZE] = "";
    struct reads_row *row = reading_add_row(c, form, READS_PRODUCT, "1");
    if (row == NULL)
        return;
    cJSON_ArrayForEach(node, form)
    {
        int i = loading_state(c->kind, loading_text(node));
        if (i < 0 && !cJSON_IsNumber(node)) {
            reading_unknown_state(c, node, false, loading_text(node));
            return;
        }
        if (row->n_terms == READS_TERMS_MAX) {
            loading_error(c->l, node, "too many factors; leave some out");
            return;
        }
        row->term[row->n_terms++] =
            (struct reads_term){i, i < 0 ? node->valuedouble : 0};
        size_t len = strlen(unit);
        const char *own = i < 0 ? "1" : c->kind->state[i].unit;
        if (strcmp(own, "1") != 0 && len < sizeof unit)
            snprintf(unit + len, sizeof unit - len, "%s(%s)",
                     len > 0 ? "." : "", own);
    }
    /* One factor with a unit needs no brackets. */
    size_t len = strlen(unit);
    char *text = c->units[c->s->reads.m - 1];
    if (len == 0)
        return;
    bool is_one = strchr(unit, ')') == unit + len - 1;
    if (len - 2 * is_one >= RIG_UNIT_SIZE)
        loading_error(c->l, form,
                      "the unit of this product is too long; "
                      "declare states in shorter units");
    else
        snprintf(text, RIG_UNIT_SIZE, "%.*s", (int)(len - 2 * is_one),
                 unit + is_one);
}

/* {"polynomial": "T", "coefficients": [0.1, "gain"]}: in the sensor's unit. */
static void read_polynomial(const struct reading *c, const cJSON *object,
                            const cJSON *form)
{
    static const char *const keys[] = {"polynomial", "coefficients", NULL};
    const cJSON *list = loading_get(object, "coefficients"), *node;
    int state = loading_state(c->kind, loading_text(form));
    struct reads_row *row;
    cJSON_ArrayForEach(node, object)
    {
        if (strcmp(node->string, keys[0]) != 0 &&
            strcmp(node->string, keys[1]) != 0)
            loading_unknown(c->l, node, true, "setting", node->string, keys);
    }
    if (state < 0) {
        reading_unknown_state(c, form, false, loading_text(form));
        return;
    }
    int n = cJSON_GetArraySize(list);
    if (!cJSON_IsArray(list) || n < 1 || n >= READS_TERMS_MAX) {
        loading_error(c->l, list != NULL ? list : object,
                      "\"coefficients\" must list 1 to %d numbers or states, "
                      "that of power 0 first; write it like [0.1, \"gain\"]",
                      READS_TERMS_MAX - 1);
        return;
    }
    row = reading_add_row(c, form, READS_POLYNOMIAL, c->own_unit);
    if (row == NULL)
        return;
    row->term[row->n_terms++] = (struct reads_term){state, 0};
    cJSON_ArrayForEach(node, list)
    {
        int i = loading_state(c->kind, loading_text(node));
        if (i < 0 && !cJSON_IsNumber(node)) {
            reading_unknown_state(c, node, false, loading_text(node));
            return;
        }
        row->term[row->n_terms++] =
            (struct reads_term){i, i < 0 ? node->valuedouble : 0};
    }
}

/* True if the object is a form that is known but not built. */
static bool is_planned(const struct reading *c, const cJSON *object)
{
    static const char *const planned[] = {"change", "mean", "expression"};
    for (int i = 0; i < (int)(sizeof planned / sizeof *planned); i++) {
        const cJSON *node = loading_get(object, planned[i]);
        if (node == NULL || loading_state(c->kind, planned[i]) >= 0)
            continue;
        loading_error_key(c->l, node,
                          "\"%s\" is planned but not built yet; "
                          "remove it",
                          planned[i]);
        return true;
    }
    return false;
}

static void read_one(const struct reading *c, const cJSON *node)
{
    static const char *const forms[] = {"range", "bearing", "range-bearing"};
    if (cJSON_IsString(node)) {
        read_state(c, node);
        return;
    }
    if (!cJSON_IsObject(node)) {
        loading_error(c->l, node,
                      "\"reads\" takes states, sums, range and "
                      "bearing; write it like \"x\" or {\"x\": 1, \"bias\": "
                      "1}");
        return;
    }
    for (int i = 0; i < 3; i++) {
        const cJSON *form = loading_get(node, forms[i]);
        if (cJSON_IsArray(form)) {
            reading_place(c, node, form, i != 1, i != 0);
            return;
        }
        if (form != NULL && loading_state(c->kind, forms[i]) < 0) {
            loading_error(c->l, form,
                          "\"%s\" must be a list of coordinates; "
                          "write it like [\"x\", \"y\"]",
                          forms[i]);
            return;
        }
    }
    const cJSON *product = loading_get(node, "product");
    const cJSON *polynomial = loading_get(node, "polynomial");
    const cJSON *rate = loading_get(node, "range-rate");
    if (cJSON_IsArray(product))
        read_product(c, product);
    else if (cJSON_IsString(polynomial))
        read_polynomial(c, node, polynomial);
    else if (cJSON_IsArray(rate))
        reading_range_rate(c, node, rate);
    else if (product != NULL && loading_state(c->kind, "product") < 0)
        loading_error(c->l, product,
                      "\"product\" must be a list of states and "
                      "numbers; write it like [\"scale\", "
                      "\"x.rate\"]");
    else if (polynomial != NULL && loading_state(c->kind, "polynomial") < 0)
        loading_error(c->l, polynomial,
                      "\"polynomial\" must name a state; "
                      "write it like \"T\"");
    else if (rate != NULL && loading_state(c->kind, "range-rate") < 0)
        loading_error(c->l, rate,
                      "\"range-rate\" must be a list of "
                      "coordinates; write it like [\"x\", \"y\"]");
    else if (!is_planned(c, node))
        read_sum(c, node);
}

bool loading_reads(struct loading *l, const cJSON *sensor, struct rig_sensor *s,
                   char units[READS_MAX][RIG_UNIT_SIZE])
{
    const cJSON *node = loading_get(sensor, "reads");
    const char *unit = loading_text(loading_get(sensor, "unit"));
    const struct reading c = {l, &l->s->rig.kind[s->kind], s, units,
                              unit[0] != '\0' ? unit : "1"};
    const cJSON *each;
    int n = l->problems->n;
    if (cJSON_IsArray(node) && node->child == NULL)
        loading_error(l, node, "\"reads\" is an empty list; name a state");
    if (!cJSON_IsArray(node))
        read_one(&c, node);
    else
        cJSON_ArrayForEach(each, node) read_one(&c, each);
    return l->problems->n == n;
}
