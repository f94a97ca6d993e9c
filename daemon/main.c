/* ropewalkd: fuses what the sensors of a rig send. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <getopt.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#ifdef __SSE2__
#include <xmmintrin.h>
#endif

#include "daemon/server.h"

enum { CHANGES_MAX = 64, EXIT_USE = 64, EXIT_UNAVAILABLE = 69, EXIT_BAD = 78 };

static const char usage[] =
    "usage: ropewalkd RIG.json [options]\n"
    "\n"
    "Receives measurements, fuses them and publishes estimates with their\n"
    "uncertainty, until SIGTERM or SIGINT.\n"
    "\n"
    "  --check            only says whether the rig file is good\n"
    "  --set PATH=VALUE   changes a setting of the rig file; may be repeated\n"
    "  --no-capture       keeps no record of what arrives\n"
    "  --port-file FILE   writes the ports in use there, once ready\n"
    "  --version          names the build\n"
    "\n"
    "An aid to measurement, never a safety function: no interlock, limit or\n"
    "protective stop may hang on an estimate.\n";

struct options {
    bool only_checks, has_no_capture;
    struct server_options server;
    struct settings_change change[CHANGES_MAX];
    int n_changes;
    const char *rig;
};

/* "path=value" is taken apart in place. */
static bool take_change(struct options *o, char *text)
{
    char *equals = strchr(text, '=');
    if (!equals || o->n_changes == CHANGES_MAX)
        return false;
    *equals = 0;
    o->change[o->n_changes++] = (struct settings_change){text, equals + 1};
    return true;
}

/* 0 to go on, else the exit code + 1. */
static int parse(struct options *o, int argc, char **argv)
{
    static const struct option rows[] = {
        {"check", no_argument, NULL, 'c'},
        {"set", required_argument, NULL, 's'},
        {"no-capture", no_argument, NULL, 'n'},
        {"port-file", required_argument, NULL, 'p'},
        {"version", no_argument, NULL, 'v'},
        {"help", no_argument, NULL, 'h'},
        {NULL, 0, NULL, 0}};
    for (int c; (c = getopt_long(argc, argv, "h", rows, NULL)) != -1;) {
        switch (c) {
        case 'c':
            o->only_checks = true;
            break;
        case 's':
            if (!take_change(o, optarg)) {
                fprintf(stderr, "ropewalkd: --set takes PATH=VALUE\n");
                return EXIT_USE + 1;
            }
            break;
        case 'n':
            o->has_no_capture = true;
            break;
        case 'p':
            o->server.port_file = optarg;
            break;
        case 'v':
            puts("ropewalkd " ROPEWALK_BUILD);
            return 1;
        case 'h':
            fputs(usage, stdout);
            return 1;
        default:
            fputs(usage, stderr);
            return EXIT_USE + 1;
        }
    }
    if (optind + 1 != argc) {
        fputs(usage, stderr);
        return EXIT_USE + 1;
    }
    o->rig = argv[optind];
    return 0;
}

/* Denormals flushed to zero would make other bits than a replay elsewhere. */
static bool is_arithmetic_plain(void)
{
#ifdef __SSE2__
    return (_mm_getcsr() & 0x8040) == 0;
#else
    return true;
#endif
}

int main(int argc, char **argv)
{
    struct options o = {0};
    struct problems problems;
    struct settings *settings = NULL;
    struct err err = {0};
    int code = parse(&o, argc, argv);
    if (code != 0)
        return code - 1;
    if (!is_arithmetic_plain()) {
        fprintf(stderr, "ropewalkd: the processor flushes denormal numbers to "
                        "zero (MXCSR): results could not be repeated; remove "
                        "what sets it\n");
        return EXIT_UNAVAILABLE;
    }
    problems_init(&problems);
    status st =
        settings_load(&settings, o.rig, o.change, o.n_changes, &problems);
    if (st != ST_OK) {
        fputs(problems.text ? problems.text : "", stderr);
        code = EXIT_BAD;
    } else if (o.only_checks) {
        printf("%s: good\n", o.rig);
    } else {
        if (o.has_no_capture)
            settings->folder[0] = 0;
        st = server_run(settings, &o.server, &err);
        if (st != ST_OK) {
            fprintf(stderr, "ropewalkd: %s\n", err.text);
            code = st == ST_SCHEMA ? EXIT_BAD : EXIT_UNAVAILABLE;
        }
    }
    settings_free(settings);
    problems_fini(&problems);
    return code;
}
