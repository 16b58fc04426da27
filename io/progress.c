#include "io/progress.h"

#include <omp.h>
#include <time.h>

tg_code tg_progress_step(const tg_progress *p, const char *what, double done)
{
    return !p || p->step(p->context, what, done) ? TG_OK : TG_STOPPED;
}

double tg_seconds(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

size_t tg_progress_items(size_t last, double seconds)
{
    if (!last) return (size_t)omp_get_max_threads();
    return seconds < 0.05 ? 2 * last : last;
}
