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

/** Seconds of a clock that never goes back. */
double tg_seconds(void);

/** How many items (rows, views) to work on until the next report: at first one for each thread, then twice as many
 *  as before while those take less than 0.05 s, so that an interrupt is answered soon.
 *  @param last  items of the step before, 0: none  @param seconds  that they took */
size_t tg_progress_items(size_t last, double seconds);

#endif
