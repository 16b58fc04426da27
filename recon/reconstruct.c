#include "recon/reconstruct.h"

#include "io/memory.h"
#include "recon/backproject.h"
#include "recon/filter.h"
#include "recon/kernel.h"
#include "recon/weights.h"

#include <math.h>
#include <string.h>

static tg_code backproject_slice(const tg_backprojector *b, const float *filtered, size_t z, tg_image *image,
                                 const tg_progress *progress)
{
    const size_t ny = image->grid.n[1], nz = image->grid.n[2];
    float *slice = image->v + z * tg_grid_slice(&image->grid);
    tg_code code = TG_OK;
    size_t rows = 0;
    double took_s = 0;
    for (size_t y = 0; y < ny && code == TG_OK; y += rows) {
        const double start = tg_seconds();
        rows = tg_progress_items(rows, took_s);
        if (rows > ny - y) rows = ny - y;
        tg_backproject_rows(b, filtered, y, rows, slice);
        code = tg_progress_step(progress, "back-projection", (double)(z * ny + y + rows) / (double)(nz * ny));
        took_s = tg_seconds() - start;
    }
    return code;
}

/* Filtered back-projection, slice by slice. */
static tg_code fbp(const tg_sinogram *s, const tg_recipe *r, tg_image *image, const tg_progress *progress, tg_error *e)
{
    const tg_scan *scan = &image->scan;
    const size_t samples = scan->views * scan->channels;
    tg_code code = TG_OK;
    tg_kernel kernel = {0};
    tg_filter *filter = NULL;
    tg_backprojector *b = NULL;
    double *weight_rad = NULL;
    float *filtered = NULL;
    TG_TRY(tg_kernel_read(r->kernel.v, &kernel, e));
    TG_TRY(TG_NEW(weight_rad, scan->views, e));
    TG_TRY(tg_angle_weights(scan, weight_rad, e));
    TG_TRY(tg_filter_create(scan, &kernel, &filter, e));
    TG_TRY(tg_backprojector_create(scan, &image->grid, tg_filter_stride(filter), &b, e));
    TG_TRY(TG_NEW(filtered, scan->views * tg_filter_stride(filter), e));
    for (size_t z = 0; z < scan->rows; z++) {
        tg_filter_apply(filter, weight_rad, s->v + z * samples, filtered);
        TG_TRY(backproject_slice(b, filtered, z, image, progress));
    }
done:
    tg_kernel_free(&kernel);
    tg_filter_free(filter);
    tg_backprojector_free(b);
    tg_free(weight_rad);
    tg_free(filtered);
    return code;
}

static tg_method *const methods[] = {fbp}; /* in the order of TG_METHODS */

tg_code tg_recipe_check(const tg_recipe *r, const char *file, tg_error *e)
{
    tg_error own = {0};
    tg_kernel kernel = {0};
    tg_code code = tg_kernel_read(r->kernel.v, &kernel, &own);
    tg_kernel_free(&kernel);
    for (size_t i = 0; i < own.count && i < TG_MESSAGES; i++) {
        const tg_message *m = &own.message[i];
        if (*m->file) { /* a kernel's own file says more */
            tg_fail(e, code, m->file, m->line, "%s", m->what);
            continue;
        }
        if (!file && code == TG_INPUT) code = TG_USAGE;
        tg_fail(e, code, file, file ? r->kernel.line : 0, "%skernel: %s", file ? "" : "--", m->what);
    }
    return code;
}

static tg_code check_finite(const tg_sinogram *s, tg_error *e)
{
    const size_t n = s->scan.rows * s->scan.views * s->scan.channels;
    for (size_t i = 0; i < n; i++)
        if (!isfinite(s->v[i])) {
            const size_t channel = i % s->scan.channels, row = i / s->scan.channels;
            return tg_fail(e, TG_INPUT, NULL, 0, "channel %zu of view %zu, row %zu holds %g; every ray needs a number",
                           channel + 1, row % s->scan.views + 1, row / s->scan.views + 1, (double)s->v[i]);
        }
    return TG_OK;
}

void tg_to_hu(tg_image *image, double mu_water_per_mm)
{
    const size_t n = tg_grid_samples(&image->grid);
    for (size_t i = 0; i < n; i++)
        image->v[i] = (float)(1000 * ((double)image->v[i] - mu_water_per_mm) / mu_water_per_mm);
    image->unit = TG_HU;
    image->facts.mu_water_per_mm = (tg_number){mu_water_per_mm, 1};
}

/* What an image carries of its scan and recipe. */
static tg_code describe(const tg_sinogram *s, const tg_recipe *r, tg_image *image, tg_error *e)
{
    tg_fields_free(tg_fact_fields, &image->facts);
    tg_code code = tg_facts_copy(&s->facts, &image->facts, e);
    if (code != TG_OK || (code = tg_scan_copy(&s->scan, &image->scan, e)) != TG_OK) return code;
    image->scan.channel_zero = tg_recipe_channel_zero(r, &s->scan);
    char method[TG_WORD];
    image->method = tg_copy_text(tg_word_at(TG_METHODS, (int)r->method.v, method));
    image->kernel = tg_copy_text(r->kernel.v);
    return image->method && image->kernel ? TG_OK : tg_no_memory(e, 1, strlen(r->kernel.v));
}

tg_code tg_reconstruct(const tg_sinogram *s, const tg_recipe *r, const tg_progress *progress, tg_image *image,
                       tg_error *e)
{
    tg_code code = TG_OK;
    tg_image made = {0};
    tg_grid grid;
    TG_TRY(check_finite(s, e));
    TG_TRY(tg_recipe_grid(r, &s->scan, &grid, e));
    TG_TRY(tg_image_create(&grid, TG_PER_MM, &made, e));
    TG_TRY(describe(s, r, &made, e));
    TG_TRY(methods[(int)r->method.v](s, r, &made, progress, e));
    const double own = r->mu_water_per_mm.v, water = own > 0 ? own : s->facts.mu_water_per_mm.v;
    if (water > 0) tg_to_hu(&made, water); /* NaN: unknown */
done:
    if (code == TG_OK)
        *image = made;
    else
        tg_image_free(&made);
    return code;
}
