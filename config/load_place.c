/* What is seen from a place: range, bearing, range-rate. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/reading.h"

#include <stdio.h>
#include <string.h>

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
        reading_unknown_state(c, node, false, text);
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

void reading_place(const struct reading *c, const cJSON *object,
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
    row = reading_add_row(c, form, is_range ? READS_RANGE : READS_BEARING,
                          is_range ? unit : "rad");
    if (row == NULL || !place(c, object, form, unit, row) || !is_bearing)
        return;
    const struct reads_row same = *row; /* both see the same place */
    if (is_range)
        row = reading_add_row(c, form, READS_BEARING, "rad");
    if (row == NULL)
        return;
    *row = same;
    row->kind = READS_BEARING;
    sense(c, object, row);
}

/* Behind the coordinates their rates: those of states, 0 of constants. */
void reading_range_rate(const struct reading *c, const cJSON *object,
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
    struct reads_row *row =
        reading_add_row(c, form, READS_RANGE_RATE, rate_unit);
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
