/* SPDX-License-Identifier: Apache-2.0 */
#include "core/wire/writer.h"

#include <assert.h>
#include <math.h>
#include <string.h>

/* --- bytes -----------------------------------------------------------------
 */

void writer_init(struct writer *w, enum wire_form form, char *buf, size_t size)
{
    *w = (struct writer){.form = form, .buf = buf, .size = size};
}

void writer_init_inside(struct writer *w, char *buf, size_t size, bool is_first)
{
    writer_init(w, WIRE_JSON, buf, size);
    w->depth = 1;
    w->level[0] = (struct writer_level){.n = is_first ? 0 : 1, .is_map = true};
}

/* Room for n more bytes, or NULL from the first time that there is none. */
static char *room(struct writer *w, size_t n)
{
    if (w->is_full || w->size - w->used < n) {
        w->is_full = true;
        return NULL;
    }
    char *at = w->buf + w->used;
    w->used += n;
    return at;
}

static void put(struct writer *w, const char *bytes, size_t n)
{
    char *at = room(w, n);
    if (at != NULL)
        memcpy(at, bytes, n);
}

static void put_byte(struct writer *w, char byte)
{
    put(w, &byte, 1);
}

static void big_endian(char *at, uint64_t v, int n)
{
    for (int i = n - 1; i >= 0; i--, v >>= 8)
        at[i] = (char)(v & 0xff);
}

/* A MessagePack head: its code and n bytes of a number. */
static void put_head(struct writer *w, uint8_t code, uint64_t v, int n)
{
    char *at = room(w, (size_t)n + 1);
    if (at == NULL)
        return;
    at[0] = (char)code;
    big_endian(at + 1, v, n);
}

/* --- structure -------------------------------------------------------------
 */

static void begin_value(struct writer *w)
{
    if (w->is_after_key) {
        w->is_after_key = false;
        return;
    }
    if (w->depth == 0)
        return;
    struct writer_level *top = &w->level[w->depth - 1];
    if (top->n++ > 0 && w->form == WIRE_JSON)
        put_byte(w, ',');
}

static void open_level(struct writer *w, bool is_map)
{
    assert(w->depth < WRITER_DEPTH_MAX);
    begin_value(w);
    w->level[w->depth++] =
        (struct writer_level){.head = w->used, .is_map = is_map};
    if (w->form == WIRE_JSON)
        put_byte(w, is_map ? '{' : '[');
    else /* the number of elements follows in writer_close                */
        put_head(w, is_map ? 0xde : 0xdc, 0, 2);
}

void writer_open_map(struct writer *w)
{
    open_level(w, true);
}

void writer_open_array(struct writer *w)
{
    open_level(w, false);
}

void writer_close(struct writer *w)
{
    assert(w->depth > 0 && !w->is_after_key);
    const struct writer_level *top = &w->level[--w->depth];
    if (w->form == WIRE_JSON) {
        put_byte(w, top->is_map ? '}' : ']');
        return;
    }
    assert(top->n <= UINT16_MAX);
    if (!w->is_full)
        big_endian(w->buf + top->head + 1, top->n, 2);
}

size_t writer_length(const struct writer *w)
{
    return w->is_full ? 0 : w->used;
}

size_t writer_finish(struct writer *w)
{
    assert(w->depth == 0);
    if (w->form == WIRE_JSON)
        put_byte(w, '\n');
    return writer_length(w);
}

/* --- text ------------------------------------------------------------------
 */

/* Bytes of the valid UTF-8 character at s, 0 if there is none: neither
 * overlong nor a surrogate nor above U+10FFFF. */
static size_t character(const char *s, size_t len)
{
    const uint8_t *b = (const uint8_t *)s;
    if (b[0] < 0x80)
        return 1;
    size_t n = b[0] < 0xc2 ? 0 : b[0] < 0xe0 ? 2 : b[0] < 0xf0 ? 3 : 4;
    if (n == 0 || b[0] > 0xf4 || n > len)
        return 0;
    for (size_t i = 1; i < n; i++) {
        if ((b[i] & 0xc0) != 0x80)
            return 0;
    }
    if ((b[0] == 0xe0 && b[1] < 0xa0) || (b[0] == 0xed && b[1] > 0x9f) ||
        (b[0] == 0xf0 && b[1] < 0x90) || (b[0] == 0xf4 && b[1] > 0x8f))
        return 0;
    return n;
}

static bool is_plain(char c)
{
    return c >= 0x20 && c < 0x7f && c != '"' && c != '\\';
}

static void put_escape(struct writer *w, char c)
{
    static const char hex[] = "0123456789abcdef";
    if (c == '"' || c == '\\') {
        put(w, (char[]){'\\', c}, 2);
    } else if (c == '\n' || c == '\t' || c == '\r') {
        put(w, c == '\n' ? "\\n" : c == '\t' ? "\\t" : "\\r", 2);
    } else {
        char text[] = {'\\', 'u', '0', '0', hex[c >> 4 & 15], hex[c & 15]};
        put(w, text, sizeof text);
    }
}

