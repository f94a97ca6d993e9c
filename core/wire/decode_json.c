/* JSON [RFC8259], strictly: no duplicate keys, no trailing garbage, no bad
 * UTF-8, no number that is not finite; integers exact. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/math/real.h"
#include "core/wire/decode_form.h"

struct cursor {
    const char *at, *start, *end;
    struct wire_decoder *d; /* for its scratch                             */
    int depth;              /* objects and lists around an element's values */
    const char *broken;     /* first reason, NULL while all is well        */
};

static const char no_key[] = "a key is no string: put it in double quotes";
static const char no_colon[] = "no colon behind a key: send \"key\": value";
static const char no_end[] =
    "no comma and no closing bracket or brace: the datagram was cut, or a "
    "comma is missing";

static bool fail(struct cursor *c, const char *reason)
{
    if (!c->broken)
        c->broken = reason;
    return false;
}

static char peek(struct cursor *c)
{
    while (c->at < c->end && (*c->at == ' ' || *c->at == '\t' ||
                              *c->at == '\n' || *c->at == '\r'))
        c->at++;
    return c->at < c->end ? *c->at : 0;
}

static bool expect(struct cursor *c, char wanted, const char *reason)
{
    if (peek(c) != wanted)
        return fail(c, reason);
    c->at++;
    return true;
}

/* --- strings
 * ------------------------------------------------------------------ */

static int hex4(const char *s)
{
    int v = 0;
    for (int i = 0; i < 4; i++) {
        char h = s[i];
        int digit = h >= '0' && h <= '9'   ? h - '0'
                    : h >= 'a' && h <= 'f' ? h - 'a' + 10
                    : h >= 'A' && h <= 'F' ? h - 'A' + 10
                                           : -1;
        if (digit < 0)
            return -1;
        v = v * 16 + digit;
    }
    return v;
}

/* The code of \uXXXX at c->at (behind the u), surrogate pairs joined. */
static bool unicode(struct cursor *c, uint32_t *code)
{
    int high = c->end - c->at >= 4 ? hex4(c->at) : -1;
    if (high < 0)
        return fail(c, "a \\u without four hexadecimal digits: send \\uXXXX");
    c->at += 4;
    *code = (uint32_t)high;
    if (high < 0xd800 || high > 0xdfff)
        return true;
    int low = c->end - c->at >= 6 && c->at[0] == '\\' && c->at[1] == 'u'
                  ? hex4(c->at + 2)
                  : -1;
    if (high > 0xdbff || low < 0xdc00 || low > 0xdfff)
        return fail(c, "half of a surrogate pair: send both halves, or UTF-8");
    c->at += 6;
    *code =
        0x10000 + ((uint32_t)(high - 0xd800) << 10) + (uint32_t)(low - 0xdc00);
    return true;
}

static bool escape(struct cursor *c, char *out, int *n)
{
    static const char from[] = "\"\\/bfnrt", to[] = "\"\\/\b\f\n\r\t";
    char letter = c->at < c->end ? *c->at++ : 0;
    const char *hit = letter ? strchr(from, letter) : NULL;
    uint32_t code;
    if (hit) {
        out[0] = to[hit - from];
        *n = 1;
        return true;
    }
    if (letter != 'u')
        return fail(c, "an escape that JSON does not know: send \\\\ for a "
                       "backslash");
    if (!unicode(c, &code))
        return false;
    *n = decode_put_utf8(out, code);
    return true;
}

/* Behind the quote, with escapes: resolved in the decoder's scratch, or only
 * checked when `text` is NULL. */
static bool escaped(struct cursor *c, struct text *text)
{
    struct wire_decoder *d = c->d;
    char unread[4], *out = text ? d->scratch + d->scratch_used : unread;
    int used = 0, room = text ? WIRE_SCRATCH_SIZE - d->scratch_used : 4;
    while (c->at < c->end && *c->at != '"') {
        int n = 1;
        if (used + 4 > room)
            return fail(c, "too much escaped text in one datagram: send UTF-8 "
                           "without escapes, or several datagrams");
        if ((uint8_t)*c->at < 0x20)
            return fail(c, "a control character stands bare in a string: "
                           "escape it");
        if (*c->at == '\\') {
            c->at++;
            if (!escape(c, out + used, &n))
                return false;
        } else {
            out[used] = *c->at++;
        }
        used += text ? n : 0;
    }
    if (c->at == c->end)
        return fail(c, "a string does not end: send its closing quote");
    if (text) {
        d->scratch_used += used;
        *text = (struct text){out, used};
    }
    return true;
}

