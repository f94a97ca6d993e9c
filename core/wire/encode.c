/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/encode.h"

#include <assert.h>
#include <math.h>
#include <string.h>

#include "core/math/ud.h"
#include "core/wire/decode.h"
#include "core/wire/ledger.h"
#include "core/wire/writer.h"

/* --- parts that several messages have --------------------------------------
 */

static void begin(struct writer *w, const char *type)
{
    writer_open_map(w);
    writer_key(w, "type");
    writer_text(w, type);
}

static size_t finish(struct writer *w)
{
    writer_close(w);
    return writer_finish(w);
}

/* NULL if there is no such sensor. */
static const char *sensor_name(const struct rig *rig, int sensor)
{
    return sensor >= 0 && sensor < rig->n_sensors ? rig->sensor[sensor].name
                                                  : NULL;
}

static const char *subject_name(const struct rig *rig, int kind,
                                const struct reason *r)
{
    switch ((enum reason_code)r->code) {
    case REASON_SILENT:
    case REASON_REFUSED:
    case REASON_SET_ASIDE:
        return sensor_name(rig, r->subject);
    case REASON_U:
    case REASON_UNDETERMINED:
        if (kind >= rig->n_kinds || r->subject < 0 ||
            r->subject >= rig->kind[kind].n)
            return NULL;
        return rig->kind[kind].state[r->subject].name;
    case REASON_COUNT:
        break;
    }
    return NULL;
}

/* "code:subject", or the code alone where it has no subject. */
static void write_reason(struct writer *w, const struct rig *rig, int kind,
                         const struct reason *r)
{
    char text[32 + RIG_ID_SIZE];
    const char *code = reason_code_text((enum reason_code)r->code);
    const char *subject = subject_name(rig, kind, r);
    size_t len = strlen(code);
    assert(len < 31);
    memcpy(text, code, len + 1);
    if (subject != NULL) {
        text[len] = ':';
        memcpy(text + len + 1, subject, strlen(subject) + 1);
    }
    writer_text(w, text);
}

static void write_why(struct writer *w, const struct rig *rig, int kind,
                      const struct reason *why, int n)
{
    assert(n <= MESSAGE_REASONS_MAX);
    writer_key(w, "why");
    writer_open_array(w);
    for (int i = 0; i < n; i++)
        write_reason(w, rig, kind, &why[i]);
    writer_close(w);
}

/* --- estimate --------------------------------------------------------------
 */

static bool is_undetermined(const struct estimate *e, int i)
{
    return e->undetermined >> i & 1;
}

static void write_x(struct writer *w, const struct estimate *e)
{
    writer_key(w, "x");
    writer_open_array(w);
    for (int i = 0; i < e->n_states; i++) {
        if (is_undetermined(e, i))
            writer_null(w);
        else
            writer_number(w, e->v[i]);
    }
    writer_close(w);
}

/* u and the lower triangle of P; what is undetermined is null. */
static void write_covariance(struct writer *w, const struct estimate *e)
{
    double P[UD_MAX * UD_MAX];
    int n = e->n_states;
    assert(n <= UD_MAX);
    ud_covariance(n, e->v + n, P); /* P = U D U'                     n x n */

    writer_key(w, "u");
    writer_open_array(w);
    for (int i = 0; i < n; i++) {
        if (is_undetermined(e, i))
            writer_null(w);
        else
            writer_number(w, sqrt(P[i * n + i])); /* u_i = sqrt(P_ii)     */
    }
    writer_close(w);

    writer_key(w, "P");
    writer_open_array(w);
    for (int i = 0; i < n; i++) {
        for (int j = 0; j <= i; j++) {
            if (is_undetermined(e, i) || is_undetermined(e, j))
                writer_null(w);
            else
                writer_number(w, P[i * n + j]);
        }
    }
    writer_close(w);
}

