/* demo_view.h - what the demo shows: estimates beside the truth.
 *
 * Lines of the daemon's stream go in; a block on a terminal, or lines and
 * every event, come out.  For each track it counts how many good estimates held
 * the truth within U (k = 2).
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_DEMO_VIEW_H
#define TOOLS_DEMO_VIEW_H

#include <stdio.h>

#include <cJSON.h>

#include "tools/scene.h"

enum { DEMO_VIEW_TEXT = 160, DEMO_VIEW_STATES = 6 };

struct demo_view_row {
    uint64_t n;   /* estimates so far                             */
    int64_t t_ns; /* of the last one, since 1970                  */
    char verdict[16], why[DEMO_VIEW_TEXT];
    bool is_number[DEMO_VIEW_STATES];
    double x[DEMO_VIEW_STATES], u[DEMO_VIEW_STATES];
    double truth[DEMO_VIEW_STATES];
    uint64_t n_good, n_within; /* components of good estimates             */
};

struct demo_view {
    struct scene *scene; /* of its own: truth follows the estimates      */
    int64_t begin_ns;
    FILE *to;
    bool is_terminal;
    struct demo_view_row *row; /* by the scene's tracks                    */
    cJSON *counts; /* the last counts message                      */
    char event[2 * DEMO_VIEW_TEXT + 2 * RIG_ID_SIZE];
    bool hides_events; /* what the end itself brings about            */
    uint64_t n_estimates, n_unread; /* n_unread: lines that are no JSON    */
    int n_drawn;
};

/* Shows on standard output. */
status demo_view_init(struct demo_view *v, struct scene *s, int64_t begin_ns,
                      bool is_terminal) MUST_USE;
void demo_view_fini(struct demo_view *v);

/* One line of the stream, NUL-terminated. */
void demo_view_take(struct demo_view *v, const char *line);

/* On a terminal over what was drawn before, else new lines. */
void demo_view_draw(struct demo_view *v);

/* The last ledger, and how often the truth was held. */
void demo_view_ledger(const struct demo_view *v);

#endif
