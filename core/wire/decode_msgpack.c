/* MessagePack through msgpack-c's parser template with callbacks of our own.
 *
 * The template keeps a stack of fixed size and every step of it eats bytes;
 * the callbacks reserve nothing for what a length claims.  So ten bytes cannot
 * ask for gigabytes, and time is linear in the datagram. */
/* SPDX-License-Identifier: Apache-2.0 */
#include <string.h>

#include "core/wire/decode_form.h"

enum role {
    ROLE_SKIPPED,  /* a list or map that nobody reads                      */
    ROLE_ELEMENTS, /* the outer list                                       */
    ROLE_ELEMENT,  /* a map: one measurement                               */
    ROLE_NUMBERS   /* a list that is the value of an element's key         */
};

/* What the template carries for a value, or for a list or map in work. */
struct item {
    uint8_t kind;   /* enum value_kind                                     */
    uint8_t role;   /* enum role of a list or map                          */
    bool is_nested; /* it is a list or map                                 */
    uint32_t n;     /* bytes of a text, children of a list or map          */
    union {
        int64_t i;
        uint64_t u;
        double d;
        const char *at;
        uint64_t left; /* children still to come                           */
    };
};

struct builder {
    struct wire_decoder *d;
    bool *is_wrong_version;
    const char *bytes;
    size_t len;
    int depth;    /* lists and maps that are open                       */
    bool is_list; /* the outermost is a list                            */
    const char *broken;
    struct element e;
    struct value v; /* of the key in work; holds its list                 */
};

static const char truncated[] =
    "the MessagePack ends in the middle: send the whole datagram, and lengths "
    "that are true";

static int fail(struct builder *b, const char *reason)
{
    if (!b->broken)
        b->broken = reason;
    return -1;
}

/* --- single values -------------------------------------------------------- */

static int pull_int(int64_t i, struct item *o)
{
    *o = (struct item){.kind = VALUE_INT, .i = i};
    return 0;
}

static int pull_uint64(uint64_t u, struct item *o)
{
    *o = (struct item){.kind = u > INT64_MAX ? VALUE_UINT : VALUE_INT, .u = u};
    return 0;
}

static int pull_real(enum value_kind kind, double x, struct item *o)
{
    *o = (struct item){.kind = (uint8_t)kind, .d = x};
    return 0;
}

static int pull_word(enum value_kind kind, struct item *o)
{
    *o = (struct item){.kind = (uint8_t)kind};
    return 0;
}

static int pull_str(struct builder *b, const char *at, uint32_t n,
                    struct item *o)
{
    if (n == 0)
        at = b->bytes; /* the template's pointer may be stale */
    *o = (struct item){.kind = VALUE_TEXT, .n = n, .at = at};
    return decode_is_utf8((const uint8_t *)at, n)
               ? 0
               : fail(b, "a string is not UTF-8: send text as UTF-8");
}

static uint64_t big_endian(const uint8_t *p, int n)
{
    uint64_t v = 0;
    for (int i = 0; i < n; i++)
        v = v << 8 | p[i];
    return v;
}

/* Type byte and payload, n bytes in all.  Timestamps are type -1 in three
 * sizes; every other extension is a value that no key takes. */
static int pull_ext(struct builder *b, const uint8_t *p, uint32_t n,
                    struct item *o)
{
    uint64_t ns = 0;
    int64_t s = 0;
    *o = (struct item){.kind = VALUE_OTHER};
    if (n == 0) /* the template adds 1 to a 32-bit length */
        return fail(b, truncated);
    if (p[0] != 0xff)
        return 0;
    if (n == 5) {
        s = (int64_t)big_endian(p + 1, 4);
    } else if (n == 9) {
        uint64_t both = big_endian(p + 1, 8);
        ns = both >> 34;
        s = (int64_t)(both & 0x3ffffffff);
    } else if (n == 13) {
        ns = big_endian(p + 1, 4);
        s = (int64_t)big_endian(p + 5, 8);
    } else {
        return 0;
    }
    if (ns > 999999999 || s > 9000000000 || s < -9000000000)
        return 0;
    *o = (struct item){.kind = VALUE_TIME, .i = s * 1000000000 + (int64_t)ns};
    return 0;
}

