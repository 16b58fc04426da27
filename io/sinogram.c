#include "io/sinogram.h"

#include "io/memory.h"

tg_code tg_sinogram_create(const tg_scan *scan, tg_sinogram *out, tg_error *e)
{
    tg_code code = TG_OK;
    size_t n;
    *out = (tg_sinogram){0};
    if (!tg_multiply(scan->channels, scan->views, &n) || !tg_multiply(n, scan->rows, &n))
        TG_TRY(tg_no_memory(e, scan->channels, scan->views));
    TG_TRY(tg_fields_default(tg_fact_fields, &out->facts, e));
    TG_TRY(tg_scan_copy(scan, &out->scan, e));
    TG_TRY(TG_NEW(out->v, n, e));
done:
    if (code != TG_OK) tg_sinogram_free(out);
    return code;
}

void tg_sinogram_free(tg_sinogram *s)
{
    tg_scan_free(&s->scan);
    tg_fields_free(tg_fact_fields, &s->facts);
    tg_free(s->v);
    *s = (tg_sinogram){0};
}
