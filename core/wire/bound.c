/* How large a message of a rig can be, at worst. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/math/ud.h"
#include "core/wire/encode.h"

enum {
    KEYS_MAX = 600,  /* our own keys, words, times and brackets          */
    ITEM_MAX = 48,   /* the same of one element of a list                */
    NUMBER_MAX = 26, /* "-0.0000012345678901234567" and a comma          */
    COUNT_MAX = 21,
    CODE_MAX = 32 /* of a reason                                      */
};

/* Text of up to len bytes: each as \u00xx, quotes, a comma or a colon. */
static size_t text_max(size_t len)
{
    return 6 * len + 4;
}

/* The same for a text that is known. */
static size_t known_max(const char *s)
{
    size_t size = text_max(0);
    for (; *s != '\0'; s++)
        size += *s > ' ' && *s <= '~' && *s != '"' && *s != '\\' ? 1 : 6;
    return size;
}

static size_t larger(size_t a, size_t b)
{
    return a > b ? a : b;
}

static size_t reasons_max(void)
{
    return MESSAGE_REASONS_MAX * (CODE_MAX + text_max(RIG_ID_SIZE));
}

static size_t estimate_max(const struct rig *rig)
{
    size_t n = 0;
    for (int i = 0; i < rig->n_kinds; i++)
        n = larger(n, (size_t)rig->kind[i].n);
    return KEYS_MAX + 2 * text_max(RIG_ID_SIZE) + reasons_max() +
           (2 * n + UD_SIZE(n)) * NUMBER_MAX; /* x, u, P                  */
}

static size_t event_max(void)
{
    const struct event *e = NULL;
    return KEYS_MAX + 2 * text_max(RIG_ID_SIZE) + reasons_max() +
           text_max(sizeof e->name) + text_max(sizeof e->note);
}

/* One ledger: outcomes and tallies, each with its sensor's name. */
static size_t ledger_max(const char *name)
{
    size_t size = 2 * known_max(name) + ITEM_MAX;
    for (int i = 0; i < OUTCOME_COUNT; i++)
        size += strlen(outcome_text((enum outcome)i)) + 4 + COUNT_MAX;
    for (int i = 0; i < TALLY_COUNT; i++)
        size += strlen(tally_text((enum tally)i)) + 4 + COUNT_MAX;
    return size;
}

static size_t counts_max(const struct rig *rig)
{
    size_t size = KEYS_MAX + ledger_max("total");
    for (int i = 0; i < rig->n_sensors; i++)
        size += ledger_max(rig->sensor[i].name);
    return size;
}

static size_t summary_track_max(const struct rig *rig)
{
    size_t size = KEYS_MAX + text_max(RIG_ID_SIZE);
    for (int i = 0; i < rig->n_sensors; i++)
        size += known_max(rig->sensor[i].name) + ITEM_MAX + 3 * NUMBER_MAX;
    return size;
}

static size_t kind_max(const struct rig_kind *kind)
{
    size_t size = ITEM_MAX + known_max(kind->id);
    for (int i = 0; i < kind->n; i++)
        size += ITEM_MAX + known_max(kind->state[i].name) +
                known_max(kind->state[i].unit);
    return size;
}

static size_t description_max(const struct rig *rig)
{
    size_t size = KEYS_MAX + text_max(sizeof rig->name) +
                  text_max(sizeof rig->file_hash) + text_max(WIRE_TEXT_MAX);
    for (int i = 0; i < rig->n_kinds; i++)
        size += kind_max(&rig->kind[i]);
    for (int i = 0; i < rig->n_sensors; i++) {
        const struct rig_sensor *sensor = &rig->sensor[i];
        size += ITEM_MAX + known_max(sensor->name) +
                known_max(rig->kind[sensor->kind].id);
        for (int k = 0; k < sensor->reads.m; k++)
            size += known_max(sensor->unit[k]);
    }
    return size;
}

size_t wire_message_bound(const struct rig *rig)
{
    size_t size = KEYS_MAX + 2 * text_max(WIRE_TEXT_MAX); /* host         */
    size = larger(size, estimate_max(rig));
    size = larger(size, event_max());
    size = larger(size, counts_max(rig));
    size = larger(size, summary_track_max(rig));
    return larger(size, description_max(rig));
}
