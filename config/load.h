/* load.h - a rig file to struct settings.
 *
 * JSON with comments; every quantity may carry its unit; all problems are
 * reported at once, each with file:line:column, the line, a caret, the reason
 * and the remedy or the nearest name.  Keys that are planned but not built
 * are refused by name, never ignored.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CONFIG_LOAD_H
#define CONFIG_LOAD_H

#include <stdbool.h>
#include <stdint.h>

#include "config/err.h"
#include "core/model/rig.h"

enum { SETTINGS_ADDRESS_SIZE = 64, SETTINGS_PATH_SIZE = 1024 };

enum settings_sync { SYNC_NONE, SYNC_EVERY_SECOND, SYNC_ALWAYS };

/* What the daemon needs beside the rig. */
struct settings {
    struct rig rig;
    char path[SETTINGS_PATH_SIZE];   /* of the rig file                  */
    char folder[SETTINGS_PATH_SIZE]; /* capture.folder, absolute, beside the
                                        rig file unless absolute itself;
                                        "" = no capture                  */
    char udp[SETTINGS_ADDRESS_SIZE]; /* receive.udp, "127.0.0.1:8410"    */
    char tcp[SETTINGS_ADDRESS_SIZE]; /* serve.tcp                        */
    int64_t udp_buffer_bytes;        /* receive.buffer                   */
    int64_t segment_bytes, segment_every_ns, floor_bytes;
    enum settings_sync sync;
    int64_t clock_wait_ns;
    int max_subscribers;
    char *text; /* the file's bytes, owned          */
    size_t text_len;
};

/* One `--set path=value`: value is JSON, or a bare word taken as a string. */
struct settings_change {
    const char *path, *value;
};

/* Loads the file with the changes laid over it.  On anything but ST_OK *s is
 * empty and *problems holds at least one report. */
status settings_load(struct settings **s, const char *path,
                     const struct settings_change *changes, int n_changes,
                     struct problems *problems) MUST_USE;

/* The same from memory; `path` only names it and anchors capture.folder. */
status settings_parse(struct settings **s, const char *path, const char *text,
                      size_t len, const struct settings_change *changes,
                      int n_changes, struct problems *problems) MUST_USE;

void settings_free(struct settings *s);

/* The settings table as help: one key ("sensors.*.silent_after") or, with
 * NULL, every key.  Returns false if there is no such key. */
bool settings_help(const char *key, void (*line)(void *ctx, const char *text),
                   void *ctx);

/* The JSON Schema that the table makes. */
void settings_schema(void (*line)(void *ctx, const char *text), void *ctx);

#endif
