#include "io/embedded.h"

#include <string.h>

const char *tg_embedded_text(const char *name)
{
    for (const tg_embedded *f = tg_embedded_files; f->name; f++)
        if (!strcmp(f->name, name)) return (const char *)f->bytes;
    return NULL;
}
