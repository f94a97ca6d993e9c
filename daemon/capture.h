/* capture.h - reads captures: one pcap file, or a folder of segments in order.
 *
 * Files are read by the buffer, records in place.  A torn tail is normal after
 * a crash: every whole record is given, the rest is stated in bytes.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef DAEMON_CAPTURE_H
#define DAEMON_CAPTURE_H

#include "config/err.h"
#include "core/wire/pcap.h"

struct capture;

/* A file, or a folder: its *.pcap files in order of their names. */
status capture_open(struct capture **c, const char *path,
                    struct err *err) MUST_USE;
void capture_close(struct capture *c);

/* What a file is, by its first bytes. */
enum capture_look {
    CAPTURE_NONE,    /* no capture                                        */
    CAPTURE_FOREIGN, /* of another program, a rehearsal or an import      */
    CAPTURE_OURS     /* begins with a control record: ropewalkd made it   */
};
enum capture_look capture_look(const char *path);

/* The next datagram or control record; false at the end.  The payload lives
 * until the next call. */
bool capture_next(struct capture *c, struct pcap_record *record);

/* What was met so far. */
struct capture_tally {
    uint64_t n_records;  /* given                                        */
    uint64_t n_skipped;  /* whole records that hold no UDP datagram      */
    uint64_t torn_bytes; /* behind the last whole record of its file     */
    uint64_t n_files, n_bytes;
};

const struct capture_tally *capture_tally(const struct capture *c);

#endif
