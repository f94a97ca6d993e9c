/* pcap.c - the writing half; pcap_read.c reads. */
/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/pcap.h"

#include <string.h>

#include "core/wire/pcap_layout.h"
#include "core/wire/writer.h"

const char *pcap_control_text(enum control_kind kind)
{
    switch (kind) {
    case CONTROL_NONE:
        return "";
    case CONTROL_START:
        return "start";
    case CONTROL_TIME:
        return "time";
    case CONTROL_DROPS:
        return "drops";
    case CONTROL_GAP:
        return "gap";
    case CONTROL_REANCHOR:
        return "reanchor";
    case CONTROL_RELOAD:
        return "reload";
    case CONTROL_RESUME:
        return "resume";
    case CONTROL_STOP:
        return "stop";
    }
    return "";
}

/* --- bytes -----------------------------------------------------------------
 */

static uint8_t *put_le16(uint8_t *at, uint32_t v)
{
    at[0] = (uint8_t)v;
    at[1] = (uint8_t)(v >> 8);
    return at + 2;
}

static uint8_t *put_le32(uint8_t *at, uint32_t v)
{
    return put_le16(put_le16(at, v & 0xffff), v >> 16);
}

static uint8_t *put_be16(uint8_t *at, uint32_t v)
{
    at[0] = (uint8_t)(v >> 8);
    at[1] = (uint8_t)v;
    return at + 2;
}

/* One's complement sum of 16-bit words, an odd last byte padded with 0
 * (RFC 1071), not yet folded. */
static uint64_t add_words(uint64_t sum, const uint8_t *bytes, size_t len)
{
    for (; len > 1; bytes += 2, len -= 2)
        sum += (uint64_t)bytes[0] << 8 | bytes[1];
    return len == 1 ? sum + ((uint64_t)bytes[0] << 8) : sum;
}

static uint32_t checksum(uint64_t sum)
{
    while (sum >> 16 != 0)
        sum = (sum & 0xffff) + (sum >> 16);
    return (uint32_t)sum ^ 0xffff;
}

/* --- heads -----------------------------------------------------------------
 */

void pcap_write_file_head(uint8_t out[PCAP_FILE_HEAD_SIZE])
{
    uint8_t *at = put_le32(out, PCAP_MAGIC_NS);
    at = put_le16(at, 2); /* version 2.4                                  */
    at = put_le16(at, 4);
    at = put_le32(at, 0); /* time zone                                    */
    at = put_le32(at, 0); /* accuracy of stamps                           */
    at = put_le32(at, PCAP_SNAPLEN);
    put_le32(at, PCAP_LINKTYPE_RAW);
}

static uint8_t *put_record(uint8_t *at, int64_t a_ns, size_t packet_len)
{
    const int64_t last_ns = UINT32_MAX * INT64_C(1000000000) + 999999999;
    if (a_ns < 0)
        a_ns = 0;
    if (a_ns > last_ns)
        a_ns = last_ns;
    at = put_le32(at, (uint32_t)(a_ns / 1000000000));
    at = put_le32(at, (uint32_t)(a_ns % 1000000000));
    at = put_le32(at, (uint32_t)packet_len);   /* bytes here                */
    return put_le32(at, (uint32_t)packet_len); /* bytes on the wire       */
}

/* RFC 791; identification 0 with "do not fragment" (RFC 6864). */
static uint8_t *put_ipv4(uint8_t *ip, const struct sender *from,
                         const uint8_t *to, size_t udp_len)
{
    memset(ip, 0, IPV4_HEAD_SIZE);
    ip[0] = 0x45; /* version 4, 5 words                                   */
    put_be16(ip + 2, (uint32_t)(IPV4_HEAD_SIZE + udp_len));
    put_be16(ip + 6, 0x4000);
    ip[8] = 64; /* time to live                                           */
    ip[9] = IP_UDP;
    memcpy(ip + 12, from->address, 4);
    memcpy(ip + 16, to, 4);
    put_be16(ip + 10, checksum(add_words(0, ip, IPV4_HEAD_SIZE)));
    return ip + IPV4_HEAD_SIZE;
}

/* RFC 8200. */
static uint8_t *put_ipv6(uint8_t *ip, const struct sender *from,
                         const uint8_t *to, size_t udp_len)
{
    memset(ip, 0, IPV6_HEAD_SIZE);
    ip[0] = 0x60; /* version 6                                            */
    put_be16(ip + 4, (uint32_t)udp_len);
    ip[6] = IP_UDP;
    ip[7] = 64; /* hop limit                                              */
    memcpy(ip + 8, from->address, 16);
    memcpy(ip + 24, to, 16);
    return ip + IPV6_HEAD_SIZE;
}

