/* SPDX-License-Identifier: Apache-2.0 */
#include "config/syntax.h"

#include <string.h>

#include "config/textpos.h"
#include "core/wire/decode.h"

struct scan {
    const char *s;    /* where it stands                                 */
    const char *what; /* the fault                                       */
    char open[TEXTPOS_DEPTH_MAX + 1];
    int depth;
};

static bool fault(struct scan *c, const char *what)
{
    c->what = what;
    return false;
}

static void blanks(struct scan *c)
{
    c->s += strspn(c->s, " \t\r\n");
}

static bool escape(struct scan *c)
{
    if (*c->s == 'u') {
        if (strspn(c->s + 1, "0123456789abcdefABCDEF") < 4)
            return fault(c, "four hexadecimal digits must follow \\u; write "
                            "the letter itself");
        if (strncmp(c->s + 1, "0000", 4) == 0)
            return fault(c, "a text may not hold a NUL; remove it");
        c->s += 5;
        return true;
    }
    if (*c->s == '\0' || strchr("\"\\/bfnrt", *c->s) == NULL)
        return fault(c, "this escape is not known; write a backslash as \\\\");
    c->s++;
    return true;
}

static bool string(struct scan *c)
{
    for (c->s++; *c->s != '"';) {
        if ((unsigned char)*c->s < 32)
            return fault(c, "a text does not end on its line; close it with "
                            "a quotation mark");
        if (*c->s++ == '\\' && !escape(c))
            return false;
    }
    c->s++;
    return true;
}

static size_t digits(const char *s)
{
    return strspn(s, "0123456789");
}

static bool number(struct scan *c)
{
    const char *start = c->s;
    size_t n = *start == '-', whole = digits(start + n);
    double unused;
    if (whole == 0)
        return fault(c, "a number needs a digit here; write it like -0.5");
    if (start[n] == '0' && whole > 1)
        return fault(c, "a number may not begin with 0; remove the zero");
    n += whole;
    if (start[n] == '.') {
        size_t decimals = digits(start + n + 1);
        if (decimals == 0)
            return fault(c, "a digit must follow the decimal point; add one");
        n += 1 + decimals;
    }
    if (start[n] == 'e' || start[n] == 'E') {
        size_t sign = start[n + 1] == '-' || start[n + 1] == '+';
        size_t power = digits(start + n + 1 + sign);
        if (power == 0)
            return fault(c, "a digit must follow the exponent sign; add one");
        n += 1 + sign + power;
    }
    if (!wire_parse_number(start, n, &unused))
        return fault(c, "the number is too large; give a smaller one");
    c->s += n;
    return true;
}

/* A value that is no object and no array. */
static bool scalar(struct scan *c)
{
    static const char *const words[] = {"true", "false", "null"};
    if (*c->s == '"')
        return string(c);
    if (*c->s == '-' || digits(c->s) > 0)
        return number(c);
    for (int i = 0; i < 3; i++) {
        size_t n = strlen(words[i]);
        if (strncmp(c->s, words[i], n) == 0) {
            c->s += n;
            return true;
        }
    }
    if (*c->s == '\0')
        return fault(c, "the file ends too early; close every { and [");
    return fault(c, "a value is missing here; give a number, a text in "
                    "quotation marks, { or [");
}

static bool key(struct scan *c)
{
    blanks(c);
    if (*c->s == '\0')
        return fault(c, "the file ends too early; close every { and [");
    if (*c->s == '}')
        return fault(c, "a key must follow the comma; remove the comma");
    if (*c->s != '"')
        return fault(c, "a key is missing here; write it in quotation marks");
    if (!string(c))
        return false;
    blanks(c);
    if (*c->s != ':')
        return fault(c, "a colon must follow the key; add it");
    c->s++;
    return true;
}

/* At { or [: goes to the first value, or to the end of an empty one. */
static bool open(struct scan *c, bool *is_empty)
{
    char close = *c->s == '{' ? '}' : ']';
    if (c->depth == TEXTPOS_DEPTH_MAX)
        return fault(c, "nested deeper than 32; flatten it");
    c->open[c->depth++] = close;
    c->s++;
    blanks(c);
    *is_empty = *c->s == close;
    return *is_empty || close == ']' || key(c);
}

/* After a value: closes what ends here, or goes on to the next value. */
static bool after(struct scan *c)
{
    for (; c->depth > 0; c->s++) {
        char close = c->open[c->depth - 1];
        blanks(c);
        if (*c->s == ',') {
            c->s++;
            if (close == '}')
                return key(c);
            blanks(c);
            return *c->s != ']' || fault(c, "a value must follow the comma; "
                                            "remove the comma");
        }
        if (*c->s == '\0')
            return fault(c, "the file ends too early; close every { and [");
        if (*c->s != close)
            return fault(c, close == '}'
                                ? "a comma or } must stand here; add it"
                                : "a comma or ] must stand here; add it");
        c->depth--;
    }
    return true;
}

bool syntax_check(const char *text, size_t *at, const char **what)
{
    struct scan c = {.s = text};
    bool is_ok;
    do {
        bool is_whole = true; /* a value that has ended, but for } and ] */
        blanks(&c);
        if (*c.s == '{' || *c.s == '[')
            is_ok = open(&c, &is_whole);
        else
            is_ok = scalar(&c);
        if (is_ok && is_whole)
            is_ok = after(&c);
    } while (is_ok && c.depth > 0);
    if (is_ok)
        blanks(&c);
    if (is_ok && *c.s != '\0')
        is_ok = fault(&c, "text after the end; remove it");
    *at = (size_t)(c.s - text);
    *what = c.what;
    return is_ok;
}
