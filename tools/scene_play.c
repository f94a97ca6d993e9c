/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene_play.h"

#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

#include "core/wire/writer.h"
#include "tools/scene_fault.h"

enum { TABLE_EVERY_NS = 10000000 };

status scene_play_init(struct scene_play *p, struct scene *s, int64_t begin_ns)
{
    const struct rig *rig = s->rig;
    *p = (struct scene_play){.scene = s, .begin_ns = begin_ns};
    scene_network_init(&p->network, s);
    p->sensor = calloc((size_t)rig->n_sensors * (size_t)s->n_tracks + 1,
                       sizeof *p->sensor);
    if (p->sensor == NULL)
        return ST_NOMEM;
    for (int i = 0; i < rig->n_sensors; i++)
        for (int k = 0; k < s->n_tracks; k++)
            if (rig->sensor[i].kind == s->track[k].kind)
                scene_sensor_init(&p->sensor[p->n_sensors++], s, i, k);
    return ST_OK;
}

void scene_play_fini(struct scene_play *p)
{
    free(p->sensor);
    scene_network_fini(&p->network);
}

/* --- bytes ---------------------------------------------------------------- */

/* A sensor whose `time.delay` is declared stamps so much later. */
static status encode(const struct scene_play *p, const struct scene_post *post,
                     struct scene_datagram *d)
{
    const struct scene_reading *reading = &post->reading;
    const struct scene_track *track = &p->scene->track[reading->track];
    const struct rig_sensor *sensor = &p->scene->rig->sensor[reading->sensor];
    struct writer w;
    writer_init(&w, p->scene->link[reading->sensor].form, d->bytes,
                sizeof d->bytes);
    writer_open_map(&w);
    writer_key(&w, "sensor");
    writer_text(&w, sensor->name);
    if (p->scene->rig->kind[track->kind].is_prefix) {
        writer_key(&w, "track");
        writer_text(&w, track->id);
    }
    if (sensor->stamp != RIG_STAMP_ARRIVAL) {
        writer_key(&w, "t");
        writer_time(&w, p->begin_ns + reading->t_ns + sensor->delay_ns);
    }
    writer_key(&w, "seq");
    writer_count(&w, post->seq);
    writer_key(&w, "z");
    if (sensor->reads.m > 1)
        writer_open_array(&w);
    for (int i = 0; i < sensor->reads.m; i++)
        writer_number(&w, reading->z[i]);
    if (sensor->reads.m > 1)
        writer_close(&w);
    writer_close(&w);
    d->len = writer_finish(&w);
    d->sensor = reading->sensor;
    d->track = reading->track;
    d->arrives_ns = p->begin_ns + post->arrives_ns;
    return d->len > 0 ? ST_OK : ST_FULL;
}

/* --- order ---------------------------------------------------------------- */

/* Who samples next; NULL after the end of the rehearsal. */
static struct scene_sensor *next_sensor(struct scene_play *p, int64_t *due_ns)
{
    struct scene_sensor *next = NULL;
    *due_ns = p->scene->lasts_ns;
    for (int i = 0; i < p->n_sensors; i++) {
        int64_t t_ns = scene_sensor_due(&p->sensor[i], p->scene);
        if (t_ns < *due_ns) {
            next = &p->sensor[i];
            *due_ns = t_ns;
        }
    }
    return next;
}

status scene_play_next(struct scene_play *p, struct scene_datagram *d,
                       bool *is_over)
{
    struct scene_reading reading;
    struct scene_post post;
    status st = ST_OK;
    *is_over = false;
    while (st == ST_OK) {
        int64_t due_ns;
        struct scene_sensor *sensor = next_sensor(p, &due_ns);
        int64_t arrives_ns = scene_network_due(&p->network);
        if (sensor == NULL && arrives_ns == INT64_MAX) {
            *is_over = true;
            return ST_OK;
        }
        if (sensor == NULL || arrives_ns <= due_ns) {
            scene_network_take(&p->network, &post);
            p->n_datagrams++;
            return encode(p, &post, d);
        }
        if (scene_sensor_sample(sensor, p->scene, &reading))
            st = scene_network_send(&p->network, p->scene, &reading);
        else
            p->n_silent++;
    }
    return st;
}

/* --- tables --------------------------------------------------------------- */

/* The i-th distinct state name of all kinds that the truth has; NULL past the
 * last. */
static const char *column(const struct scene *s, int i)
{
    const char *seen[RIG_KINDS_MAX * 4];
    int n = 0;
    for (int k = 0; k < s->n_tracks; k++) {
        const struct rig_kind *kind = &s->rig->kind[s->track[k].kind];
        for (int state = 0; state < kind->n; state++) {
            bool is_new = n < (int)(sizeof seen / sizeof *seen);
            for (int j = 0; j < n && is_new; j++)
                is_new = strcmp(seen[j], kind->state[state].name) != 0;
            if (is_new)
                seen[n++] = kind->state[state].name;
        }
    }
    return i < n ? seen[i] : NULL;
}

void scene_table_init(struct scene_table *t, struct scene *s, int64_t begin_ns,
                      FILE *to)
{
    const char *name;
    *t = (struct scene_table){s, begin_ns, 0, to};
    fputs("time_ns,track", to);
    for (int i = 0; (name = column(s, i)) != NULL; i++)
        fprintf(to, ",%s", name);
    fputc('\n', to);
}

static void write_row(struct scene_table *t, int track)
{
    const struct scene *s = t->scene;
    const struct rig_kind *kind = &s->rig->kind[s->track[track].kind];
    double x[RIG_STATES_MAX];
    char number[32];
    const char *name;
    scene_truth(t->scene, track, t->next_ns, x);
    fprintf(t->to, "%" PRId64 ",%s", t->begin_ns + t->next_ns,
            s->track[track].id);
    for (int i = 0; (name = column(s, i)) != NULL; i++) {
        fputc(',', t->to);
        for (int state = 0; state < kind->n; state++)
            if (strcmp(kind->state[state].name, name) == 0) {
                size_t len = wire_print_number(x[state], number);
                fwrite(number, len, 1, t->to);
            }
    }
    fputc('\n', t->to);
}

void scene_table_write(struct scene_table *t, int64_t until_ns)
{
    for (; t->next_ns < until_ns; t->next_ns += TABLE_EVERY_NS)
        for (int i = 0; i < t->scene->n_tracks; i++)
            write_row(t, i);
}

void scene_table_faults(const struct scene *s, int64_t begin_ns, FILE *to)
{
    fputs("from_ns,to_ns,sensor,track,fault\n", to);
    for (int i = 0; i < s->n_faults; i++) {
        const struct scene_fault *f = &s->fault[i];
        fprintf(to, "%" PRId64 ",%" PRId64 ",%s,%s,%s\n", begin_ns + f->at_ns,
                begin_ns + f->at_ns + f->for_ns, s->rig->sensor[f->sensor].name,
                f->track < 0 ? "" : s->track[f->track].id,
                scene_fault_text(f->kind));
    }
}