/* The characters of s; bad bytes are replaced, JSON escapes added. */
static void put_characters(struct writer *w, const char *s, size_t len)
{
    while (len > 0) {
        size_t n = 0;
        while (n < len && is_plain(s[n]))
            n++;
        put(w, s, n);
        s += n;
        len -= n;
        if (len == 0)
            return;
        n = character(s, len);
        if (n == 0)
            put(w, "\xef\xbf\xbd", 3);
        else if (n == 1 && w->form == WIRE_JSON)
            put_escape(w, *s);
        else
            put(w, s, n);
        s += n > 0 ? n : 1;
        len -= n > 0 ? n : 1;
    }
}

static void put_text(struct writer *w, const char *s)
{
    size_t len = strlen(s);
    if (w->form == WIRE_JSON) {
        put_byte(w, '"');
        put_characters(w, s, len);
        put_byte(w, '"');
        return;
    }
    /* Replaced bytes make it longer: its length is known afterwards. */
    size_t head = w->used;
    if (len < 11)
        put_head(w, 0xa0, 0, 0);
    else
        put_head(w, 0xda, 0, 2);
    size_t begin = w->used;
    put_characters(w, s, len);
    if (w->is_full)
        return;
    size_t written = w->used - begin;
    if (begin - head == 1)
        w->buf[head] = (char)(0xa0 | written);
    else if (written <= UINT16_MAX)
        big_endian(w->buf + head + 1, written, 2);
    else
        w->is_full = true;
}

void writer_key(struct writer *w, const char *key)
{
    size_t len = strlen(key);
    assert(len < 32 && !w->is_after_key);
    begin_value(w);
    char *at = room(w, w->form == WIRE_JSON ? len + 3 : len + 1);
    w->is_after_key = true;
    if (at == NULL)
        return;
    *at++ = w->form == WIRE_JSON ? '"' : (char)(0xa0 | len);
    memcpy(at, key, len);
    if (w->form == WIRE_JSON)
        memcpy(at + len, "\":", 2);
}

void writer_name(struct writer *w, const char *name)
{
    assert(!w->is_after_key);
    begin_value(w);
    put_text(w, name);
    if (w->form == WIRE_JSON)
        put_byte(w, ':');
    w->is_after_key = true;
}

void writer_text(struct writer *w, const char *s)
{
    begin_value(w);
    put_text(w, s);
}

/* --- values ----------------------------------------------------------------
 */

void writer_null(struct writer *w)
{
    begin_value(w);
    if (w->form == WIRE_JSON)
        put(w, "null", 4);
    else
        put_byte(w, (char)0xc0);
}

void writer_bool(struct writer *w, bool b)
{
    begin_value(w);
    if (w->form == WIRE_JSON)
        put(w, b ? "true" : "false", b ? 4 : 5);
    else
        put_byte(w, (char)(b ? 0xc3 : 0xc2));
}

void writer_number(struct writer *w, double x)
{
    if (!isfinite(x)) {
        writer_null(w);
        return;
    }
    begin_value(w);
    if (w->form == WIRE_JSON) {
        char text[32];
        put(w, text, wire_print_number(x, text));
        return;
    }
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    put_head(w, 0xcb, bits, 8);
}

void writer_count(struct writer *w, uint64_t v)
{
    begin_value(w);
    if (w->form == WIRE_JSON) {
        char text[20], *at = text + sizeof text;
        do
            *--at = (char)('0' + v % 10);
        while ((v /= 10) > 0);
        put(w, at, (size_t)(text + sizeof text - at));
    } else if (v < 0x80) {
        put_byte(w, (char)v);
    } else if (v <= UINT8_MAX) {
        put_head(w, 0xcc, v, 1);
    } else if (v <= UINT16_MAX) {
        put_head(w, 0xcd, v, 2);
    } else if (v <= UINT32_MAX) {
        put_head(w, 0xce, v, 4);
    } else {
        put_head(w, 0xcf, v, 8);
    }
}

/* Timestamp 64 holds 34 bits of seconds since 1970, timestamp 96 any. */
static void put_timestamp(struct writer *w, int64_t t_ns)
{
    int64_t seconds = t_ns / 1000000000, ns = t_ns % 1000000000;
    if (ns < 0) {
        ns += 1000000000;
        seconds--;
    }
    char at[15] = {(char)0xc7, 12, -1};
    if (seconds >= 0) { /* int64 ns end far below 2^34 s                  */
        at[0] = (char)0xd7;
        at[1] = -1;
        big_endian(at + 2, (uint64_t)ns << 34 | (uint64_t)seconds, 8);
        put(w, at, 10);
        return;
    }
    big_endian(at + 3, (uint64_t)ns, 4);
    big_endian(at + 7, (uint64_t)seconds, 8);
    put(w, at, 15);
}

void writer_time(struct writer *w, int64_t t_ns)
{
    begin_value(w);
    if (w->form == WIRE_MSGPACK) {
        put_timestamp(w, t_ns);
        return;
    }
    char text[34] = "\"";
    size_t len = wire_print_time(t_ns, text + 1);
    text[len + 1] = '"';
    put(w, text, len + 2);
}
