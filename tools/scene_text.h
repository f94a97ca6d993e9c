/* scene_text.h - a rehearsal's JSON, read strictly and with its places.
 *
 * The reader keeps the values from the root to where it stands, so every
 * complaint comes with file:line:column, the line and a caret.  All functions
 * go on after a complaint; `is_bad` tells that there was one.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_SCENE_TEXT_H
#define TOOLS_SCENE_TEXT_H

#include "config/quantity.h"
#include "config/textpos.h"

struct scene_text {
    const char *path, *text; /* as the user wrote it, not owned           */
    size_t len;
    char *plain; /* without comments                          */
    cJSON *root;
    struct quantity_units *units;
    const char *const *left_out; /* names of sensors to pass over, or NULL */
    struct problems *problems;
    const cJSON *at[TEXTPOS_DEPTH_MAX + 1]; /* from the root to here     */
    int depth;
    bool is_bad;
};

/* Parses the text; false with a report when it is no sound JSON object. */
bool scene_text_init(struct scene_text *r, const char *path, const char *text,
                     size_t len, struct problems *problems);
void scene_text_fini(struct scene_text *r);

/* Into the value of a key, or the i-th of a list, and back. */
void scene_text_enter(struct scene_text *r, const char *key);
void scene_text_enter_at(struct scene_text *r, int i);
void scene_text_leave(struct scene_text *r);

/* A report at the value where the reader stands, or at its key. */
void scene_text_refuse(struct scene_text *r, const char *remedy,
                       const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));
void scene_text_refuse_key(struct scene_text *r, const char *remedy,
                           const char *fmt, ...)
    __attribute__((format(printf, 3, 4)));

/* True for a sensor that is passed over. */
bool scene_text_is_left_out(const struct scene_text *r, const char *name);

/* Refuses a name that is not in the list, and names the nearest. */
void scene_text_refuse_name(struct scene_text *r, bool is_key, const char *what,
                            const char *name, const char *const *list);

/* True if it is an object; refuses each of its keys that is not in the list
 * (ends with NULL). */
bool scene_text_keys(struct scene_text *r, const cJSON *object,
                     const char *const *list);

/* A number with or without a unit, in `unit`; false after a complaint. */
bool scene_text_quantity(struct scene_text *r, const cJSON *value,
                         const char *unit, enum quantity_role role,
                         double *out);

/* A time of 0 .. 1e9 s. */
bool scene_text_time(struct scene_text *r, const cJSON *value, int64_t *ns);

/* A share: 0 .. 1, or with "%". */
bool scene_text_share(struct scene_text *r, const cJSON *value, double *out);

/* A text; NULL after a complaint. */
const char *scene_text_string(struct scene_text *r, const cJSON *value);

#endif