/* --- lists and maps ------------------------------------------------------- */

static enum role role_of(struct builder *b, bool is_map)
{
    int element = b->is_list ? 1 : 0; /* depth at which elements open */
    if (is_map)
        return b->depth == element ? ROLE_ELEMENT : ROLE_SKIPPED;
    if (b->depth == 0)
        return ROLE_ELEMENTS;
    return b->depth == element + 1 ? ROLE_NUMBERS : ROLE_SKIPPED;
}

/* The template counts n children down by itself; `left` tells us the end. */
static int pull_open(struct builder *b, uint32_t n, bool is_map, struct item *o)
{
    if (b->depth == 0)
        b->is_list = !is_map;
    enum role role = role_of(b, is_map);
    if (n > b->len)
        return fail(b, truncated);
    *o = (struct item){.kind = VALUE_OTHER,
                       .role = (uint8_t)role,
                       .is_nested = true,
                       .n = n,
                       .left = n};
    if (role == ROLE_ELEMENT)
        decode_begin(b->d, &b->e);
    if (role == ROLE_NUMBERS) {
        o->kind = VALUE_LIST;
        b->v.n = n < 255 ? (int)n : 255;
    }
    b->depth += n > 0;
    return 0;
}

static void one_less(struct builder *b, struct item *o)
{
    b->depth -= --o->left == 0;
}

/* The value of an element's key, in the form that both encodings share. */
static void give(struct builder *b, const struct item *o)
{
    b->v.kind = (enum value_kind)o->kind;
    b->v.i = o->i; /* the same bits in three readings */
    b->v.u = o->u;
    b->v.d = o->d;
    b->v.text = (struct text){o->at, (int)o->n};
}

static int pull_map_item(struct builder *b, struct item *map,
                         const struct item *key, const struct item *o)
{
    one_less(b, map);
    if (map->role != ROLE_ELEMENT)
        return 0;
    if (key->is_nested)
        return fail(b, "a key of a map is a list or a map: send strings");
    if (key->kind != VALUE_TEXT)
        return 0;
    give(b, o);
    b->e.here = (int)(key->at - b->bytes);
    element_set(&b->e, element_key(key->at, key->n), &b->v);
    return 0;
}

static int pull_list_item(struct builder *b, struct item *list,
                          const struct item *o)
{
    uint64_t i = list->n - list->left;
    one_less(b, list);
    if (list->role == ROLE_ELEMENTS) {
        if (o->role != ROLE_ELEMENT) {
            decode_begin(b->d, &b->e);
            element_wrong(&b->e, "an element of the list is no map: send maps");
        }
        decode_take(b->d, &b->e, b->is_wrong_version);
    } else if (list->role == ROLE_NUMBERS) {
        double x = 0;
        give(b, o);
        if (o->is_nested || !value_number(&b->v, &x))
            list->kind = VALUE_OTHER;
        if (i < READS_MAX)
            b->v.list[i] = x;
    }
    return 0;
}

/* --- the template --------------------------------------------------------- */

/* Its names for our callbacks; each hands on to one of the above. */
#define TAKES_VALUE(name, type, call)                                          \
    static inline int pulled_##name(struct builder *b, type x, struct item *o) \
    {                                                                          \
        (void)b;                                                               \
        return call;                                                           \
    }
#define TAKES_WORD(name, kind)                                                 \
    static inline int pulled_##name(struct builder *b, struct item *o)         \
    {                                                                          \
        (void)b;                                                               \
        return pull_word(kind, o);                                             \
    }
#define TAKES_BYTES(name, call)                                                \
    static inline int pulled_##name(struct builder *b, const char *all,        \
                                    const char *at, uint32_t n,                \
                                    struct item *o)                            \
    {                                                                          \
        (void)all, (void)b, (void)at, (void)n;                                 \
        return call;                                                           \
    }
