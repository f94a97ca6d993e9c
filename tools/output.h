/* output.h - messages of a run to a file, in big pieces. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_OUTPUT_H
#define TOOLS_OUTPUT_H

#include <stdio.h>

#include "core/run/run.h"

enum output_streams {
    OUTPUT_NONE,
    OUTPUT_LIVE = 1 << STREAM_LIVE,
    OUTPUT_SETTLED = 1 << STREAM_SETTLED,
    OUTPUT_BOTH = OUTPUT_LIVE | OUTPUT_SETTLED
};

struct output {
    const struct rig *rig;
    FILE *to;
    enum output_streams streams;
    bool wants[2]; /* the same, by stream, for the run               */
    char *buf;
    size_t size, used;
    bool has_failed; /* the file takes no more; errno says why      */
    int reason;      /* errno of then                               */
    uint64_t n_estimates;
};

/* False for a word that is none of live, settled, both, none. */
bool output_parse_streams(const char *word, enum output_streams *streams);

status output_init(struct output *o, const struct rig *rig, FILE *to,
                   enum output_streams streams) MUST_USE;
/* Writes what is left; ST_IO when anything could not be written. */
status output_fini(struct output *o) MUST_USE;

/* Estimates of the chosen streams, events, and counts unless no stream is
 * chosen: then nothing is encoded that the summary tells too. */
struct message_sink output_sink(struct output *o);

void output_description(struct output *o, const char *build);
void output_summary(struct output *o, struct run *run);

#endif
