/* SPDX-License-Identifier: Apache-2.0 */
#include "daemon/pages.h"

#include <stdlib.h>
#include <sys/mman.h>

enum { SMALL_ALIGN = 64, LARGE_PAGE = 2 << 20 };

void *pages_new(size_t bytes)
{
    size_t align = bytes >= LARGE_PAGE ? LARGE_PAGE : SMALL_ALIGN;
    size_t whole = (bytes + align - 1) / align * align;
    void *memory = aligned_alloc(align, whole);
    if (memory != NULL && align == LARGE_PAGE)
        madvise(memory, whole, MADV_HUGEPAGE); /* a wish: may be refused */
    return memory;
}
