#include "io/image.h"

#include "io/memory.h"

#include <math.h>

tg_code tg_image_create(const tg_grid *grid, tg_unit unit, tg_image *out, tg_error *e)
{
    tg_code code = TG_OK;
    size_t n;
    *out = (tg_image){.grid = *grid, .unit = unit, .least = -INFINITY, .most = INFINITY};
    if (!tg_multiply(grid->n[0], grid->n[1], &n) || !tg_multiply(n, grid->n[2], &n))
        TG_TRY(tg_no_memory(e, grid->n[0], grid->n[1]));
    TG_TRY(tg_fields_default(tg_fact_fields, &out->facts, e));
    TG_TRY(TG_NEW(out->v, n, e));
done:
    if (code != TG_OK) tg_image_free(out);
    return code;
}

void tg_image_free(tg_image *image)
{
    tg_scan_free(&image->scan);
    tg_fields_free(tg_fact_fields, &image->facts);
    tg_free(image->method);
    tg_free(image->kernel);
    tg_free(image->v);
    *image = (tg_image){0};
}

const char *tg_unit_text(tg_unit unit)
{
    return unit == TG_HU ? "HU" : "1/mm";
}
