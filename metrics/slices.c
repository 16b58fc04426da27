#include "metrics/slices.h"

#include "io/memory.h"
#include "metrics/noise.h"
#include "metrics/place.h"

#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>

bool tg_slice_shows(const float *v, size_t n)
{
    size_t first = 0;
    while (first < n && !isfinite(v[first]))
        first++;
    for (size_t i = first; i < n; i++)
        if (isfinite(v[i]) && v[i] != v[first]) return true;
    return false;
}

void tg_slice_name(const tg_image *image, size_t n, const float *slice, char name[64])
{
    for (size_t i = 0; i < n; i++)
        for (size_t k = 0; k < image[i].grid.n[2]; k++)
            if (slice == image[i].v + k * tg_grid_slice(&image[i].grid))
                snprintf(name, 64, "slice %zu of image %zu", k + 1, i + 1);
}

/** @param scratch {n} */
static double median(const double *v, size_t n, double *scratch)
{
    for (size_t i = 0; i < n; i++)
        scratch[i] = v[i];
    gsl_sort(scratch, 1, n);
    return gsl_stats_median_from_sorted_data(scratch, 1, n);
}

tg_code tg_slices_compare(const tg_target *t, const tg_image *image, size_t n_images, tg_error *e)
{
    tg_code code = TG_OK;
    size_t *index = NULL, n;
    double *mean = NULL, *sd = NULL, *scratch = NULL;
    tg_trend trend;
    tg_noise_worth worth;
    TG_TRY(tg_noise_pixels(t, &index, &n, e));
    if (t->n < 2 || n < TG_LEAST_PIXELS) goto done;
    TG_TRY(TG_NEW(mean, t->n, e));
    TG_TRY(TG_NEW(sd, t->n, e));
    TG_TRY(TG_NEW(scratch, t->n, e));
    tg_trend_over(TG_CUP, index, n, t->grid.n[0], &trend);
    TG_TRY(tg_noise_weigh(&t->noise, &trend, index, n, &worth, e));
    for (size_t k = 0; k < t->n; k++) {
        for (size_t i = 0; i < n; i++)
            mean[k] += (double)t->slice[k][index[i]] / (double)n;
        sd[k] = sqrt(tg_trend_remove(&trend, index, n, t->slice[k], NULL, NULL) / worth.freedom);
    }
    const double level = median(mean, t->n, scratch), noise = median(sd, t->n, scratch);
    const double u = noise * sqrt(worth.mean_variance), allowed = t->unit == TG_HU ? 4 : 0.004 * fabs(level);
    const double factor = fmax(1.5, 1 + 5 / sqrt(2 * worth.sd_dof));
    for (size_t k = 0; k < t->n; k++) {
        const double off = mean[k] - level;
        char name[64] = "a slice";
        tg_slice_name(image, n_images, t->slice[k], name);
        if (fabs(off) > fmax(allowed, 5 * u))
            tg_warn(e, NULL, 0, "%s does not agree with the others: the mean of its body is %+.3g %s off their median",
                    name, off, tg_unit_text(t->unit));
        if (sd[k] > factor * noise || sd[k] * factor < noise)
            tg_warn(e, NULL, 0, "%s does not agree with the others: its noise is %.3g %s, their median %.3g", name,
                    sd[k], tg_unit_text(t->unit), noise);
    }
done:
    tg_free(index);
    tg_free(mean);
    tg_free(sd);
    tg_free(scratch);
    return code;
}
