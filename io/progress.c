#include "io/progress.h"

tg_code tg_progress_step(const tg_progress *p, const char *what, double done)
{
    return !p || p->step(p->context, what, done) ? TG_OK : TG_STOPPED;
}
