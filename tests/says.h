#ifndef TG_SAYS_H
#define TG_SAYS_H
#include "io/error.h"

#include <string.h>

/** Does any kept message hold this text? */
static inline bool says(const tg_error *e, const char *fragment)
{
    for (size_t i = 0; i < e->count && i < TG_MESSAGES; i++)
        if (strstr(e->message[i].what, fragment)) return true;
    return false;
}

#endif
