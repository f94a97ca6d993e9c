/* Sensors: what they read, in which unit, how well, and when. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/decode.h"

/* The i-th of a list, or the one value for all; NULL and a report when the
 * list has another length than the sensor components. */
const cJSON *loading_component(struct loading *l, const cJSON *node, int i,
                               int m)
{
    if (!cJSON_IsArray(node))
        return node;
    int n = cJSON_GetArraySize(node);
    if (n == m)
        return cJSON_GetArrayItem(node, i);
    if (i == 0 && n > 0)
        loading_error(l, node,
                      "\"%s\" lists %d values, but the sensor reads "
                      "%d; give %d, or one for all",
                      node->string, n, m, m);
    return NULL;
}

static void unknown_track(struct loading *l, const cJSON *node)
{
    const char *list[RIG_KINDS_MAX + 1] = {NULL};
    const cJSON *each;
    int n = 0;
    cJSON_ArrayForEach(each, loading_get(l->root, "tracks"))
    {
        if (n < RIG_KINDS_MAX && cJSON_IsObject(each))
            list[n++] = each->string;
    }
    loading_unknown(l, node, false, "track", node->valuestring, list);
}

/* Index of the sensor's track, or -1. */
static int kind_of(struct loading *l, const cJSON *object)
{
    const struct rig *rig = &l->s->rig;
    const cJSON *node = loading_get(object, "track");
    if (node == NULL && rig->n_kinds != 1) {
        if (rig->n_kinds > 1)
            loading_error_key(l, object,
                              "the sensor \"%.64s\" has no track "
                              "and the file has %d; give \"track\"",
                              object->string, rig->n_kinds);
        return -1;
    }
    if (node == NULL)
        return 0;
    const char *name = loading_text(node);
    size_t n = strlen(name);
    bool is_prefix = n > 0 && name[n - 1] == '*';
    for (int i = 0; i < rig->n_kinds; i++) {
        const char *id = rig->kind[i].id;
        if (rig->kind[i].is_prefix == is_prefix &&
            strlen(id) == n - is_prefix && strncmp(id, name, strlen(id)) == 0)
            return i;
    }
    if (cJSON_IsString(node))
        unknown_track(l, node);
    return -1;
}

/* Unit and conversion of component i. */
static void unit_of(struct loading *l, const cJSON *object,
                    struct rig_sensor *s, int i, const char *reads)
{
    const cJSON *node =
        loading_component(l, loading_get(object, "unit"), i, s->reads.m);
    const char *unit = cJSON_IsString(node) ? node->valuestring : reads;
    struct err err;
    s->scale[i] = 1;
    if (strlen(unit) >= RIG_UNIT_SIZE) {
        loading_error(l, node, "a unit may have %d bytes; shorten it",
                      RIG_UNIT_SIZE - 1);
        return;
    }
    snprintf(s->unit[i], RIG_UNIT_SIZE, "%s", unit);
    if (quantity_convert(l->units, unit, reads, &s->scale[i], &s->shift[i],
                         &err) != ST_OK &&
        node != NULL)
        loading_error(l, node, "%s", err.text);
}

/* "u": {"fixed": .., "relative": ..}. */
static bool relative_of(struct loading *l, const cJSON *node,
                        struct rig_sensor *s, int i)
{
    const cJSON *fixed = loading_get(node, "fixed");
    const cJSON *relative = loading_get(node, "relative");
    if (fixed == NULL || relative == NULL || cJSON_GetArraySize(node) != 2) {
        loading_error(l, node,
                      "\"u\" as an object needs \"fixed\" and \"relative\"; "
                      "write it like {\"fixed\": \"2 mm\", \"relative\": "
                      "\"0.1 %%\"}");
        return false;
    }
    s->has_relative = true;
    return loading_size(l, relative, "1", false, &s->relative[i]);
}

/* r of component i from u and the resolution. */
static void spread_of(struct loading *l, const cJSON *object,
                      struct rig_sensor *s, int i)
{
    const cJSON *node =
        loading_component(l, loading_get(object, "u"), i, s->reads.m);
    const cJSON *step =
        loading_component(l, loading_get(object, "resolution"), i, s->reads.m);
    double u, resolution = 0;
    if (cJSON_IsObject(node)) {
        if (!relative_of(l, node, s, i))
            return;
        node = loading_get(node, "fixed");
    }
    if (node == NULL ||
        !loading_quantity(l, node, s->unit[i], QUANTITY_DIFFERENCE, &u))
        return;
    if (!(u > 0)) {
        loading_error(l, node,
                      "standard uncertainty must be greater than 0; "
                      "give one standard deviation, in %s",
                      s->unit[i]);
        return;
    }
    if (step != NULL && !loading_size(l, step, s->unit[i], false, &resolution))
        return;
    double least = resolution / sqrt(12); /* u of rounding = step / sqrt(12) */
    double u_read = fmax(u, least) * fabs(s->scale[i]);
    s->r[i] = u_read * u_read;
    if (!isfinite(s->r[i]) || !(s->r[i] > 0))
        loading_error(l, node,
                      "the square of this uncertainty is beyond what "
                      "a number holds; choose another unit");
}

