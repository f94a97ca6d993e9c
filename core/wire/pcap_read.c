/* pcap_read.c - the reading half: nothing in a file is believed. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/pcap_layout.h"

/* Bytes not yet read. */
struct view {
    const uint8_t *at;
    size_t len;
};

/* --- file and record head --------------------------------------------------
 */

static uint32_t get_be16(const uint8_t *b)
{
    return (uint32_t)b[0] << 8 | b[1];
}

static uint32_t get_32(const uint8_t *b, bool is_big_endian)
{
    if (is_big_endian)
        return get_be16(b) << 16 | get_be16(b + 2);
    return (uint32_t)b[0] | (uint32_t)b[1] << 8 | (uint32_t)b[2] << 16 |
           (uint32_t)b[3] << 24;
}

bool pcap_read_file_head(const uint8_t *bytes, size_t len,
                         struct pcap_form *form)
{
    if (len < PCAP_FILE_HEAD_SIZE)
        return false;
    for (int i = 0; i < 2; i++) {
        uint32_t magic = get_32(bytes, i == 1);
        if (magic != PCAP_MAGIC_NS && magic != PCAP_MAGIC_US)
            continue;
        form->is_swapped = i == 1;
        form->is_micro = magic == PCAP_MAGIC_US;
        /* The upper bits tell of a frame check sequence, not the type. */
        form->linktype = get_32(bytes + 20, i == 1) & 0xffff;
        return true;
    }
    return false;
}

/* The packet of the record at `bytes`; false if the bytes end in it or its
 * numbers make no sense.  A packet has at least one byte, so that a tail of
 * zeros, as a power cut leaves it, is no row of empty records. */
static bool read_head(const struct pcap_form *form, const uint8_t *bytes,
                      size_t len, struct pcap_record *r, struct view *packet,
                      bool *is_cut)
{
    if (len < RECORD_HEAD_SIZE)
        return false;
    uint32_t seconds = get_32(bytes, form->is_swapped);
    uint32_t part = get_32(bytes + 4, form->is_swapped);
    uint32_t here = get_32(bytes + 8, form->is_swapped);
    uint32_t on_wire = get_32(bytes + 12, form->is_swapped);
    if (part >= (form->is_micro ? 1000000u : 1000000000u) || here == 0 ||
        here > PCAP_SNAPLEN || on_wire < here || here > len - RECORD_HEAD_SIZE)
        return false;
    r->a_ns = (int64_t)seconds * 1000000000 +
              (int64_t)part * (form->is_micro ? 1000 : 1);
    *packet = (struct view){bytes + RECORD_HEAD_SIZE, here};
    *is_cut = on_wire > here;
    return true;
}

/* --- IP and UDP ------------------------------------------------------------
 */

/* Narrows *v to what the IPv4 header says that it carries. */
static bool read_ipv4(struct view *v, struct pcap_record *r)
{
    const uint8_t *ip = v->at;
    if (v->len < IPV4_HEAD_SIZE)
        return false;
    size_t head = 4 * (size_t)(ip[0] & 15), total = get_be16(ip + 2);
    bool is_fragment = (get_be16(ip + 6) & 0x3fff) != 0; /* more, offset  */
    if (head < IPV4_HEAD_SIZE || total < head || total > v->len ||
        is_fragment || ip[9] != IP_UDP)
        return false;
    r->from.family = r->to.family = 4;
    memcpy(r->from.address, ip + 12, 4);
    memcpy(r->to.address, ip + 16, 4);
    *v = (struct view){ip + head, total - head};
    return true;
}

/* True for extension headers that may stand before a whole datagram:
 * hop-by-hop, routing, destination options (RFC 8200). */
static bool is_option(uint8_t next)
{
    return next == 0 || next == 43 || next == 60;
}

static bool read_ipv6(struct view *v, struct pcap_record *r)
{
    const uint8_t *ip = v->at;
    if (v->len < IPV6_HEAD_SIZE || get_be16(ip + 4) > v->len - IPV6_HEAD_SIZE)
        return false;
    uint8_t next = ip[6];
    *v = (struct view){ip + IPV6_HEAD_SIZE, get_be16(ip + 4)};
    while (is_option(next)) {
        if (v->len < 8)
            return false;
        size_t size = 8 * (size_t)v->at[1] + 8;
        if (size > v->len)
            return false;
        next = v->at[0];
        *v = (struct view){v->at + size, v->len - size};
    }
    if (next != IP_UDP) /* a fragment's header ends here, too             */
        return false;
    r->from.family = r->to.family = 6;
    memcpy(r->from.address, ip + 8, 16);
    memcpy(r->to.address, ip + 24, 16);
    return true;
}