/* Behind the quote; `text` may be NULL where nobody reads it. */
static bool string(struct cursor *c, struct text *text)
{
    const char *start = c->at;
    while (c->at < c->end && *c->at != '"' && *c->at != '\\' &&
           (uint8_t)*c->at >= 0x20)
        c->at++;
    if (c->at < c->end && *c->at == '"') {
        if (text)
            *text = (struct text){start, (int)(c->at - start)};
    } else {
        c->at = start;
        if (!escaped(c, text))
            return false;
    }
    size_t raw = (size_t)(c->at++ - start);
    return decode_is_utf8((const uint8_t *)start, raw) ||
           fail(c, "a string is not UTF-8: send text as UTF-8");
}

/* --- numbers
 * ------------------------------------------------------------------ */

static const char *digits(const char *s, const char *end)
{
    while (s < end && *s >= '0' && *s <= '9')
        s++;
    return s;
}

/* The end of a number in JSON's grammar, NULL if it is none. */
static const char *number_end(const char *s, const char *end, bool *is_whole)
{
    const char *from = s + (s < end && *s == '-');
    s = digits(from, end);
    *is_whole = true;
    if (s == from || (*from == '0' && s > from + 1))
        return NULL;
    if (s < end && *s == '.') {
        const char *part = digits(s + 1, end);
        if (part == s + 1)
            return NULL;
        *is_whole = false;
        s = part;
    }
    if (s < end && (*s == 'e' || *s == 'E')) {
        s++;
        s += s < end && (*s == '+' || *s == '-');
        const char *part = digits(s, end);
        if (part == s)
            return NULL;
        *is_whole = false;
        s = part;
    }
    return s;
}

/* Exact where 64 bits hold it; false otherwise. */
static bool whole(const char *s, const char *end, struct value *v)
{
    bool is_negative = *s == '-';
    s += is_negative;
    uint64_t n = 0;
    for (; s < end; s++) {
        uint64_t digit = (uint64_t)(*s - '0');
        if (n > (UINT64_MAX - digit) / 10)
            return false;
        n = n * 10 + digit;
    }
    if (is_negative && (n == 0 || n > INT64_MAX))
        return false;
    v->kind = n > INT64_MAX ? VALUE_UINT : VALUE_INT;
    v->u = n;
    v->i = is_negative ? -(int64_t)n : (int64_t)n;
    return true;
}

static bool number(struct cursor *c, struct value *v)
{
    bool is_whole;
    const char *end = number_end(c->at, c->end, &is_whole);
    if (!end)
        return fail(c, "a value that JSON does not know: send a number, a "
                       "string in quotes, true, false or null (null for NaN)");
    if (!is_whole || !whole(c->at, end, v)) {
        v->kind = VALUE_DOUBLE;
        if (!wire_parse_number(c->at, (size_t)(end - c->at), &v->d))
            return fail(
                c, "a number is too large for a double, or longer than 400 "
                   "characters: send fewer digits");
    }
    c->at = end;
    return true;
}

/* --- values
 * ------------------------------------------------------------------- */

static bool word(struct cursor *c, const char *text, enum value_kind kind,
                 struct value *v)
{
    size_t n = strlen(text);
    if ((size_t)(c->end - c->at) < n || memcmp(c->at, text, n) != 0)
        return fail(c,
                    "a word that JSON does not know: send true, false or null "
                    "(null for NaN)");
    c->at += n;
    v->kind = kind;
    return true;
}

static bool leaf(struct cursor *c, struct value *v)
{
    switch (peek(c)) {
    case '"':
        c->at++;
        v->kind = VALUE_TEXT;
        return string(c, &v->text);
    case 't':
        return word(c, "true", VALUE_BOOL, v);
    case 'f':
        return word(c, "false", VALUE_BOOL, v);
    case 'n':
        return word(c, "null", VALUE_NULL, v);
    case 0:
        return fail(c, "the JSON ends in the middle: send the whole datagram");
    default:
        return number(c, v);
    }
}

static bool skip(struct cursor *c, int depth);

/* A list or an object that nobody reads: behind its opening bracket, `depth`
 * others are open around it. */
