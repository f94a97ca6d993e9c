/* The list of verbs, in the order of --help: before, during, after a run. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/call.h"

#include <stddef.h>

extern const struct verb verb_demo, verb_check, verb_rehearse, verb_send,
    verb_follow, verb_import, verb_replay, verb_help;

const struct verb *const verb_list[] = {
    &verb_demo,   &verb_check,  &verb_rehearse, &verb_send, &verb_follow,
    &verb_import, &verb_replay, &verb_help,     NULL,
};
