/* pcap_layout.h - what pcap.c and pcap_read.c agree on. */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_WIRE_PCAP_LAYOUT_H
#define CORE_WIRE_PCAP_LAYOUT_H

#include "core/wire/pcap.h"

#define PCAP_MAGIC_US 0xa1b2c3d4u
#define PCAP_MAGIC_NS 0xa1b23c4du

enum {
    RECORD_HEAD_SIZE = 16,
    IPV4_HEAD_SIZE = 20,
    IPV6_HEAD_SIZE = 40,
    UDP_HEAD_SIZE = 8,
    IP_UDP = 17,
    PCAP_BUILD_SIZE = 200 /* a longer build is cut                        */
};

/* These kinds tell engine, build and rig; the others n and text. */
static inline bool pcap_control_has_rig(enum control_kind kind)
{
    return kind == CONTROL_START || kind == CONTROL_RELOAD ||
           kind == CONTROL_RESUME;
}

#endif