static bool skip_inside(struct cursor *c, char close, int depth)
{
    if (depth >= WIRE_DEPTH_MAX)
        return fail(c, "nested deeper than 8 levels: send flat objects");
    if (peek(c) == close)
        return expect(c, close, "");
    do {
        if (close == '}' && !(expect(c, '"', no_key) && string(c, NULL) &&
                              expect(c, ':', no_colon)))
            return false;
        if (!skip(c, depth + 1))
            return false;
    } while (peek(c) == ',' && c->at++);
    return expect(c, close, no_end);
}

static bool skip(struct cursor *c, int depth)
{
    struct value v;
    char first = peek(c);
    if (first == '"') {
        c->at++;
        return string(c, NULL);
    }
    if (first != '{' && first != '[')
        return leaf(c, &v);
    c->at++;
    return skip_inside(c, first == '{' ? '}' : ']', depth);
}

/* Behind '[': numbers and nulls make a LIST, anything else makes it OTHER. */
static bool list(struct cursor *c, struct value *v)
{
    bool is_numbers = true;
    v->n = 0;
    v->kind = VALUE_LIST;
    if (peek(c) == ']')
        return expect(c, ']', "");
    do {
        struct value item;
        double x = 0;
        char first = peek(c);
        if (first == '{' || first == '[' || first == '"') {
            is_numbers = false;
            if (!skip(c, c->depth + 1))
                return false;
        } else if (!leaf(c, &item)) {
            return false;
        } else {
            is_numbers = is_numbers && value_number(&item, &x);
        }
        if (v->n < READS_MAX)
            v->list[v->n] = x;
        v->n += v->n < 255;
    } while (peek(c) == ',' && c->at++);
    if (!is_numbers)
        v->kind = VALUE_OTHER;
    return expect(c, ']', no_end);
}

static bool value(struct cursor *c, struct value *v)
{
    switch (peek(c)) {
    case '[':
        c->at++;
        return list(c, v);
    case '{':
        c->at++;
        v->kind = VALUE_OTHER;
        return skip_inside(c, '}', c->depth);
    default:
        return leaf(c, v);
    }
}

/* A key and its value, of which only the known ones are kept. */
static bool member(struct cursor *c, struct element *e)
{
    struct text key;
    struct value v;
    int used = c->d->scratch_used;
    peek(c);
    e->here = (int)(c->at - c->start);
    if (!expect(c, '"', no_key) || !string(c, &key) ||
        !expect(c, ':', no_colon))
        return false;
    enum element_key k = element_key(key.at, (size_t)key.len);
    if (k == ELEMENT_OTHER) {
        c->d->scratch_used = used;
        return skip(c, c->depth);
    }
    if (!value(c, &v))
        return false;
    element_set(e, k, &v);
    return true;
}

/* Behind '{'. */
static bool object(struct cursor *c, struct element *e)
{
    if (peek(c) == '}')
        return expect(c, '}', "");
    do {
        if (!member(c, e))
            return false;
    } while (peek(c) == ',' && c->at++);
    return expect(c, '}', no_end);
}

static bool element(struct cursor *c, bool *is_wrong_version)
{
    struct element e;
    bool is_object = peek(c) == '{';
    decode_begin(c->d, &e);
    e.here = (int)(c->at - c->start);
    if (is_object)
        c->at++;
    else
        element_wrong(&e, "an element of the list is no object: send objects");
    if (is_object ? !object(c, &e) : !skip(c, 1))
        return false;
    decode_take(c->d, &e, is_wrong_version);
    return true;
}

static bool elements(struct cursor *c, bool *is_wrong_version)
{
    c->depth = 1;
    if (peek(c) == '{')
        return element(c, is_wrong_version);
    if (!expect(c, '[',
                "neither JSON nor MessagePack: send an object or a "
                "list of objects"))
        return false;
    c->depth = 2;
    if (peek(c) == ']')
        return expect(c, ']', "");
    do {
        if (!element(c, is_wrong_version))
            return false;
    } while (peek(c) == ',' && c->at++);
    return expect(c, ']', no_end);
}

const char *decode_json(struct wire_decoder *d, const uint8_t *bytes,
                        size_t len, bool *is_wrong_version)
{
    const char *text = (const char *)bytes;
    struct cursor c = {.at = text, .start = text, .end = text + len, .d = d};
    if (elements(&c, is_wrong_version) && (peek(&c), c.at < c.end))
        fail(&c, "more text behind the end: send one object or one list");
    if (c.broken)
        d->at = (int)(c.at - text);
    return c.broken;
}
