/* create.h - a file to write, unless that would destroy something. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TOOLS_CREATE_H
#define TOOLS_CREATE_H

#include <stdio.h>

#include "tools/call.h"

/* Opens the path for writing; NULL and a message when it cannot be made, is
 * one of the n inputs (NULLs are passed over), or holds a capture that
 * ropewalkd made. */
FILE *create_file(const struct call *call, const char *path,
                  const char *const *input, int n);

#endif
