/* play_case.h - a rig and its rehearsals, for the tests of what is played. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_UNIT_PLAY_CASE_H
#define TESTS_UNIT_PLAY_CASE_H

#include <check.h>
#include <string.h>

#include "tools/scene_play.h"

/* One axis in m, with a bias and gusts; bodies in a basin. */
static const char case_rig[] =
    "{\"receive\": {\"udp\": \"127.0.0.1:0\"},\n"
    " \"tracks\": {\n"
    "  \"cart\": {\"state\": [\n"
    "   {\"model\": \"constant-acceleration\", \"name\": \"x\",\n"
    "    \"unit\": \"m\", \"q\": \"0.2 m2/s5\"},\n"
    "   {\"model\": \"random-walk\", \"name\": \"bias\", \"unit\": \"mm\",\n"
    "    \"q\": \"1 mm2/s\"},\n"
    "   {\"model\": \"gauss-markov\", \"name\": \"gust\", \"unit\": \"N\",\n"
    "    \"tau\": \"2 s\", \"u\": \"3 N\", \"mean\": \"5 N\"}]},\n"
    "  \"raft-*\": {\"state\": [\n"
    "   {\"model\": \"constant-velocity\", \"name\": \"x\", \"unit\": \"m\",\n"
    "    \"q\": \"0.02 m2/s3\"},\n"
    "   {\"model\": \"constant-velocity\", \"name\": \"y\", \"unit\": \"m\",\n"
    "    \"q\": \"0.02 m2/s3\"}],\n"
    "   \"start\": {\"x\": {\"mean\": \"10 m\", \"u\": \"6 m\"},\n"
    "             \"y\": {\"mean\": \"6 m\", \"u\": \"6 m\"}}}},\n"
    " \"sensors\": {\n"
    "  \"laser\": {\"track\": \"cart\", \"reads\": \"x\", \"unit\": \"mm\",\n"
    "   \"u\": \"2 mm\", \"rate\": \"50 Hz\"},\n"
    "  \"frame\": {\"track\": \"cart\", \"reads\": \"x.accel\",\n"
    "   \"unit\": \"gn\", \"u\": \"0.03 m/s2\", \"rate\": \"200 Hz\",\n"
    "   \"time\": {\"delay\": \"4 ms\"}},\n"
    "  \"sum\": {\"track\": \"cart\", \"reads\": {\"x\": 2, \"bias\": 1},\n"
    "   \"unit\": \"m\", \"u\": \"1 mm\", \"rate\": \"10 Hz\"},\n"
    "  \"tower-a\": {\"track\": \"raft-*\", \"reads\": {\"range-bearing\":\n"
    "   [\"x\", \"y\"], \"from\": [\"1 m\", \"2 m\"], \"zero\": \"-150 deg\",\n"
    "   \"turn\": \"left\"}, \"unit\": [\"mm\", \"deg\"],\n"
    "   \"u\": [\"20 mm\", \"0.2 deg\"], \"rate\": \"10 Hz\"},\n"
    "  \"tower-b\": {\"track\": \"raft-*\", \"reads\": {\"range-bearing\":\n"
    "   [\"x\", \"y\"], \"from\": [\"1 m\", \"2 m\"], \"zero\": \"-90 deg\",\n"
    "   \"turn\": \"right\"}, \"unit\": [\"m\", \"deg\"],\n"
    "   \"u\": [\"20 mm\", \"0.2 deg\"], \"rate\": \"10 Hz\"}}}\n";

struct play_case {
    struct settings *settings;
    struct scene *scene;
};

static inline void case_rig_init(struct play_case *c)
{
    struct problems problems;
    problems_init(&problems);
    status st = settings_parse(&c->settings, "rig.json", case_rig,
                               strlen(case_rig), NULL, 0, &problems);
    ck_assert_msg(st == ST_OK, "%s", problems.text);
    problems_fini(&problems);
    c->scene = NULL;
}

/* The rehearsal of this text; fails the test with all problems. */
static inline void case_init(struct play_case *c, const char *text)
{
    struct problems problems;
    case_rig_init(c);
    const struct scene_source from = {&c->settings->rig, "rehearsal.json",
                                      NULL};
    problems_init(&problems);
    status st = scene_parse(&c->scene, &from, text, strlen(text), &problems);
    ck_assert_msg(st == ST_OK, "%s", problems.text);
    problems_fini(&problems);
}

static inline void case_fini(struct play_case *c)
{
    scene_free(c->scene);
    settings_free(c->settings);
}

static inline int case_sensor(const struct play_case *c, const char *name)
{
    int i = rig_find_sensor(&c->settings->rig, name, strlen(name));
    ck_assert_int_ge(i, 0);
    return i;
}

#endif