/* What the last measurement in canonical order did. */
static void write_measured(struct writer *w, const struct rig *rig,
                           const struct estimate *e)
{
    const char *sensor = sensor_name(rig, e->sensor);
    writer_key(w, "sensor");
    if (sensor != NULL)
        writer_text(w, sensor);
    else
        writer_null(w);
    writer_key(w, "nis");
    if (e->dof > 0)
        writer_number(w, e->nis);
    else
        writer_null(w);
    writer_key(w, "dof");
    writer_count(w, e->dof);
    writer_key(w, "accepted");
    writer_bool(w, e->accepted != 0);
}

static size_t encode_estimate(struct writer *w, const struct rig *rig,
                              const struct estimate *e)
{
    bool is_live = e->stream == STREAM_LIVE;
    begin(w, "estimate");
    writer_key(w, "track");
    writer_text(w, e->head.track);
    writer_key(w, "stream");
    writer_text(w, is_live ? "live" : "settled");
    writer_key(w, "n");
    writer_count(w, e->n);
    writer_key(w, "t");
    writer_time(w, e->t_ns);
    write_x(w, e);
    write_covariance(w, e);
    writer_key(w, "verdict");
    writer_text(w, verdict_text((enum verdict)e->verdict));
    write_why(w, rig, e->head.kind, e->why, e->n_why);
    write_measured(w, rig, e);
    if (is_live) { /* settled ones carry nothing that depends on arrival  */
        writer_key(w, "arrived");
        writer_time(w, e->arrived_ns);
        writer_key(w, "rerun");
        writer_count(w, e->rerun);
    }
    return finish(w);
}

/* --- event, counts ---------------------------------------------------------
 */

static const char *mark_text(enum mark_kind mark)
{
    switch (mark) {
    case MARK_NONE:
        return "none";
    case MARK_START:
        return "start";
    case MARK_STOP:
        return "stop";
    case MARK_ZERO:
        return "zero";
    case MARK_NOTE:
        return "note";
    }
    return "";
}

static void write_mark(struct writer *w, const struct event *e)
{
    writer_key(w, "mark");
    writer_text(w, mark_text((enum mark_kind)e->mark));
    writer_key(w, "name");
    writer_text(w, e->name);
    writer_key(w, "text");
    writer_text(w, e->note);
}

static size_t encode_event(struct writer *w, const struct rig *rig,
                           const struct event *e)
{
    const char *sensor = sensor_name(rig, e->sensor);
    begin(w, "event");
    writer_key(w, "event");
    writer_text(w, event_text((enum event_kind)e->event));
    writer_key(w, "t");
    writer_time(w, e->t_ns);
    if (e->head.track[0] != '\0') {
        writer_key(w, "track");
        writer_text(w, e->head.track);
    }
    if (sensor != NULL) {
        writer_key(w, "sensor");
        writer_text(w, sensor);
    }
    if (e->event == EVENT_VERDICT) {
        writer_key(w, "verdict");
        writer_text(w, verdict_text((enum verdict)e->verdict));
        writer_key(w, "was");
        writer_text(w, verdict_text((enum verdict)e->was));
        write_why(w, rig, e->head.kind, e->why, e->n_why);
    }
    if (e->event == EVENT_MARK)
        write_mark(w, e);
    return finish(w);
}

static size_t encode_counts(struct writer *w, const struct rig *rig,
                            const struct counts *c)
{
    begin(w, "counts");
    writer_key(w, "t");
    writer_time(w, c->t_ns);
    ledger_write(w, rig, c);
    writer_key(w, "marks");
    writer_count(w, c->marks);
    writer_key(w, "bad-elements");
    writer_count(w, c->bad_elements);
    return finish(w);
}

size_t wire_encode(const struct rig *rig, const struct message *m,
                   enum wire_form form, char *buf, size_t size)
{
    struct writer w;
    writer_init(&w, form, buf, size);
    switch ((enum message_type)m->type) {
    case MESSAGE_ESTIMATE:
        return encode_estimate(&w, rig, (const struct estimate *)m);
    case MESSAGE_EVENT:
        return encode_event(&w, rig, (const struct event *)m);
    case MESSAGE_COUNTS:
        return encode_counts(&w, rig, (const struct counts *)m);
    }
    return 0;
}

