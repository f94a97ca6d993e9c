/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/demo_view.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "tools/instant.h"

enum {
    GOOD_K = 2,
    SHARE_AFTER_S = 20 /* values near in time err together: a short look
                          gives no share                            */
};

status demo_view_init(struct demo_view *v, struct scene *s, int64_t begin_ns,
                      bool is_terminal)
{
    *v = (struct demo_view){.scene = s,
                            .begin_ns = begin_ns,
                            .to = stdout,
                            .is_terminal = is_terminal};
    v->row = calloc((size_t)s->n_tracks + 1, sizeof *v->row);
    return v->row == NULL ? ST_NOMEM : ST_OK;
}

void demo_view_fini(struct demo_view *v)
{
    cJSON_Delete(v->counts);
    free(v->row);
}

/* --- the stream ----------------------------------------------------------- */

static const char *text_of(const cJSON *object, const char *key)
{
    const char *text =
        cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(object, key));
    return text == NULL ? "" : text;
}

static void join_reasons(const cJSON *why, char *out)
{
    const cJSON *item;
    out[0] = '\0';
    cJSON_ArrayForEach(item, why)
    {
        size_t len = strlen(out);
        const char *reason = cJSON_GetStringValue(item);
        if (reason != NULL)
            snprintf(out + len, DEMO_VIEW_TEXT - len, "%s%s",
                     len == 0 ? "" : ", ", reason);
    }
}

static void take_estimate(struct demo_view *v, const cJSON *message)
{
    double truth[RIG_STATES_MAX];
    const char *t = text_of(message, "t");
    int track = scene_find_track(v->scene, text_of(message, "track"));
    int64_t t_ns;
    if (track < 0 || !instant_parse(t, strlen(t), &t_ns))
        return;
    struct demo_view_row *row = &v->row[track];
    const cJSON *x = cJSON_GetObjectItemCaseSensitive(message, "x");
    const cJSON *u = cJSON_GetObjectItemCaseSensitive(message, "u");
    int n = v->scene->rig->kind[v->scene->track[track].kind].n;
    v->n_estimates++;
    row->n++;
    row->t_ns = t_ns;
    snprintf(row->verdict, sizeof row->verdict, "%s",
             text_of(message, "verdict"));
    join_reasons(cJSON_GetObjectItemCaseSensitive(message, "why"), row->why);
    scene_truth(v->scene, track, t_ns - v->begin_ns, truth);
    bool is_good = strcmp(row->verdict, "good") == 0;
    for (int i = 0; i < n && i < DEMO_VIEW_STATES; i++) {
        const cJSON *x_i = cJSON_GetArrayItem(x, i);
        const cJSON *u_i = cJSON_GetArrayItem(u, i);
        row->truth[i] = truth[i];
        row->is_number[i] = cJSON_IsNumber(x_i) && cJSON_IsNumber(u_i);
        if (!row->is_number[i])
            continue;
        row->x[i] = x_i->valuedouble;
        row->u[i] = u_i->valuedouble;
        row->n_good += is_good;
        row->n_within +=
            is_good && fabs(row->x[i] - truth[i]) <= GOOD_K * row->u[i];
    }
}

static void take_event(struct demo_view *v, const cJSON *message)
{
    const char *t = text_of(message, "t");
    char why[DEMO_VIEW_TEXT];
    int64_t t_ns;
    if (!instant_parse(t, strlen(t), &t_ns) || t_ns < v->begin_ns)
        return; /* before the rehearsal nothing speaks yet */
    join_reasons(cJSON_GetObjectItemCaseSensitive(message, "why"), why);
    snprintf(v->event, sizeof v->event, "%6.1f s  %s: %s %s%s%s%s",
             (double)(t_ns - v->begin_ns) * 1e-9, text_of(message, "track"),
             text_of(message, "event"), text_of(message, "sensor"),
             text_of(message, "verdict"), why[0] == '\0' ? "" : ", ", why);
    if (!v->is_terminal && !v->hides_events)
        fprintf(v->to, "%s\n", v->event);
}

void demo_view_take(struct demo_view *v, const char *line)
{
    cJSON *message = cJSON_Parse(line);
    const char *type = text_of(message, "type");
    if (message == NULL) {
        v->n_unread++;
        return;
    }
    if (strcmp(type, "counts") == 0) {
        cJSON_Delete(v->counts);
        v->counts = message;
        return;
    }
    if (strcmp(type, "estimate") == 0)
        take_estimate(v, message);
    else if (strcmp(type, "event") == 0)
        take_event(v, message);
    cJSON_Delete(message);
}

/* --- drawing -------------------------------------------------------------- */

static double count_of(const struct demo_view *v, const char *group,
                       const char *name)
{
    const cJSON *part =
        cJSON_GetObjectItemCaseSensitive(v->counts, "measurements");
    if (strcmp(group, "tallies") == 0)
        part = cJSON_GetObjectItemCaseSensitive(part, group);
    const cJSON *count = cJSON_GetObjectItemCaseSensitive(
        cJSON_GetObjectItemCaseSensitive(part, "total"), name);
    return cJSON_IsNumber(count) ? count->valuedouble : 0;
}

