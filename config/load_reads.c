/* What a sensor reads: states, sums, ranges and bearings. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <stdio.h>
#include <string.h>

struct reading {
    struct loading *l;
    const struct rig_kind *kind;
    struct rig_sensor *s;
    char (*units)[RIG_UNIT_SIZE];
    const char *own_unit; /* that the sensor declares, "1" if none         */
};

static void unknown_state(const struct reading *c, const cJSON *at, bool at_key,
                          const char *name)
{
    const char *list[RIG_STATES_MAX + 1];
    loading_state_names(c->kind, list);
    loading_unknown(c->l, at, at_key, "state", name, list);
}

/* A new row, or NULL when there are too many. */
static struct reads_row *add_row(const struct reading *c, const cJSON *node,
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
        unknown_state(c, node, false, node->valuestring);
        return;
    }
    struct reads_row *row =
        add_row(c, node, READS_LINEAR, c->kind->state[i].unit);
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
            unknown_state(c, node, true, node->string);
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
            (row = add_row(c, object, READS_LINEAR, unit)) == NULL)
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

/* The unit of the first state among the coordinates; NULL if there is none. */
static const char *unit_of(const struct reading *c, const cJSON *list)
{
    const cJSON *node;
    cJSON_ArrayForEach(node, list)
    {
        int i = loading_state(c->kind, loading_text(node));
        if (i >= 0)
            return c->kind->state[i].unit;
    }
    return NULL;
}

static bool coordinate(const struct reading *c, const cJSON *node,
                       const char *unit, struct reads_term *term)
{
    const char *text = loading_text(node), *rest;
    double number;
    int i = loading_state(c->kind, text);
    *term = (struct reads_term){i, 0};
    if (i < 0 && cJSON_IsString(node) &&
        !quantity_split(text, &number, &rest)) {
        unknown_state(c, node, false, text);
        return false;
    }
    if (i < 0) {
        if (cJSON_IsNumber(node) || cJSON_IsString(node))
            return loading_quantity(c->l, node, unit, QUANTITY_POINT,
                                    &term->value);
        loading_error(c->l, node,
                      "a coordinate must be a state or a length; "
                      "write \"x\" or \"1 m\"");
        return false;
    }
    if (strcmp(c->kind->state[i].unit, unit) != 0) {
        loading_error(c->l, node,
                      "\"%s\" is in %s, but another coordinate is "
                      "in %s; declare both states in one unit",
                      text, c->kind->state[i].unit, unit);
        return false;
    }
    return true;
}

/* The coordinates and "from" of a range or bearing into a row. */
static bool place(const struct reading *c, const cJSON *object,
                  const cJSON *list, const char *unit, struct reads_row *row)
{
    const cJSON *from = loading_get(object, "from");
    int n = cJSON_GetArraySize(list), problems = c->l->problems->n;
    if (!cJSON_IsArray(from) || cJSON_GetArraySize(from) != n) {
        loading_error(c->l, from != NULL ? from : object,
                      "\"from\" must list %d coordinates, as many as \"%s\"; "
                      "give the place of the sensor",
                      n, list->string);
        return false;
    }
    row->n_terms = n;
    for (int i = 0; i < n; i++) {
        const cJSON *fixed = cJSON_GetArrayItem(from, i);
        coordinate(c, cJSON_GetArrayItem(list, i), unit, &row->term[i]);
        if (!cJSON_IsNumber(fixed) && !cJSON_IsString(fixed))
            loading_error(c->l, fixed,
                          "a coordinate of \"from\" must be a "
                          "length; write it like \"2.58 m\"");
        else
            loading_quantity(c->l, fixed, unit, QUANTITY_POINT, &row->from[i]);
    }
    return c->l->problems->n == problems;
}

static void sense(const struct reading *c, const cJSON *object,
                  struct reads_row *row)
{
    const cJSON *zero = loading_get(object, "zero");
    const cJSON *turn = loading_get(object, "turn");
    const char *unit = "";
    double number = 0;
    if (zero == NULL || turn == NULL) {
        loading_error(c->l, object,
                      "a bearing needs \"zero\" and \"turn\"; "
                      "give \"zero\": \"0 deg\" and \"turn\": \"left\" or "
                      "\"right\"");
        return;
    }
    bool is_bare = cJSON_IsString(zero) &&
                   quantity_split(zero->valuestring, &number, &unit) &&
                   unit[0] == '\0';
    if (cJSON_IsNumber(zero)) {
        is_bare = true;
        number = zero->valuedouble;
    }
    if ((!cJSON_IsNumber(zero) && !cJSON_IsString(zero)) ||
        (is_bare && number != 0))
        loading_error(c->l, zero,
                      "\"zero\" must be an angle with its unit; "
                      "write it like \"90 deg\"");
    else
        loading_quantity(c->l, zero, "rad", QUANTITY_DIFFERENCE,
                         &row->zero_rad);
    row->turn = strcmp(loading_text(turn), "right") == 0 ? -1 : 1;
    if (row->turn > 0 && strcmp(loading_text(turn), "left") != 0)
        loading_error(c->l, turn,
                      "\"turn\" must be \"left\" or \"right\"; "
                      "left turns from the first axis to the second");
}

/* Keys beside the form: only its own. */
static void refuse_others(const struct reading *c, const cJSON *object,
                          const cJSON *form, bool is_bearing)
{
    const char *known[] = {form->string, "from", is_bearing ? "zero" : NULL,
                           "turn", NULL};
    const cJSON *node;
    cJSON_ArrayForEach(node, object)
    {
        int i = 0;
        while (known[i] != NULL && strcmp(known[i], node->string) != 0)
            i++;
        if (known[i] == NULL)
            loading_unknown(c->l, node, true, "setting", node->string, known);
    }
}

