/* Everything of the rig file that is neither track nor sensor. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "config/loading.h"

#include <arpa/inet.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* Copies a text that must fit; false when it does not. */
static bool copy_text(struct loading *l, const cJSON *node, char *out,
                      size_t size)
{
    const char *text = loading_text(node);
    if (strlen(text) >= size) {
        loading_error(l, node,
                      "\"%.64s\" is longer than %zu bytes; shorten "
                      "it",
                      node->string, size - 1);
        return false;
    }
    memcpy(out, text, strlen(text) + 1);
    return true;
}

/* "host:port"; the daemon resolves it, here only its form counts. */
static void address(struct loading *l, const cJSON *node, char *out)
{
    if (!cJSON_IsString(node) ||
        !copy_text(l, node, out, SETTINGS_ADDRESS_SIZE) || out[0] == '\0')
        return;
    const char *port = strrchr(out, ':');
    size_t digits = port == NULL ? 0 : strspn(port + 1, "0123456789");
    if (port == NULL || port == out || digits == 0 || digits > 5 ||
        port[1 + digits] != '\0' || strtol(port + 1, NULL, 10) > 65535)
        loading_error(l, node,
                      "\"%s\" is not an address with a port; write "
                      "it like \"127.0.0.1:8410\"",
                      out);
}

/* "10.0.0.0/8" or a single address. */
static bool network(const char *text, struct rig_network *out)
{
    char host[SETTINGS_ADDRESS_SIZE], *end;
    if (strlen(text) >= sizeof host)
        return false;
    snprintf(host, sizeof host, "%s", text);
    char *slash = strchr(host, '/');
    if (slash != NULL)
        *slash = '\0';
    bool is_six = strchr(host, ':') != NULL;
    unsigned long bits = is_six ? 128 : 32, most = bits;
    if (slash != NULL) {
        if (strspn(slash + 1, "0123456789") != strlen(slash + 1))
            return false;
        bits = strtoul(slash + 1, &end, 10);
        if (end == slash + 1 || *end != '\0' || bits > most)
            return false;
    }
    *out =
        (struct rig_network){.family = is_six ? 6 : 4, .bits = (uint8_t)bits};
    if (inet_pton(is_six ? AF_INET6 : AF_INET, host, out->address) != 1)
        return false;
    for (unsigned long i = bits; i < most; i++)
        if (out->address[i / 8] & 0x80 >> i % 8)
            return false; /* a bit that the mask leaves out */
    return true;
}

static void senders(struct loading *l, const cJSON *node)
{
    struct rig *rig = &l->s->rig;
    const cJSON *each = cJSON_IsArray(node) ? node->child : node;
    for (; each != NULL; each = cJSON_IsArray(node) ? each->next : NULL) {
        if (!cJSON_IsString(each))
            continue;
        if (rig->n_senders == RIG_SENDERS_MAX) {
            loading_error(l, each,
                          "more than %d senders; join them into "
                          "networks",
                          RIG_SENDERS_MAX);
            return;
        }
        if (network(each->valuestring, &rig->sender[rig->n_senders]))
            rig->n_senders++;
        else
            loading_error(l, each,
                          "\"%.64s\" is not a network; write it like "
                          "\"127.0.0.0/8\", with zeros behind the mask",
                          each->valuestring);
    }
}

/* capture.folder as an absolute path, beside the rig file. */
static void folder(struct loading *l, const cJSON *node)
{
    char here[SETTINGS_PATH_SIZE] = "", path[SETTINGS_PATH_SIZE];
    const char *name = loading_text(node), *slash = strrchr(l->path, '/');
    int beside = slash == NULL ? 0 : (int)(slash - l->path);
    int n = -1;
    if (name[0] == '\0')
        return;
    if (name[0] == '/')
        n = snprintf(path, sizeof path, "%s", name);
    else if (slash != NULL && l->path[0] == '/')
        n = snprintf(path, sizeof path, "%.*s/%s", beside, l->path, name);
    else if (getcwd(here, sizeof here) != NULL)
        n = snprintf(path, sizeof path, "%s/%.*s%s%s", here, beside, l->path,
                     slash == NULL ? "" : "/", name);
    if (n < 0 || n >= SETTINGS_PATH_SIZE) {
        loading_error(l, node,
                      "the path of the folder is too long; give a "
                      "shorter one");
        return;
    }
    memcpy(l->s->folder, path, (size_t)n + 1);
}