/* "x 14.0021 +- 0.0022 m, off +0.0003": estimate, U (k = 2), error. */
static void draw_state(const struct demo_view *v, int track, int i, FILE *to,
                       bool in_columns)
{
    const struct demo_view_row *row = &v->row[track];
    const struct rig_state *state =
        &v->scene->rig->kind[v->scene->track[track].kind].state[i];
    if (row->is_number[i])
        fprintf(to,
                in_columns ? "%-12s %10.4f +- %.4f %-6s off %+.4f"
                           : "%s %.4f +- %.4f %s, off %+.4f",
                state->name, row->x[i], GOOD_K * row->u[i], state->unit,
                row->x[i] - row->truth[i]);
    else
        fprintf(to,
                in_columns ? "%-12s not determined yet"
                           : "%s not determined yet",
                state->name);
}

static void draw_block(struct demo_view *v, FILE *to)
{
    if (v->n_drawn > 0)
        fprintf(to, "\033[%dA", v->n_drawn);
    v->n_drawn = 0;
    for (int k = 0; k < v->scene->n_tracks; k++) {
        const struct demo_view_row *row = &v->row[k];
        int n = v->scene->rig->kind[v->scene->track[k].kind].n;
        fprintf(to, "\033[K%7.1f s  %-16s %-9s %s\n",
                row->n == 0 ? 0 : (double)(row->t_ns - v->begin_ns) * 1e-9,
                v->scene->track[k].id, row->n == 0 ? "-" : row->verdict,
                row->why);
        v->n_drawn++;
        for (int i = 0; row->n > 0 && i < n && i < DEMO_VIEW_STATES; i++) {
            fputs("\033[K    ", to);
            draw_state(v, k, i, to, true);
            fputc('\n', to);
            v->n_drawn++;
        }
    }
    fprintf(to,
            "\033[K  used %.0f, late %.0f, refused by the gate %.0f, lost "
            "%.0f, duplicates %.0f\n\033[K%s\n",
            count_of(v, "", "used"), count_of(v, "tallies", "late"),
            count_of(v, "", "gated"), count_of(v, "tallies", "lost"),
            count_of(v, "", "duplicate"), v->event);
    v->n_drawn += 2;
}

static void draw_lines(const struct demo_view *v, FILE *to)
{
    for (int k = 0; k < v->scene->n_tracks; k++) {
        const struct demo_view_row *row = &v->row[k];
        int n = v->scene->rig->kind[v->scene->track[k].kind].n;
        if (row->n == 0)
            continue;
        fprintf(to, "%6.1f s  %s %s%s%s%s",
                (double)(row->t_ns - v->begin_ns) * 1e-9, v->scene->track[k].id,
                row->verdict, row->why[0] == '\0' ? "" : " (", row->why,
                row->why[0] == '\0' ? "" : ")");
        for (int i = 0; i < n && i < DEMO_VIEW_STATES; i++) {
            fputs(i == 0 ? ": " : "; ", to);
            draw_state(v, k, i, to, false);
        }
        fprintf(to, "; late %.0f, gated %.0f\n", count_of(v, "tallies", "late"),
                count_of(v, "", "gated"));
    }
}

void demo_view_draw(struct demo_view *v)
{
    if (v->is_terminal)
        draw_block(v, v->to);
    else
        draw_lines(v, v->to);
    fflush(v->to);
}

static void print_counts(const cJSON *counts, FILE *to)
{
    const cJSON *item;
    cJSON_ArrayForEach(item, counts)
    {
        if (cJSON_IsNumber(item) && item->valuedouble > 0)
            fprintf(to, " %s %.0f", item->string, item->valuedouble);
    }
    fputc('\n', to);
}

void demo_view_ledger(const struct demo_view *v)
{
    FILE *to = v->to;
    const cJSON *measurements =
        cJSON_GetObjectItemCaseSensitive(v->counts, "measurements");
    const cJSON *tallies =
        cJSON_GetObjectItemCaseSensitive(measurements, "tallies");
    fputs("datagrams:   ", to);
    print_counts(cJSON_GetObjectItemCaseSensitive(v->counts, "datagrams"), to);
    fputs("measurements:", to);
    print_counts(cJSON_GetObjectItemCaseSensitive(measurements, "total"), to);
    fputs("beside them: ", to);
    print_counts(cJSON_GetObjectItemCaseSensitive(tallies, "total"), to);
    for (int k = 0; k < v->scene->n_tracks; k++)
        if (v->row[k].n_good > 0 &&
            v->row[k].t_ns - v->begin_ns > SHARE_AFTER_S * INT64_C(1000000000))
            fprintf(to,
                    "%s: of the values called good, %.1f %% held the "
                    "truth within U (k = 2)\n",
                    v->scene->track[k].id,
                    100 * (double)v->row[k].n_within /
                        (double)v->row[k].n_good);
}