static void read_place(const struct reading *c, const cJSON *object,
                       const cJSON *form, bool is_range, bool is_bearing)
{
    int n = cJSON_GetArraySize(form);
    const char *unit = unit_of(c, form);
    struct reads_row *row;
    refuse_others(c, object, form, is_bearing);
    if (n < 2 || n > (is_bearing ? 2 : 3)) {
        loading_error(c->l, form, "\"%s\" must list %s coordinates; it has %d",
                      form->string, is_bearing ? "2" : "2 or 3", n);
        return;
    }
    if (unit == NULL) {
        loading_error(c->l, form,
                      "\"%s\" names no state of the track %s; "
                      "name at least one",
                      form->string, c->kind->id);
        return;
    }
    row = add_row(c, form, is_range ? READS_RANGE : READS_BEARING,
                  is_range ? unit : "rad");
    if (row == NULL || !place(c, object, form, unit, row) || !is_bearing)
        return;
    const struct reads_row same = *row; /* both see the same place */
    if (is_range)
        row = add_row(c, form, READS_BEARING, "rad");
    if (row == NULL)
        return;
    *row = same;
    row->kind = READS_BEARING;
    sense(c, object, row);
}

/* {"product": ["wheel", "x.rate", 2]}: the unit is that of all states. */
static void read_product(const struct reading *c, const cJSON *form)
{
    const cJSON *node;
    char unit[4 * RIG_UNIT_SIZE] = "";
    struct reads_row *row = add_row(c, form, READS_PRODUCT, "1");
    if (row == NULL)
        return;
    cJSON_ArrayForEach(node, form)
    {
        int i = loading_state(c->kind, loading_text(node));
        if (i < 0 && !cJSON_IsNumber(node)) {
            unknown_state(c, node, false, loading_text(node));
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
        unknown_state(c, form, false, loading_text(form));
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
    row = add_row(c, form, READS_POLYNOMIAL, c->own_unit);
    if (row == NULL)
        return;
    row->term[row->n_terms++] = (struct reads_term){state, 0};
    cJSON_ArrayForEach(node, list)
    {
        int i = loading_state(c->kind, loading_text(node));
        if (i < 0 && !cJSON_IsNumber(node)) {
            unknown_state(c, node, false, loading_text(node));
            return;
        }
        row->term[row->n_terms++] =
            (struct reads_term){i, i < 0 ? node->valuedouble : 0};
    }
}

/* Behind the coordinates their rates: those of states, 0 of constants. */
static void read_range_rate(const struct reading *c, const cJSON *object,
                            const cJSON *form)
{
    int n = cJSON_GetArraySize(form);
    const char *unit = unit_of(c, form);
    char name[RIG_ID_SIZE + 8], rate_unit[RIG_UNIT_SIZE];
    refuse_others(c, object, form, false);
    if (n < 2 || n > 3 || unit == NULL) {
        loading_error(c->l, form,
                      "\"range-rate\" must list 2 or 3 coordinates, at least "
                      "one of them a state; write it like [\"x\", \"y\"]");
        return;
    }
    quantity_derivative_unit(unit, 1, rate_unit, sizeof rate_unit);
    struct reads_row *row = add_row(c, form, READS_RANGE_RATE, rate_unit);
    if (row == NULL || !place(c, object, form, unit, row))
        return;
    for (int k = 0; k < n; k++) {
        row->term[n + k] = (struct reads_term){-1, 0};
        if (row->term[k].state < 0)
            continue;
        snprintf(name, sizeof name, "%s.rate",
                 c->kind->state[row->term[k].state].name);
        row->term[n + k].state = loading_state(c->kind, name);
        if (row->term[n + k].state < 0)
            loading_error(c->l, form,
                          "\"%s\" has no rate; a range-rate needs a model "
                          "with one, like constant-velocity",
                          c->kind->state[row->term[k].state].name);
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
            read_place(c, node, form, i != 1, i != 0);
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
        read_range_rate(c, node, rate);
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

/* What is seen from a place starts from a prior. */
static void check_start(struct loading *l, const cJSON *sensor,
                        const struct rig_sensor *s)
{
    const struct rig_kind *kind = &l->s->rig.kind[s->kind];
    for (int i = 0; i < s->reads.m; i++) {
        const struct reads_row *row = &s->reads.row[i];
        if (row->kind != READS_RANGE && row->kind != READS_BEARING &&
            row->kind != READS_RANGE_RATE)
            continue;
        for (int k = 0; k < row->n_terms; k++) {
            int state = row->term[k].state;
            if (state < 0 || kind->state[state].has_prior)
                continue;
            loading_error(l, loading_get(sensor, "reads"),
                          "starting ranges from data is not built yet; "
                          "give tracks.%s%s.start of \"%s\"",
                          kind->id, kind->is_prefix ? "*" : "",
                          kind->state[state].name);
            return;
        }
    }
}

void loading_check_starts(struct loading *l)
{
    const cJSON *node;
    if (l->problems->n > 0)
        return;
    cJSON_ArrayForEach(node, loading_get(l->root, "sensors"))
    {
        int i = rig_find_sensor(&l->s->rig, node->string, strlen(node->string));
        if (i >= 0 && cJSON_IsObject(node))
            check_start(l, node, &l->s->rig.sensor[i]);
    }
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
