/* hub.h - from the run to everybody who listens: a thread and a loop of its
 * own.
 *
 * Ingest hands messages over through a bounded ring and never waits.  The hub
 * encodes each message once per form and shares the bytes; whoever is slow
 * gets less (newest per track) or is told how much was skipped.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_HUB_H
#define DAEMON_HUB_H

#include "config/load.h"
#include "core/model/message.h"
#include "daemon/endpoint.h"

struct hub;

/* Binds serve.tcp (if the settings have one) and begins the thread.  `at`
 * gets the port in use. */
status hub_start(struct hub **h, const struct settings *s, struct endpoint *at,
                 struct err *err) MUST_USE;

/* From ingest: one message of the run.  Never waits; what does not fit is
 * counted and told to the subscribers. */
void hub_say(struct hub *h, const struct message *m);

/* From ingest: does anybody want estimates of this stream? */
bool hub_wants(struct hub *h, enum stream stream);

/* From any thread: a host message for everybody (see wire_encode_host). */
void hub_host(struct hub *h, const char *what, const char *text, uint64_t n);

/* Delivers what is queued, says bye, closes, ends the thread. */
void hub_stop(struct hub *h);

#endif