static bool read_udp(const struct view *v, struct pcap_record *r)
{
    const uint8_t *udp = v->at;
    if (v->len < UDP_HEAD_SIZE)
        return false;
    size_t udp_len = get_be16(udp + 4);
    if (udp_len < UDP_HEAD_SIZE || udp_len > v->len)
        return false;
    r->from.port = (uint16_t)get_be16(udp);
    r->to.port = (uint16_t)get_be16(udp + 2);
    r->payload = udp + UDP_HEAD_SIZE;
    r->len = udp_len - UDP_HEAD_SIZE;
    return true;
}

static bool read_datagram(struct view packet, struct pcap_record *r)
{
    switch (packet.at[0] >> 4) {
    case 4:
        return read_ipv4(&packet, r) && read_udp(&packet, r);
    case 6:
        return read_ipv6(&packet, r) && read_udp(&packet, r);
    }
    return false;
}

/* --- control records -------------------------------------------------------
 */

/* Takes `word` from the front of *v, if it stands there. */
static bool take(struct view *v, const char *word)
{
    size_t len = strlen(word);
    if (v->len < len || memcmp(v->at, word, len) != 0)
        return false;
    *v = (struct view){v->at + len, v->len - len};
    return true;
}

/* Text up to its closing quote, which is taken as well; escapes stay. */
static bool take_text(struct view *v, struct text *text)
{
    size_t n = 0;
    while (n < v->len && v->at[n] != '"')
        n += v->at[n] == '\\' ? 2 : 1;
    if (n >= v->len)
        return false;
    *text = (struct text){(const char *)v->at, (int)n};
    *v = (struct view){v->at + n + 1, v->len - n - 1};
    return true;
}

/* Digits up to a closing quote. */
static bool take_digits(struct view *v, uint64_t *value)
{
    struct text text;
    if (!take_text(v, &text) || text.len == 0)
        return false;
    *value = 0;
    for (int i = 0; i < text.len; i++) {
        char c = text.at[i];
        if (c < '0' || c > '9' || __builtin_mul_overflow(*value, 10u, value) ||
            __builtin_add_overflow(*value, (uint64_t)(c - '0'), value))
            return false;
    }
    return true;
}

static bool take_line(struct view *v, int64_t *line_ns)
{
    bool is_negative = take(v, "-");
    uint64_t value;
    if (!take_digits(v, &value) || value > (uint64_t)INT64_MAX + is_negative)
        return false;
    *line_ns = (int64_t)(is_negative ? -value : value);
    return true;
}

static enum control_kind kind_of(const struct text *name)
{
    for (int i = CONTROL_START; i <= CONTROL_STOP; i++) {
        const char *word = pcap_control_text((enum control_kind)i);
        if (strlen(word) == (size_t)name->len &&
            memcmp(word, name->at, (size_t)name->len) == 0)
            return (enum control_kind)i;
    }
    return CONTROL_NONE;
}

/* The body exactly as pcap_write_control writes it. */
static bool read_control(struct pcap_record *r)
{
    struct view v = {r->payload, r->len};
    struct text name;
    if (!take(&v, "{\"ropewalk\":\"") || !take_text(&v, &name) ||
        !take(&v, ",\"line\":\"") || !take_line(&v, &r->line_ns))
        return false;
    r->control = kind_of(&name);
    if (r->control == CONTROL_NONE)
        return false;
    if (pcap_control_has_rig(r->control)) {
        if (!take(&v, ",\"engine\":\"") || !take_digits(&v, &r->n) ||
            !take(&v, ",\"build\":\"") || !take_text(&v, &r->build) ||
            !take(&v, ",\"rig\":\"") || !take_text(&v, &r->rig))
            return false;
    } else if (!take(&v, ",\"n\":\"") || !take_digits(&v, &r->n) ||
               !take(&v, ",\"text\":\"") || !take_text(&v, &r->text)) {
        return false;
    }
    return take(&v, "}") && v.len == 0;
}

/* 0.0.0.0:0 sends to itself: impossible on a wire. */
static bool is_from_nobody(const struct pcap_record *r)
{
    static const uint8_t zero[4];
    return r->from.family == 4 && r->from.port == 0 && r->to.port == 0 &&
           memcmp(r->from.address, zero, sizeof zero) == 0 &&
           memcmp(r->to.address, zero, sizeof zero) == 0;
}

enum pcap_result pcap_read_record(const struct pcap_form *form,
                                  const uint8_t *bytes, size_t len,
                                  struct pcap_record *r, size_t *used)
{
    struct view packet;
    bool is_cut;
    *r = (struct pcap_record){0};
    if (!read_head(form, bytes, len, r, &packet, &is_cut))
        return PCAP_TORN;
    *used = RECORD_HEAD_SIZE + packet.len;
    if (form->linktype != PCAP_LINKTYPE_RAW || is_cut ||
        !read_datagram(packet, r))
        return PCAP_SKIP;
    if (is_from_nobody(r) && !read_control(r))
        return PCAP_SKIP;
    return PCAP_RECORD;
}