/* --- description -----------------------------------------------------------
 */

/* "carriage", or "raft-*" for a prefix. */
static void write_kind_id(struct writer *w, const struct rig_kind *kind)
{
    char id[RIG_ID_SIZE + 1];
    size_t len = strlen(kind->id);
    memcpy(id, kind->id, len + 1);
    if (kind->is_prefix)
        memcpy(id + len, "*", 2);
    writer_text(w, id);
}

static void describe_kind(struct writer *w, const struct rig_kind *kind)
{
    writer_open_map(w);
    writer_key(w, "id");
    write_kind_id(w, kind);
    writer_key(w, "states");
    writer_open_array(w);
    for (int i = 0; i < kind->n; i++) {
        writer_open_map(w);
        writer_key(w, "name");
        writer_text(w, kind->state[i].name);
        writer_key(w, "unit");
        writer_text(w, kind->state[i].unit);
        writer_close(w);
    }
    writer_close(w);
    writer_close(w);
}

static void describe_sensor(struct writer *w, const struct rig *rig,
                            const struct rig_sensor *sensor)
{
    writer_open_map(w);
    writer_key(w, "name");
    writer_text(w, sensor->name);
    writer_key(w, "track");
    write_kind_id(w, &rig->kind[sensor->kind]);
    writer_key(w, "unit");
    writer_open_array(w);
    for (int i = 0; i < sensor->reads.m; i++)
        writer_text(w, sensor->unit[i]);
    writer_close(w);
    writer_close(w);
}

size_t wire_encode_description(const struct rig *rig, const char *build,
                               enum wire_form form, char *buf, size_t size)
{
    struct writer w;
    writer_init(&w, form, buf, size);
    begin(&w, "description");
    writer_key(&w, "rig");
    writer_text(&w, rig->name);
    writer_key(&w, "wire");
    writer_count(&w, WIRE_VERSION);
    writer_key(&w, "engine");
    writer_count(&w, ENGINE_NUMBER);
    writer_key(&w, "build");
    writer_text(&w, build);
    writer_key(&w, "rig_hash");
    writer_text(&w, rig->file_hash);
    writer_key(&w, "P");
    writer_text(&w, "lower triangle by rows");
    writer_key(&w, "tracks");
    writer_open_array(&w);
    for (int i = 0; i < rig->n_kinds; i++)
        describe_kind(&w, &rig->kind[i]);
    writer_close(&w);
    writer_key(&w, "sensors");
    writer_open_array(&w);
    for (int i = 0; i < rig->n_sensors; i++)
        describe_sensor(&w, rig, &rig->sensor[i]);
    writer_close(&w);
    return finish(&w);
}

/* --- of the connection -----------------------------------------------------
 */

size_t wire_encode_heartbeat(int64_t t_ns, uint64_t skipped,
                             enum wire_form form, char *buf, size_t size)
{
    struct writer w;
    writer_init(&w, form, buf, size);
    begin(&w, "heartbeat");
    writer_key(&w, "t");
    writer_time(&w, t_ns);
    writer_key(&w, "skipped");
    writer_count(&w, skipped);
    return finish(&w);
}

size_t wire_encode_bye(const char *reason, enum wire_form form, char *buf,
                       size_t size)
{
    struct writer w;
    writer_init(&w, form, buf, size);
    begin(&w, "bye");
    writer_key(&w, "reason");
    writer_text(&w, reason);
    return finish(&w);
}

size_t wire_encode_host(int64_t t_ns, const char *what, const char *text,
                        uint64_t n, enum wire_form form, char *buf, size_t size)
{
    struct writer w;
    writer_init(&w, form, buf, size);
    begin(&w, "host");
    writer_key(&w, "what");
    writer_text(&w, what);
    writer_key(&w, "t");
    writer_time(&w, t_ns);
    writer_key(&w, "n");
    writer_count(&w, n);
    writer_key(&w, "text");
    writer_text(&w, text);
    return finish(&w);
}
