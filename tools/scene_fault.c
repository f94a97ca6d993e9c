/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene_fault.h"

#include <string.h>

static const char *const keys[] = {"at",   "for",     "sensor", "track",
                                   "jump", "silence", NULL};

/* Kinds that a rehearsal will know; refused by name until they are built. */
static const char *const later[] = {
    "scale-step",   "freeze",     "drift", "noise-factor",
    "unit-mistake", "clock-step", "wrap",  "bunch",
    "duplicate",    "swap",       "NaN",   "nan",
    "common-step",  NULL};

const char *scene_fault_text(enum scene_fault_kind kind)
{
    switch (kind) {
    case SCENE_JUMP:
        return "jump";
    case SCENE_SILENCE:
        return "silence";
    }
    return "";
}

static bool is_later(const char *name)
{
    for (int i = 0; later[i] != NULL; i++)
        if (strcmp(name, later[i]) == 0)
            return true;
    return false;
}

/* Unknown keys, kinds that are not built, none or several kinds; the kind's
 * value, or NULL after a complaint. */
static const cJSON *fault_kind(struct scene_text *r, const cJSON *item,
                               enum scene_fault_kind *kind)
{
    if (!cJSON_IsObject(item)) {
        scene_text_refuse(r, "write it in { }", "a fault is an object");
        return NULL;
    }
    for (const cJSON *key = item->child; key != NULL; key = key->next)
        if (is_later(key->string)) {
            scene_text_enter(r, key->string);
            scene_text_refuse_key(r, "jump and silence are built",
                                  "the fault \"%s\" is not built yet",
                                  key->string);
            scene_text_leave(r);
            return NULL;
        }
    scene_text_keys(r, item, keys);
    const cJSON *jump = cJSON_GetObjectItemCaseSensitive(item, "jump");
    const cJSON *silence = cJSON_GetObjectItemCaseSensitive(item, "silence");
    if ((jump == NULL) == (silence == NULL)) {
        scene_text_refuse(r,
                          "write {\"jump\": \"0.6 m\"} or "
                          "{\"silence\": true}",
                          "a fault has one of jump, silence");
        return NULL;
    }
    *kind = jump != NULL ? SCENE_JUMP : SCENE_SILENCE;
    return jump != NULL ? jump : silence;
}

static void load_jump(struct scene_text *r, const struct rig_sensor *sensor,
                      const cJSON *value, double *jump)
{
    if (!cJSON_IsArray(value) && sensor->reads.m == 1) {
        scene_text_quantity(r, value, sensor->unit[0], QUANTITY_DIFFERENCE,
                            jump);
        return;
    }
    if (cJSON_GetArraySize(value) != sensor->reads.m || !cJSON_IsArray(value)) {
        scene_text_refuse(r, "give a list of so many values",
                          "%s reads %d components", sensor->name,
                          sensor->reads.m);
        return;
    }
    for (int i = 0; i < sensor->reads.m; i++) {
        scene_text_enter_at(r, i);
        scene_text_quantity(r, cJSON_GetArrayItem(value, i), sensor->unit[i],
                            QUANTITY_DIFFERENCE, &jump[i]);
        scene_text_leave(r);
    }
}

static void load_value(struct scene_text *r, const struct scene *s,
                       struct scene_fault *f, const cJSON *value)
{
    scene_text_enter(r, scene_fault_text(f->kind));
    switch (f->kind) {
    case SCENE_JUMP:
        load_jump(r, &s->rig->sensor[f->sensor], value, f->jump);
        break;
    case SCENE_SILENCE:
        if (!cJSON_IsTrue(value))
            scene_text_refuse(r, "write true, or leave the fault out",
                              "silence is true or it is not there");
        break;
    }
    scene_text_leave(r);
}

/* The place of the name in a key's text; -1 when it is absent or wrong. */
static int load_name(struct scene_text *r, const cJSON *item, const char *key,
                     const char *what, const char *const *list)
{
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(item, key);
    if (value == NULL)
        return -1;
    int found = -1;
    scene_text_enter(r, key);
    const char *name = scene_text_string(r, value);
    for (int i = 0; name != NULL && list[i] != NULL && found < 0; i++)
        found = strcmp(list[i], name) == 0 ? i : -1;
    if (name != NULL && found < 0)
        scene_text_refuse_name(r, false, what, name, list);
    scene_text_leave(r);
    return found;
}

static void load_time(struct scene_text *r, const cJSON *item, const char *key,
                      int64_t *ns)
{
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(item, key);
    if (value == NULL) {
        scene_text_refuse(r, "add it, as in \"at\": \"40 s\", \"for\": \"2 s\"",
                          "the fault has no \"%s\"", key);
        return;
    }
    scene_text_enter(r, key);
    scene_text_time(r, value, ns);
    scene_text_leave(r);
}

static void load_fault(struct scene_text *r, struct scene *s, const cJSON *item)
{
    const char *sensors[RIG_SENSORS_MAX + 1] = {NULL};
    const char *tracks[SCENE_TRACKS_MAX + 1] = {NULL};
    struct scene_fault f = {0};
    const cJSON *value = fault_kind(r, item, &f.kind);
    if (value == NULL ||
        scene_text_is_left_out(
            r, cJSON_GetStringValue(
                   cJSON_GetObjectItemCaseSensitive(item, "sensor"))))
        return;
    for (int i = 0; i < s->rig->n_sensors; i++)
        sensors[i] = s->rig->sensor[i].name;
    for (int i = 0; i < s->n_tracks; i++)
        tracks[i] = s->track[i].id;
    load_time(r, item, "at", &f.at_ns);
    load_time(r, item, "for", &f.for_ns);
    f.sensor = load_name(r, item, "sensor", "sensor of the rig", sensors);
    f.track = load_name(r, item, "track", "track of the truth", tracks);
    if (!cJSON_HasObjectItem(item, "sensor"))
        scene_text_refuse(r, "add \"sensor\": and its name",
                          "the fault has no \"sensor\"");
    if (f.sensor < 0)
        return;
    load_value(r, s, &f, value);
    s->fault[s->n_faults++] = f;
}

void scene_fault_load(struct scene_text *r, struct scene *s,
                      const cJSON *faults)
{
    int n = cJSON_GetArraySize(faults);
    if (!cJSON_IsArray(faults) || n > SCENE_FAULTS_MAX) {
        scene_text_refuse(r, "write them in [ ]",
                          "faults are a list of at most %d", SCENE_FAULTS_MAX);
        return;
    }
    for (int i = 0; i < n; i++) {
        scene_text_enter_at(r, i);
        load_fault(r, s, cJSON_GetArrayItem(faults, i));
        scene_text_leave(r);
    }
}

bool scene_fault_apply(const struct scene *s, int sensor, int track,
                       int64_t t_ns, double *z)
{
    bool speaks = true;
    for (int i = 0; i < s->n_faults; i++) {
        const struct scene_fault *f = &s->fault[i];
        if (f->sensor != sensor || (f->track >= 0 && f->track != track) ||
            t_ns < f->at_ns || t_ns >= f->at_ns + f->for_ns)
            continue;
        switch (f->kind) {
        case SCENE_JUMP:
            for (int k = 0; k < s->rig->sensor[sensor].reads.m; k++)
                z[k] += f->jump[k];
            break;
        case SCENE_SILENCE:
            speaks = false;
            break;
        }
    }
    return speaks;
}
