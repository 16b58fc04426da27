#include "io/memory.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

bool tg_multiply(size_t a, size_t b, size_t *product)
{
    return !__builtin_mul_overflow(a, b, product);
}

void *tg_alloc(size_t n, size_t size)
{
    size_t bytes;
    if (!tg_multiply(n ? n : 1, size ? size : 1, &bytes) || bytes > (size_t)PTRDIFF_MAX - TG_ALIGN) return NULL;
    bytes = (bytes + TG_ALIGN - 1) / TG_ALIGN * TG_ALIGN;
    void *p = aligned_alloc(TG_ALIGN, bytes);
    if (p) memset(p, 0, bytes);
    return p;
}

void tg_free(void *p)
{
    free(p);
}

char *tg_copy_text(const char *text)
{
    if (!text) return NULL;
    const size_t n = strlen(text) + 1;
    char *copy = tg_alloc(n, 1);
    if (copy) memcpy(copy, text, n);
    return copy;
}

tg_code tg_no_memory(tg_error *e, size_t n, size_t size)
{
    return tg_fail(e, TG_MACHINE, NULL, 0,
                   "no memory for %zu x %zu bytes; use a smaller grid or scan, or a larger machine", n, size);
}

void *tg_append(void *items, size_t *n, size_t size)
{
    char *old, *grown;
    memcpy(&old, items, sizeof old);
    /* capacity is the next power of two, so it can be told from the count alone */
    const bool full = (*n & (*n - 1)) == 0;
    if (!full) {
        grown = old;
    } else {
        grown = tg_alloc(*n ? 2 * *n : 1, size);
        if (!grown) return NULL;
        if (*n) memcpy(grown, old, *n * size);
        tg_free(old);
        memcpy(items, &grown, sizeof grown);
    }
    void *item = grown + *n * size;
    memset(item, 0, size);
    ++*n;
    return item;
}
