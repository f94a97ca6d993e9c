/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/scene_network.h"

#include <stdlib.h>
#include <string.h>

/* --- the file ------------------------------------------------------------- */

static void load_delay(struct scene_text *r, const cJSON *value,
                       struct scene_link *link)
{
    if (!cJSON_IsArray(value)) {
        if (scene_text_time(r, value, &link->delay_min_ns))
            link->delay_max_ns = link->delay_min_ns;
        return;
    }
    if (cJSON_GetArraySize(value) != 2) {
        scene_text_refuse(r, "write [\"10 ms\", \"30 ms\"]",
                          "a delay is one time or two");
        return;
    }
    int64_t *const place[] = {&link->delay_min_ns, &link->delay_max_ns};
    for (int i = 0; i < 2; i++) {
        scene_text_enter_at(r, i);
        scene_text_time(r, cJSON_GetArrayItem(value, i), place[i]);
        scene_text_leave(r);
    }
    if (link->delay_min_ns > link->delay_max_ns)
        scene_text_refuse(r, "write the shorter one first",
                          "the first delay is longer than the second");
}

static void load_form(struct scene_text *r, const cJSON *value,
                      struct scene_link *link)
{
    static const char *const forms[] = {"json", "msgpack", NULL};
    const char *form = scene_text_string(r, value);
    if (form == NULL)
        return;
    if (strcmp(form, forms[0]) == 0)
        link->form = WIRE_JSON;
    else if (strcmp(form, forms[1]) == 0)
        link->form = WIRE_MSGPACK;
    else
        scene_text_refuse_name(r, false, "form of a datagram", form, forms);
}

static void load_link(struct scene_text *r, const cJSON *item,
                      struct scene_link *link)
{
    static const char *const keys[] = {"delay",      "loss", "duplicates",
                                       "reordering", "form", NULL};
    double *const share[] = {NULL, &link->loss, &link->duplicates,
                             &link->reordering};
    if (!scene_text_keys(r, item, keys))
        return;
    for (int i = 0; keys[i] != NULL; i++) {
        const cJSON *value = cJSON_GetObjectItemCaseSensitive(item, keys[i]);
        if (value == NULL)
            continue;
        scene_text_enter(r, keys[i]);
        if (i == 0)
            load_delay(r, value, link);
        else if (i == 4)
            load_form(r, value, link);
        else
            scene_text_share(r, value, share[i]);
        scene_text_leave(r);
    }
}

void scene_network_load(struct scene_text *r, struct scene *s,
                        const cJSON *network)
{
    const char *list[2 * RIG_SENSORS_MAX + 1] = {NULL};
    int n = s->rig->n_sensors;
    for (int i = 0; i < n; i++)
        list[i] = s->rig->sensor[i].name;
    for (int i = 0; r->left_out != NULL && r->left_out[i] != NULL &&
                    n < 2 * RIG_SENSORS_MAX;
         i++)
        list[n++] = r->left_out[i];
    if (!scene_text_keys(r, network, list))
        return;
    for (int i = 0; i < s->rig->n_sensors; i++) {
        const cJSON *item = cJSON_GetObjectItemCaseSensitive(network, list[i]);
        if (item == NULL)
            continue;
        scene_text_enter(r, list[i]);
        load_link(r, item, &s->link[i]);
        scene_text_leave(r);
    }
}

/* --- on the way ----------------------------------------------------------- */

void scene_network_init(struct scene_network *n, const struct scene *s)
{
    memset(n, 0, sizeof *n);
    for (int i = 0; i < s->rig->n_sensors; i++)
        scene_random(s, "network", s->rig->sensor[i].name, &n->random[i]);
}

void scene_network_fini(struct scene_network *n)
{
    free(n->post);
    n->post = NULL;
    n->n = n->size = 0;
}

static bool is_before(const struct scene_post *a, const struct scene_post *b)
{
    return a->arrives_ns != b->arrives_ns ? a->arrives_ns < b->arrives_ns
                                          : a->serial < b->serial;
}

static void exchange(struct scene_post *a, struct scene_post *b)
{
    struct scene_post was = *a;
    *a = *b;
    *b = was;
}

static status push(struct scene_network *n, const struct scene_post *post)
{
    if (n->n == SCENE_POSTS_MAX) {
        n->n_full++;
        return ST_OK;
    }
    if (n->n == n->size) {
        int size = n->size == 0 ? 256 : n->size * 2;
        struct scene_post *more = realloc(n->post, (size_t)size * sizeof *more);
        if (more == NULL)
            return ST_NOMEM;
        n->post = more;
        n->size = size;
    }
    int i = n->n++;
    n->post[i] = *post;
    n->post[i].serial = n->serial++;
    for (; i > 0 && is_before(&n->post[i], &n->post[(i - 1) / 2]);
         i = (i - 1) / 2)
        exchange(&n->post[i], &n->post[(i - 1) / 2]);
    return ST_OK;
}

static int64_t delay(const struct scene_link *link, double uniform)
{
    return link->delay_min_ns +
           (int64_t)(uniform *
                     (double)(link->delay_max_ns - link->delay_min_ns));
}

/* Every sending draws the same number of times, so that one share changed
 * leaves the fate of the others as it was. */
status scene_network_send(struct scene_network *n, const struct scene *s,
                          const struct scene_reading *reading)
{
    const struct scene_link *link = &s->link[reading->sensor];
    double period_ns = 1e9 / s->rig->sensor[reading->sensor].rate_hz;
    double draw[6];
    for (int i = 0; i < 6; i++)
        draw[i] = random_uniform(&n->random[reading->sensor]);
    struct scene_post post = {.seq = ++n->seq[reading->sensor],
                              .reading = *reading};
    n->n_sent++;
    if (draw[0] < link->loss) {
        n->n_lost++;
        return ST_OK;
    }
    post.arrives_ns = reading->t_ns + delay(link, draw[1]);
    if (draw[2] < link->reordering) {
        post.arrives_ns += (int64_t)(period_ns * (1 + draw[3]));
        n->n_reordered++;
    }
    status st = push(n, &post);
    if (st != ST_OK || draw[4] >= link->duplicates)
        return st;
    post.arrives_ns = reading->t_ns + delay(link, draw[5]);
    n->n_doubled++;
    return push(n, &post);
}

int64_t scene_network_due(const struct scene_network *n)
{
    return n->n > 0 ? n->post[0].arrives_ns : INT64_MAX;
}

void scene_network_take(struct scene_network *n, struct scene_post *post)
{
    *post = n->post[0];
    n->post[0] = n->post[--n->n];
    for (int i = 0;;) {
        int least = i;
        for (int child = 2 * i + 1; child <= 2 * i + 2; child++)
            if (child < n->n && is_before(&n->post[child], &n->post[least]))
                least = child;
        if (least == i)
            return;
        exchange(&n->post[i], &n->post[least]);
        i = least;
    }
}