TAKES_VALUE(uint8, uint8_t, pull_int(x, o))
TAKES_VALUE(uint16, uint16_t, pull_int(x, o))
TAKES_VALUE(uint32, uint32_t, pull_int(x, o))
TAKES_VALUE(uint64, uint64_t, pull_uint64(x, o))
TAKES_VALUE(int8, int8_t, pull_int(x, o))
TAKES_VALUE(int16, int16_t, pull_int(x, o))
TAKES_VALUE(int32, int32_t, pull_int(x, o))
TAKES_VALUE(int64, int64_t, pull_int(x, o))
TAKES_VALUE(float, float, pull_real(VALUE_FLOAT, (double)x, o))
TAKES_VALUE(double, double, pull_real(VALUE_DOUBLE, x, o))
TAKES_VALUE(array, uint32_t, pull_open(b, x, false, o))
TAKES_VALUE(map, uint32_t, pull_open(b, x, true, o))
TAKES_WORD(nil, VALUE_NULL)
TAKES_WORD(true, VALUE_BOOL)
TAKES_WORD(false, VALUE_BOOL)
TAKES_BYTES(str, pull_str(b, at, n, o))
TAKES_BYTES(bin, pull_word(VALUE_OTHER, o))
TAKES_BYTES(ext, pull_ext(b, (const uint8_t *)at, n, o))

static inline struct item pulled_root(struct builder *b)
{
    (void)b;
    return (struct item){.kind = VALUE_NULL};
}

static inline int pulled_array_item(struct builder *b, struct item *list,
                                    struct item o)
{
    return pull_list_item(b, list, &o);
}

static inline int pulled_map_item(struct builder *b, struct item *map,
                                  struct item key, struct item o)
{
    return pull_map_item(b, map, &key, &o);
}

#define MSGPACK_EMBED_STACK_SIZE       WIRE_DEPTH_MAX
#define msgpack_unpack_struct(name)    struct parser##name
#define msgpack_unpack_func(ret, name) static inline ret parser##name
#define msgpack_unpack_callback(name)  pulled##name
#define msgpack_unpack_object          struct item
#define msgpack_unpack_user            struct builder
#include <msgpack/unpack_define.h>
#include <msgpack/unpack.h>
#include <msgpack/unpack_template.h>

/* Why the template stopped, unless a callback has said so. */
static const char *reason_of(int result)
{
    switch (result) {
    case MSGPACK_UNPACK_CONTINUE:
        return truncated;
    case MSGPACK_UNPACK_NOMEM_ERROR:
        return "nested deeper than 8 levels: send flat maps";
    default:
        return "a byte that MessagePack never uses: check the encoder";
    }
}

const char *decode_msgpack(struct wire_decoder *d, const uint8_t *bytes,
                           size_t len, bool *is_wrong_version)
{
    struct parser_context c;
    size_t at = 0;
    c.user.d = d;
    c.user.is_wrong_version = is_wrong_version;
    c.user.bytes = (const char *)bytes;
    c.user.len = len;
    c.user.depth = 0;
    c.user.is_list = false;
    c.user.broken = NULL;
    parser_init(&c);
    int result = parser_execute(&c, (const char *)bytes, len, &at);
    struct item outer = parser_data(&c);
    if (result != 1) {
        d->at = (int)at;
        return c.user.broken ? c.user.broken : reason_of(result);
    }
    if (!outer.is_nested)
        return "neither a map nor a list of maps: send one of them";
    if (outer.role == ROLE_ELEMENT)
        decode_take(d, &c.user.e, is_wrong_version);
    while (at < len &&
           (bytes[at] == 0 || bytes[at] == '\n' || bytes[at] == '\r'))
        at++;
    if (at == len)
        return NULL;
    d->at = (int)at;
    return "more bytes behind the end: send one map or one list";
}
