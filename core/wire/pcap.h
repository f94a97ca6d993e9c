/* pcap.h - the capture's bytes: ns pcap, LINKTYPE_RAW, one UDP datagram each.
 *
 * Memory in, memory out; files are daemon/capture.h's business.  Every network
 * analyser opens what is written here.  Control records are UDP from
 * 0.0.0.0:0 to 0.0.0.0:0, impossible on a wire, with a JSON body:
 *   {"ropewalk":"start","line":"<ns>","engine":"1","build":"..","rig":"<sha>"}
 *   {"ropewalk":"drops","line":"<ns>","n":"<count>","text":".."}
 *   kinds: start, time, drops, gap, reanchor, reload, resume, stop; start,
 *   reload and resume are written like the first, the others like the second.
 * Files are written little-endian, so the same run gives the same bytes.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_PCAP_H
#define CORE_WIRE_PCAP_H

#include <stddef.h>

#include "core/model/message.h"

enum {
    PCAP_FILE_HEAD_SIZE = 24,
    PCAP_RECORD_HEAD_MAX = 16 + 40 + 8, /* record, IPv6, UDP              */
    PCAP_LINKTYPE_RAW = 101,
    PCAP_RECORD_USUAL = 140, /* heads and a usual datagram               */
    PCAP_SNAPLEN = 262144
};

enum control_kind {
    CONTROL_NONE, /* a datagram from the wire */
    CONTROL_START,
    CONTROL_TIME,
    CONTROL_DROPS,
    CONTROL_GAP,
    CONTROL_REANCHOR,
    CONTROL_RELOAD,
    CONTROL_RESUME,
    CONTROL_STOP
};

const char *pcap_control_text(enum control_kind kind);

/* The 24 bytes that begin a file. */
void pcap_write_file_head(uint8_t out[PCAP_FILE_HEAD_SIZE]);

/* The bytes before a payload of len bytes; returns how many (44 for IPv4, 64
 * for IPv6), or 0 if no datagram of that family is so long.  `to` is our own
 * address; one of another family than `from` counts as the unspecified one.
 * UDP checksums are computed for IPv6 and 0 for IPv4.  Stamps outside
 * 1970..2106, the range of the format, are clamped. */
size_t pcap_write_record_head(uint8_t out[PCAP_RECORD_HEAD_MAX], int64_t a_ns,
                              const struct sender *from,
                              const struct sender *to, const uint8_t *payload,
                              size_t len);

/* A whole control record, head and body; 0 if it does not fit.  `line_ns`
 * is the arrival line.  start, reload, resume: n is the engine number, text
 * "BUILD SHA", the build and the rig file's hash with one blank between.
 * Others: n is a count, text a sentence; NULL is "". */
size_t pcap_write_control(uint8_t *out, size_t size, enum control_kind kind,
                          int64_t line_ns, uint64_t n, const char *text);

/* How a file is read: byte order and unit of its stamps, link type. */
struct pcap_form {
    bool is_swapped, is_micro;
    uint32_t linktype;
};

/* False when these are not the first bytes of a pcap file. */
bool pcap_read_file_head(const uint8_t *bytes, size_t len,
                         struct pcap_form *form);

struct pcap_record {
    int64_t a_ns;
    enum control_kind control;
    struct sender from, to;
    const uint8_t *payload;
    size_t len;
    int64_t line_ns; /* control records, as they were written       */
    uint64_t n;
    struct text build, rig, text; /* still with JSON escapes, in payload  */
};

enum pcap_result {
    PCAP_RECORD, /* *r is filled                                */
    PCAP_SKIP,   /* a whole record, but no UDP datagram of ours:
                    another protocol, a fragment, truncated     */
    PCAP_TORN    /* the bytes end, or make no sense, here       */
};

/* Reads the record at `bytes`; *used = its size unless PCAP_TORN.  Only
 * LINKTYPE_RAW is understood here.  Checksums are not judged: a sender's own
 * capture often stands before the network card filled them in. */
enum pcap_result pcap_read_record(const struct pcap_form *form,
                                  const uint8_t *bytes, size_t len,
                                  struct pcap_record *r, size_t *used);

#endif
