#ifndef TG_MEMORY_H
#define TG_MEMORY_H
#include "io/error.h"

enum { TG_ALIGN = 64 }; /* bytes: a cache line and the widest vector register */

/** Multiply sizes; false when the product does not fit. */
bool tg_multiply(size_t a, size_t b, size_t *product);

/** n zeroed items of the given size, aligned to TG_ALIGN; NULL when there is no memory. n = 0 gives one item. */
void *tg_alloc(size_t n, size_t size);

/** Release what tg_alloc or tg_copy_text gave; NULL is fine. */
void tg_free(void *p);

/** A copy of a text (NULL stays NULL); NULL when there is no memory. */
char *tg_copy_text(const char *text);

/** The one sentence for a failed allocation; answers TG_MACHINE. */
tg_code tg_no_memory(tg_error *e, size_t n, size_t size);

/** Allocate n items for the typed pointer p: a tg_code for TG_TRY. */
#define TG_NEW(p, n, e) (((p) = tg_alloc((n), sizeof *(p))) ? TG_OK : tg_no_memory((e), (n), sizeof *(p)))

/** Append one zeroed item to a growing array; the old array stays valid on failure.
 *  @param items  address of the pointer to the array  @param n  items in use, raised by one
 *  @return the new item, or NULL when there is no memory */
void *tg_append(void *items, size_t *n, size_t size);

#endif
