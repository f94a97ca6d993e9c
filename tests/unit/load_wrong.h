/* Wrong rig files and what is said of each, whole. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef TESTS_UNIT_LOAD_WRONG_H
#define TESTS_UNIT_LOAD_WRONG_H

static const struct {
    const char *name, *text, *report;
} wrong[] = {
    {"an unknown setting names the nearest",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"standrd\": 1, \"unti\": "
     "\"mm\", \"u\": 1}}}\n",
     "rig.json:5:27: error: unknown setting \"standrd\"\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"standrd\": 1, "
     "\"unti\": \"mm\", \"u\": 1}}}\n"
     "       |                           ^\n"
     "       = known here: like, track, reads, unit, u, resoluti"
     "on, rate, silent_after, gate, time, lag, scale, offset, plus, noise\n"
     "rig.json:5:41: error: unknown setting \"unti\"\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"standrd\": 1, "
     "\"unti\": \"mm\", \"u\": 1}}}\n"
     "       |                                         ^\n"
     "       = did you mean \"unit\"?\n"},
    {"an uncertainty of nothing or less",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": -0.1}}}\n",
     "rig.json:5:32: error: standard uncertainty must be greater"
     " than 0\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": -0.1}}}\n"
     "       |                                ^\n"
     "       = give one standard deviation, in m\n"},
    {"a unit of another kind",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"deg\", \"u\": "
     "2}}}\n",
     "rig.json:5:35: error: the unit \"deg\" is of another kind "
     "than \"m\"\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"unit\": \"deg\""
     ", \"u\": 2}}}\n"
     "       |                                   ^\n"
     "       = give one that converts to m\n"},
    {"an unclear unit",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": \"2 g\"}}}\n",
     "rig.json:5:32: error: the unit \"g\" is not clear\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": \"2 g\"}}}\n"
     "       |                                ^\n"
     "       = write gram for a mass or gn for standard gravity\n"},
    {"an unknown state",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x.rat\", \"u\": \"2 mm\"}}}\n",
     "rig.json:5:22: error: unknown state \"x.rat\"\n"
     "     5 |   \"laser\": {\"reads\": \"x.rat\", \"u\": \"2 mm"
     "\"}}}\n"
     "       |                      ^\n"
     "       = did you mean \"x.rate\"?\n"},
    {"an unknown track",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"track\": \"cariage\", \"reads\": \"x\", \""
     "u\": 1}}}\n",
     "rig.json:5:22: error: unknown track \"cariage\"\n"
     "     5 |   \"laser\": {\"track\": \"cariage\", \"reads\": "
     "\"x\", \"u\": 1}}}\n"
     "       |                      ^\n"
     "       = did you mean \"carriage\"?\n"},
    {"a key that stands twice",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1, \"reads\": \"x\""
     "}}}\n",
     "rig.json:5:35: error: \"reads\" stands twice in this objec"
     "t\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1, \"reads"
     "\": \"x\"}}}\n"
     "       |                                   ^\n"
     "       = remove one\n"},
    {"a comma too many",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1,}}}\n",
     "rig.json:5:34: error: a key must follow the comma\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1,}}}\n"
     "       |                                  ^\n"
     "       = remove the comma\n"},
    {"a comment without an end",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1} /* old:}}\n",
     "rig.json:5:35: error: this comment does not end\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1} /* old:"
     "}}\n"
     "       |                                   ^\n"
     "       = close it with */\n"},
    {"bytes that are not text",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": \"2 \xb5m\"}}}\n",
     "rig.json:5:35: error: this byte is not UTF-8 text\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": \"2 \xb5m"
     "\"}}}\n"
     "       |                                   ^\n"
     "       = save the file as UTF-8\n"},
    {"a wrong type",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1, \"rate\": [50], "
     "\"time\": 5}}}\n",
     "rig.json:5:43: error: \"rate\" must be a number, or a text"
     " with its unit\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1, \"rate"
     "\": [50], \"time\": 5}}}\n"
     "       |                                           ^\n"
     "       = meant here: measurements per second and track\n"
     "rig.json:5:57: error: \"time\" must be an object {...}\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1, \"rate"
     "\": [50], \"time\": 5}}}\n"
     "       |                                                  "
     "       ^\n"
     "       = meant here: what its time means\n"},
    {"a list of the wrong length",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": [\"x\", \"x.rate\"], \"u\": [1, 2"
     ", 3]}}}\n",
     "rig.json:5:44: error: \"u\" lists 3 values, but the sensor"
     " reads 2\n"
     "     5 |   \"laser\": {\"reads\": [\"x\", \"x.rate\"], \"u"
     "\": [1, 2, 3]}}}\n"
     "       |                                            ^\n"
     "       = give 2, or one for all\n"},
    {"a gate that is no probability",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1, \"gate\": 99.9}}"
     "}\n",
     "rig.json:5:43: error: \"gate\" must be a probability betwe"
     "en 0 and 1, or \"off\"\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1, \"gate"
     "\": 99.9}}}\n"
     "       |                                           ^\n"
     "       = 0.999 refuses 1 of 1000 sound measurements\n"},
    {"a turning rate for a frequency",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"u\": 1, \"rate\": \"50 r"
     "ev/min\"}}}\n",
     "rig.json:5:43: error: the unit \"rev/min\" is of another k"
     "ind than \"Hz\"\n"
     "     5 |   \"laser\": {\"reads\": \"x\", \"u\": 1, \"rate"
     "\": \"50 rev/min\"}}}\n"
     "       |                                           ^\n"
     "       = give one that converts to Hz (rev/min and rad/s t"
     "urn, Hz counts)\n"},
    {"a hold beyond the horizon",
     "{\"order\": {\"hold\": \"2 s\"},\n"
     " \"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:1:20: error: hold is longer than the horizon of 5"
     "00 ms\n"
     "     1 | {\"order\": {\"hold\": \"2 s\"},\n"
     "       |                    ^\n"
     "       = make \"horizon\" at least as long\n"},
    {"a range without a start",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": {\"range\": [\"x\", \"1 m\"], \"f"
     "rom\": [0, 0]},\n"
     "            \"u\": 1}}}\n",
     "rig.json:5:22: error: starting ranges from data is not bui"
     "lt yet\n"
     "     5 |   \"laser\": {\"reads\": {\"range\": [\"x\", \"1 "
     "m\"], \"from\": [0, 0]},\n"
     "       |                      ^\n"
     "       = give tracks.carriage.start of \"x\"\n"},
    {"a bearing without its sense",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}],\n"
     "  \"start\": {\"x\": {\"mean\": 0, \"u\": 1}}}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": {\"bearing\": [\"x\", 1], \"from"
     "\": [0, 0]}, \"u\": 1}}}\n",
     "rig.json:6:22: error: a bearing needs \"zero\" and \"turn"
     "\"\n"
     "     6 |   \"laser\": {\"reads\": {\"bearing\": [\"x\", 1]"
     ", \"from\": [0, 0]}, \"u\": 1}}}\n"
     "       |                      ^\n"
     "       = give \"zero\": \"0 deg\" and \"turn\": \"left\" o"
     "r \"right\"\n"},
    {"a track that nobody reads",
     "{\"tracks\": {\"raft-*\": {\"like\": \"carriage\"}, \"carr"
     "iage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"track\": \"raft-*\", \"reads\": \"x\", \"u"
     "\": 1}}}\n",
     "rig.json:1:45: error: no sensor reads the track \"carriage"
     "\"\n"
     "     1 | {\"tracks\": {\"raft-*\": {\"like\": \"carriage\""
     "}, \"carriage\": {\"state\": [\n"
     "       |                                             ^\n"
     "       = add one, or remove the track\n"},
    {"a name that is none",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"my laser\": {\"reads\": \"x\", \"u\": 1}}}\n",
     "rig.json:5:3: error: \"my laser\" cannot name a sensor\n"
     "     5 |   \"my laser\": {\"reads\": \"x\", \"u\": 1}}}\n"
     "       |   ^\n"
     "       = use letters, digits and _ . : - (up to 63)\n"},
    {"like that leads nowhere",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"like\": \"lasr1\"}, \"laser1\": {\"reads\""
     ": \"x\", \"u\": 1}}}\n",
     "rig.json:5:21: error: unknown sensor \"lasr1\"\n"
     "     5 |   \"laser\": {\"like\": \"lasr1\"}, \"laser1\": {"
     "\"reads\": \"x\", \"u\": 1}}}\n"
     "       |                     ^\n"
     "       = did you mean \"laser1\"?\n"},
    {"a density of another model",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s5\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:3:9: error: the unit \"m2/s5\" is of another kind"
     " than \"m2/s3\"\n"
     "     3 |    \"q\": \"1 m2/s5\"}]}},\n"
     "       |         ^\n"
     "       = give one that converts to m2/s3\n"},
    {"neither q nor words",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:2:3: error: the state \"x\" needs either \"q\" or"
     " \"unmodelled\"\n"
     "     2 |   {\"model\": \"constant-velocity\", \"name\": \""
     "x\", \"unit\": \"m\"}]}},\n"
     "       |   ^\n"
     "       = give one, like \"unmodelled\": {\"accel\": .., \""
     "lasts\": ..}\n"},
    {"a key of another model",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\", \"tau\": 5}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:3:20: error: \"tau\" does not belong to the model"
     " constant-velocity\n"
     "     3 |    \"q\": \"1 m2/s3\", \"tau\": 5}]}},\n"
     "       |                    ^\n"
     "       = remove it\n"},
    {"a model that is not built",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"coordinated-turn\", \"name\": \"x\", \"unit\": \"m\""
     ",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:2:13: error: \"coordinated-turn\" is planned but not built "
     "yet\n"
     "     2 |   {\"model\": \"coordinated-turn\", \"name\": \"x\", \"unit"
     "\": \"m\",\n"
     "       |             ^\n"
     "       = use another model\n"},
    {"an unknown model",
     "{\"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velosity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:2:13: error: unknown model \"constant-velosity\"\n"
     "     2 |   {\"model\": \"constant-velosity\", \"name\": \""
     "x\", \"unit\": \"m\",\n"
     "       |             ^\n"
     "       = did you mean \"constant-velocity\"?\n"},
    {"an address without a port",
     "{\"receive\": {\"udp\": \"127.0.0.1\"}, \"tracks\": {\"car"
     "riage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:1:21: error: \"127.0.0.1\" is not an address with"
     " a port\n"
     "     1 | {\"receive\": {\"udp\": \"127.0.0.1\"}, \"tracks"
     "\": {\"carriage\": {\"state\": [\n"
     "       |                     ^\n"
     "       = write it like \"127.0.0.1:8410\"\n"},
    {"a network with bits behind its mask",
     "{\"receive\": {\"senders\": [\"10.1.0.0/8\"]}, \"tracks\":"
     " {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"x\", \"unit\": \"mm\", \"u\": "
     "\"2 mm\"}}}\n",
     "rig.json:1:26: error: \"10.1.0.0/8\" is not a network\n"
     "     1 | {\"receive\": {\"senders\": [\"10.1.0.0/8\"]}, \""
     "tracks\": {\"carriage\": {\"state\": [\n"
     "       |                          ^\n"
     "       = write it like \"127.0.0.0/8\", with zeros behind "
     "the mask\n"},
    {"nothing but a word", "true\n",
     "rig.json:1:1: error: a rig file is one object\n"
     "     1 | true\n"
     "       | ^\n"
     "       = begin with {\n"},
    {"no tracks and no sensors", "{\"rig\": \"\xc3\xa4rger\"}\n",
     "rig.json:1:1: error: the file has no tracks\n"
     "     1 | {\"rig\": \"\xc3\xa4rger\"}\n"
     "       | ^\n"
     "       = give \"tracks\": {\"name\": {\"state\": ..}}\n"
     "rig.json:1:1: error: the file has no sensors\n"
     "     1 | {\"rig\": \"\xc3\xa4rger\"}\n"
     "       | ^\n"
     "       = give \"sensors\": {\"name\": {\"reads\": .., \"u"
     "\": ..}}\n"},
    {"many at once",
     "{\"format\": 2, \"order\": {\"hold\": \"2 s\"},\n"
     " \"serve\": {\"http\": \"1\"}, \"wanted\": {},\n"
     " \"tracks\": {\"carriage\": {\"state\": [\n"
     "  {\"model\": \"constant-velocity\", \"name\": \"x\", \"un"
     "it\": \"m\",\n"
     "   \"q\": \"1 m2/s3\"}]}},\n"
     " \"sensors\": {\n"
     "  \"laser\": {\"reads\": \"y\", \"u\": \"2 mm\"},\n"
     "  \"frame\": {\"track\": \"cariage\", \"reads\": \"x\", \""
     "u\": 1},\n"
     "  \"wheel\": {\"reads\": {\"product\": [\"x\"]}, \"u\": 1,"
     " \"gate\": 2}}}\n",
     "rig.json:1:12: error: \"format\" must be 1\n"
     "     1 | {\"format\": 2, \"order\": {\"hold\": \"2 s\"},\n"
     "       |            ^\n"
     "       = no other is built\n"
     "rig.json:1:33: error: hold is longer than the horizon of 5"
     "00 ms\n"
     "     1 | {\"format\": 2, \"order\": {\"hold\": \"2 s\"},\n"
     "       |                                 ^\n"
     "       = make \"horizon\" at least as long\n"
     "rig.json:2:12: error: \"http\" is planned but not built ye"
     "t\n"
     "     2 |  \"serve\": {\"http\": \"1\"}, \"wanted\": {},\n"
     "       |            ^\n"
     "       = remove it\n"
     "rig.json:2:26: error: \"wanted\" is planned but not built "
     "yet\n"
     "     2 |  \"serve\": {\"http\": \"1\"}, \"wanted\": {},\n"
     "       |                          ^\n"
     "       = remove it\n"
     "rig.json:7:22: error: unknown state \"y\"\n"
     "     7 |   \"laser\": {\"reads\": \"y\", \"u\": \"2 mm\"},\n"
     "       |                      ^\n"
     "       = known here: x, x.rate\n"
     "rig.json:8:22: error: unknown track \"cariage\"\n"
     "     8 |   \"frame\": {\"track\": \"cariage\", \"reads\": "
     "\"x\", \"u\": 1},\n"
     "       |                      ^\n"
     "       = did you mean \"carriage\"?\n"
     "rig.json:9:58: error: \"gate\" must be a probability betwe"
     "en 0 and 1, or \"off\"\n"
     "     9 |   \"wheel\": {\"reads\": {\"product\": [\"x\"]}, "
     "\"u\": 1, \"gate\": 2}}}\n"
     "       |                                                  "
     "        ^\n"
     "       = 0.999 refuses 1 of 1000 sound measurements\n"}};

#endif