/* RFC 8200 section 8.1: both addresses, length, 17, then the datagram; a
 * sum of 0 is sent as 0xffff. */
static uint32_t udp6_checksum(const uint8_t *ip, const uint8_t *udp,
                              const uint8_t *payload, size_t len)
{
    uint64_t sum = add_words(0, ip + 8, 32);
    sum += UDP_HEAD_SIZE + len + IP_UDP;
    sum = add_words(sum, udp, UDP_HEAD_SIZE);
    uint32_t c = checksum(add_words(sum, payload, len));
    return c == 0 ? 0xffff : c;
}

size_t pcap_write_record_head(uint8_t out[PCAP_RECORD_HEAD_MAX], int64_t a_ns,
                              const struct sender *from,
                              const struct sender *to, const uint8_t *payload,
                              size_t len)
{
    static const uint8_t unspecified[16];
    const uint8_t *our = to->family == from->family ? to->address : unspecified;
    bool is_6 = from->family == 6;
    size_t ip_size = is_6 ? IPV6_HEAD_SIZE : IPV4_HEAD_SIZE;
    size_t udp_len = UDP_HEAD_SIZE + len;
    if (len > UINT16_MAX || udp_len + (is_6 ? 0 : ip_size) > UINT16_MAX)
        return 0;

    uint8_t *ip = put_record(out, a_ns, ip_size + udp_len);
    uint8_t *udp = is_6 ? put_ipv6(ip, from, our, udp_len)
                        : put_ipv4(ip, from, our, udp_len);
    uint8_t *at = put_be16(udp, from->port);
    at = put_be16(at, to->port);
    at = put_be16(at, (uint32_t)udp_len);
    put_be16(at, 0);
    if (is_6)
        put_be16(at, udp6_checksum(ip, udp, payload, len));
    return (size_t)(at + 2 - out);
}

/* --- control records -------------------------------------------------------
 */

/* An integer as text: JSON readers lose digits beyond 2^53. */
static void write_digits(struct writer *w, const char *key, uint64_t v,
                         bool is_negative)
{
    char text[24], *at = text + sizeof text;
    *--at = '\0';
    do
        *--at = (char)('0' + v % 10);
    while ((v /= 10) > 0);
    if (is_negative)
        *--at = '-';
    writer_key(w, key);
    writer_text(w, at);
}

static void write_build_and_rig(struct writer *w, const char *text)
{
    const char *blank = strrchr(text, ' ');
    size_t len = blank != NULL ? (size_t)(blank - text) : strlen(text);
    char build[PCAP_BUILD_SIZE];
    if (len >= sizeof build)
        len = sizeof build - 1;
    memcpy(build, text, len);
    build[len] = '\0';
    writer_key(w, "build");
    writer_text(w, build);
    writer_key(w, "rig");
    writer_text(w, blank != NULL ? blank + 1 : "");
}

/* The body without the line's end; 0 if it does not fit. */
static size_t write_body(uint8_t *out, size_t size, enum control_kind kind,
                         int64_t line_ns, uint64_t n, const char *text)
{
    struct writer w;
    uint64_t line = (uint64_t)line_ns;
    writer_init(&w, WIRE_JSON, (char *)out, size);
    writer_open_map(&w);
    writer_key(&w, "ropewalk");
    writer_text(&w, pcap_control_text(kind));
    write_digits(&w, "line", line_ns < 0 ? -line : line, line_ns < 0);
    if (pcap_control_has_rig(kind)) {
        write_digits(&w, "engine", n, false);
        write_build_and_rig(&w, text);
    } else {
        write_digits(&w, "n", n, false);
        writer_key(&w, "text");
        writer_text(&w, text);
    }
    writer_close(&w);
    return writer_length(&w);
}

size_t pcap_write_control(uint8_t *out, size_t size, enum control_kind kind,
                          int64_t line_ns, uint64_t n, const char *text)
{
    const size_t head_size = 16 + IPV4_HEAD_SIZE + UDP_HEAD_SIZE;
    const struct sender nobody = {.family = 4};
    if (size < head_size)
        return 0;
    uint8_t *body = out + head_size;
    size_t len = write_body(body, size - head_size, kind, line_ns, n,
                            text != NULL ? text : "");
    uint8_t head[PCAP_RECORD_HEAD_MAX];
    if (len == 0 ||
        pcap_write_record_head(head, line_ns, &nobody, &nobody, body, len) == 0)
        return 0;
    memcpy(out, head, head_size);
    return head_size + len;
}