static void capture(struct loading *l, const cJSON *object)
{
    struct settings *s = l->s;
    const cJSON *sync = loading_get(object, "sync");
    folder(l, loading_get(object, "folder"));
    if (cJSON_IsObject(object) && loading_get(object, "folder") == NULL)
        loading_error_key(l, object,
                          "\"capture\" has no folder; give "
                          "\"folder\": \"captures\", or remove it");
    loading_bytes(l, object, "capture.segment", &s->segment_bytes);
    loading_bytes(l, object, "capture.floor", &s->floor_bytes);
    loading_time(l, object, "capture.every", 1, &s->segment_every_ns);
    s->sync = SYNC_EVERY_SECOND;
    if (strcmp(loading_text(sync), "none") == 0)
        s->sync = SYNC_NONE;
    else if (strcmp(loading_text(sync), "always") == 0)
        s->sync = SYNC_ALWAYS;
    if (s->segment_bytes >= 65536)
        return;
    const cJSON *segment = loading_get(object, "segment");
    if (segment != NULL && s->segment_bytes > 0)
        loading_error(l, segment,
                      "\"segment\" must be at least 64 KiB; make "
                      "it larger");
}

/* A measurement is older than its stamp by the delay before it travels. */
static void delays(struct loading *l)
{
    const struct rig *rig = &l->s->rig;
    const cJSON *sensor;
    cJSON_ArrayForEach(sensor, loading_get(l->root, "sensors"))
    {
        const cJSON *node = loading_get(loading_get(sensor, "time"), "delay");
        int i = rig_find_sensor(rig, sensor->string, strlen(sensor->string));
        if (node == NULL || i < 0 || rig->sensor[i].delay_ns == 0 ||
            rig->sensor[i].delay_ns < rig->horizon_ns)
            continue;
        loading_error(l, node,
                      "a delay of %g ms reaches the horizon of %g "
                      "ms: all would be too late; make order.horizon longer",
                      (double)rig->sensor[i].delay_ns * 1e-6,
                      (double)rig->horizon_ns * 1e-6);
    }
}

static void order(struct loading *l, const cJSON *object)
{
    struct rig *rig = &l->s->rig;
    bool is_ok = loading_time(l, object, "order.hold", 0, &rig->hold_ns);
    is_ok =
        loading_time(l, object, "order.horizon", 0, &rig->horizon_ns) && is_ok;
    loading_time(l, object, "order.ahead", 0, &rig->ahead_ns);
    if (is_ok)
        delays(l);
    if (!is_ok || rig->hold_ns <= rig->horizon_ns)
        return;
    const cJSON *hold = loading_get(object, "hold");
    loading_error(l, hold,
                  "hold is longer than the horizon of %g ms; make "
                  "\"horizon\" at least as long",
                  (double)rig->horizon_ns * 1e-6);
}

/* After the tracks: the default counts them. */
static void limits(struct loading *l, const cJSON *object)
{
    struct rig *rig = &l->s->rig;
    int fixed = 0, steps = 0;
    bool has_prefix = false;
    for (int i = 0; i < rig->n_kinds; i++) {
        fixed += !rig->kind[i].is_prefix;
        has_prefix = has_prefix || rig->kind[i].is_prefix;
    }
    rig->max_tracks = fixed + (has_prefix ? 64 : 0);
    const cJSON *node = loading_get(object, "tracks");
    if (loading_integer(l, object, "limits.tracks", 1, 100000,
                        &rig->max_tracks) &&
        rig->max_tracks < fixed)
        loading_error(l, node,
                      "limits.tracks is less than the %d tracks of "
                      "this file; raise it",
                      fixed);
    rig->max_ids_per_sender = rig->max_tracks;
    loading_integer(l, object, "limits.ids_per_sender", 1, 100000,
                    &rig->max_ids_per_sender);
    loading_integer(l, object, "limits.pending", 0, 1000000, &rig->max_pending);
    loading_integer(l, object, "limits.subscribers", 1, 1024,
                    &l->s->max_subscribers);
    if (loading_integer(l, object, "limits.steps", 1, 1000000000, &steps))
        rig->max_steps = steps;
}

void loading_host(struct loading *l)
{
    const cJSON *receive = loading_get(l->root, "receive");
    const cJSON *name = loading_get(l->root, "rig");
    int format = 1;
    loading_integer(l, l->root, "format", 1, 1, &format);
    if (name != NULL)
        copy_text(l, name, l->s->rig.name, sizeof l->s->rig.name);
    address(l, loading_get(receive, "udp"), l->s->udp);
    loading_bytes(l, receive, "receive.buffer", &l->s->udp_buffer_bytes);
    senders(l, loading_get(receive, "senders"));
    address(l, loading_get(loading_get(l->root, "serve"), "tcp"), l->s->tcp);
    capture(l, loading_get(l->root, "capture"));
    order(l, loading_get(l->root, "order"));
    loading_time(l, loading_get(l->root, "clock"), "clock.wait", 0,
                 &l->s->clock_wait_ns);
    limits(l, loading_get(l->root, "limits"));
}
