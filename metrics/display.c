#include "metrics/display.h"

#include "io/memory.h"

#include <gsl/gsl_sort_float.h>
#include <gsl/gsl_statistics_float.h>
#include <math.h>

/* Sorted finite values of the disc that fills `part` of the smaller side. */
static tg_code inner_values(const tg_image *image, size_t slice, double part, float **out, size_t *n, tg_error *e)
{
    const tg_grid *g = &image->grid;
    const float *v = image->v + slice * tg_grid_slice(g);
    const double x0 = 0.5 * ((double)g->n[0] - 1), y0 = 0.5 * ((double)g->n[1] - 1);
    const double radius = part * fmin(x0, y0) + 0.5;
    tg_code code = TG_NEW(*out, tg_grid_slice(g), e);
    if (code != TG_OK) return code;
    *n = 0;
    for (size_t y = 0; y < g->n[1]; y++)
        for (size_t x = 0; x < g->n[0]; x++) {
            const float value = v[y * g->n[0] + x];
            if (isfinite(value) && hypot((double)x - x0, (double)y - y0) <= radius) (*out)[(*n)++] = value;
        }
    gsl_sort_float(*out, 1, *n);
    return TG_OK;
}

tg_code tg_display_window(const tg_image *image, size_t slice, tg_window *w, tg_error *e)
{
    float *v = NULL;
    size_t n;
    const bool hu = image->unit == TG_HU;
    *w = (tg_window){.level = 0, .width = hu ? 400 : 1, .bits = 8};
    const tg_code code = inner_values(image, slice, hu ? 0.5 : 1, &v, &n, e);
    if (code == TG_OK && n) {
        const double low = gsl_stats_float_quantile_from_sorted_data(v, 1, n, 0.005);
        const double high = gsl_stats_float_quantile_from_sorted_data(v, 1, n, 0.995);
        w->level = hu ? gsl_stats_float_quantile_from_sorted_data(v, 1, n, 0.5) : 0.5 * (low + high);
        if (!hu && high > low) w->width = 1.1 * (high - low);
    }
    tg_free(v);
    return code;
}