static void timing(struct loading *l, const cJSON *object, struct rig_sensor *s)
{
    const cJSON *rate = loading_get(object, "rate");
    const cJSON *times = loading_get(object, "time");
    const char *stamp = loading_text(loading_get(times, "stamp"));
    s->rate_hz = 100;
    if (rate != NULL &&
        loading_quantity(l, rate, "Hz", QUANTITY_DIFFERENCE, &s->rate_hz) &&
        !(s->rate_hz >= 1e-6 && s->rate_hz <= 1e6))
        loading_error(l, rate,
                      "\"rate\" must be from 1e-6 Hz to 1e6 Hz; give "
                      "the measurements per second");
    double silent_s = fmax(5 / s->rate_hz, 0.05);
    s->silent_after_ns = silent_s < 4e9 ? llround(silent_s * 1e9) : 0;
    loading_time(l, object, "sensors.*.silent_after", 1e-6,
                 &s->silent_after_ns);
    s->stamp = RIG_STAMP_ANY;
    if (strcmp(stamp, "sensor") == 0)
        s->stamp = RIG_STAMP_SENSOR;
    else if (strcmp(stamp, "arrival") == 0)
        s->stamp = RIG_STAMP_ARRIVAL;
    loading_time(l, times, "sensors.*.time.delay", 0, &s->delay_ns);
}

static void gate(struct loading *l, const cJSON *node, struct rig_sensor *s)
{
    s->has_gate = true;
    s->gate_p = 0.999;
    if (node == NULL)
        return;
    if (strcmp(loading_text(node), "off") == 0)
        s->has_gate = false;
    else if (!cJSON_IsNumber(node) || !(node->valuedouble > 0) ||
             !(node->valuedouble < 1))
        loading_error(l, node,
                      "\"gate\" must be a probability between 0 and "
                      "1, or \"off\"; 0.999 refuses 1 of 1000 sound "
                      "measurements");
    else
        s->gate_p = node->valuedouble;
}

static void add_sensor(struct loading *l, const cJSON *node,
                       struct rig_sensor *s)
{
    char units[READS_MAX][RIG_UNIT_SIZE] = {""};
    const cJSON *reads = loading_get(node, "reads");
    if (!wire_is_id(node->string, strlen(node->string)))
        loading_error_key(l, node,
                          "\"%.64s\" cannot name a sensor; use "
                          "letters, digits and _ . : - (up to 63)",
                          node->string);
    snprintf(s->name, sizeof s->name, "%.63s", node->string);
    if (loading_get(node, "like") != NULL)
        return; /* reported: what it lacks is not known */
    if (reads == NULL)
        loading_error_key(l, node,
                          "the sensor \"%s\" reads nothing; give "
                          "\"reads\": \"x\"",
                          s->name);
    if (loading_get(node, "u") == NULL)
        loading_error_key(l, node,
                          "the sensor \"%s\" has no \"u\"; give its "
                          "standard uncertainty, like \"u\": \"2 mm\"",
                          s->name);
    timing(l, node, s);
    gate(l, loading_get(node, "gate"), s);
    s->kind = kind_of(l, node);
    if (s->kind < 0 || reads == NULL || l->s->rig.kind[s->kind].n == 0 ||
        cJSON_IsBool(reads) || cJSON_IsNull(reads) ||
        !loading_reads(l, node, s, units))
        return;
    int problems = l->problems->n;
    for (int i = 0; i < s->reads.m; i++)
        unit_of(l, node, s, i, units[i]);
    if (l->problems->n != problems)
        return; /* u is in that unit */
    for (int i = 0; i < s->reads.m; i++)
        spread_of(l, node, s, i);
    if (l->problems->n == problems)
        loading_errors(l, node, s, units);
}

static int by_name(const void *a, const void *b)
{
    const struct rig_sensor *one = a, *other = b;
    return strcmp(one->name, other->name);
}

/* Only when all sensors are known to be sound. */
static void unread_tracks(struct loading *l)
{
    const struct rig *rig = &l->s->rig;
    const cJSON *node;
    int k = 0;
    cJSON_ArrayForEach(node, loading_get(l->root, "tracks"))
    {
        bool is_read = false;
        for (int i = 0; i < rig->n_sensors; i++)
            is_read = is_read || rig->sensor[i].kind == k;
        if (!is_read)
            loading_error_key(l, node,
                              "no sensor reads the track \"%s\"; add "
                              "one, or remove the track",
                              node->string);
        k++;
    }
}

void loading_sensors(struct loading *l)
{
    const cJSON *sensors = loading_get(l->root, "sensors"), *node;
    struct rig *rig = &l->s->rig;
    int problems = l->problems->n;
    if (sensors == NULL || (cJSON_IsObject(sensors) && !sensors->child)) {
        loading_error(l, sensors != NULL ? sensors : l->root,
                      "the file has no sensors; give \"sensors\": {\"name\": "
                      "{\"reads\": .., \"u\": ..}}");
        return;
    }
    if (!cJSON_IsObject(sensors))
        return;
    cJSON_ArrayForEach(node, sensors)
    {
        if (!cJSON_IsObject(node))
            continue;
        if (rig->n_sensors == RIG_SENSORS_MAX) {
            loading_error_key(l, node, "more than %d sensors; split the rig",
                              RIG_SENSORS_MAX);
            return;
        }
        add_sensor(l, node, &rig->sensor[rig->n_sensors++]);
    }
    if (l->problems->n == problems)
        unread_tracks(l);
    qsort(rig->sensor, (size_t)rig->n_sensors, sizeof *rig->sensor, by_name);
    for (int i = 0; i < rig->n_sensors; i++) /* look-ups go by it */
        rig->sensor[i].key =
            rig_key(rig->sensor[i].name, strlen(rig->sensor[i].name));
}
