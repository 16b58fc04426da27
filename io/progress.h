#ifndef TG_PROGRESS_H
#define TG_PROGRESS_H
#include "io/error.h"

/** How long work reports and learns that it shall stop. NULL is a valid progress: silent, never stopped.
 *  Called from one thread only (the one that called the library). */
typedef struct {
    /** @param done  0..1  @return false: stop */
    bool (*step)(void *context, const char *what, double done);
    void *context;
} tg_progress;

/** @return TG_OK, or TG_STOPPED when the work shall end */
tg_code tg_progress_step(const tg_progress *p, const char *what, double done);

#endif
