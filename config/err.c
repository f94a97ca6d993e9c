/* SPDX-License-Identifier: Apache-2.0 */
#include "config/err.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "config/textpos.h"

status err_set(struct err *e, status code, const char *fmt, ...)
{
    if (e == NULL)
        return code;
    va_list args;
    va_start(args, fmt);
    vsnprintf(e->text, sizeof e->text, fmt, args);
    va_end(args);
    e->code = code;
    return code;
}

void problems_init(struct problems *p)
{
    *p = (struct problems){0};
}

void problems_fini(struct problems *p)
{
    free(p->text);
    *p = (struct problems){0};
}

/* Room for n more bytes and the NUL. */
static bool reserve(struct problems *p, size_t n)
{
    size_t need = p->len + n + 1;
    if (need <= p->size)
        return true;
    size_t size = p->size < 512 ? 1024 : 2 * p->size;
    while (size < need)
        size *= 2;
    char *text = realloc(p->text, size);
    if (text == NULL)
        return false;
    p->text = text;
    p->size = size;
    return true;
}

void problems_append(struct problems *p, const char *report)
{
    size_t n = strlen(report);
    p->n++;
    if (p->n > PROBLEMS_MAX + 1)
        return;
    if (p->n == PROBLEMS_MAX + 1) {
        report = "error: more problems are not shown\n"
                 "       = correct those above and check again\n";
        n = strlen(report);
    }
    if (!reserve(p, n))
        return;
    memcpy(p->text + p->len, report, n + 1);
    p->len += n;
}
