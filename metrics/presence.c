#include "metrics/presence.h"

#include "io/memory.h"
#include "metrics/locate.h"
#include "metrics/noise.h"

#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>

enum { LEAST = 9 /* pixels on either side */ };

/** Median of the mean slice over a region, and its standard uncertainty; NaN where there is none. */
static tg_code level(const tg_target *t, const tg_region *region, int solid, double clear_mm, double *median, double *u,
                     tg_error *e)
{
    tg_code code = TG_OK;
    size_t *index = NULL, n = 0, x0, x1, y0, y1, kept = 0;
    double *v = NULL;
    *median = *u = NAN;
    if (!tg_region_bounds(region, &t->grid, &x0, &x1, &y0, &y1)) goto done;
    TG_TRY(tg_target_pixels(t, region, solid, clear_mm, &index, &n, e));
    if (n < LEAST) goto done;
    TG_TRY(TG_NEW(v, n, e));
    for (size_t i = 0; i < n; i++)
        if (isfinite(t->mean[index[i]])) v[kept++] = (double)t->mean[index[i]];
    if (kept < LEAST) goto done;
    gsl_sort(v, 1, kept);
    *median = gsl_stats_median_from_sorted_data(v, 1, kept);
    /* noise that passed the same Gaussian spread hangs together over 2.27 FWHM^2; a median is pi / 2 as uncertain */
    const double area = (double)kept * t->grid.step_mm[0] * t->grid.step_mm[1];
    const double share = fmin(2.27 * t->spread_mm * t->spread_mm / area, 1) * M_PI / 2;
    *u = t->noise.robust_sd * sqrt(share / (double)t->n);
done:
    tg_free(index);
    tg_free(v);
    return code;
}

/** The step from what is around a solid to the solid that the description lets expect; NaN: none to build on. */
static tg_code expect(const tg_target *t, int solid, int around, double *step, tg_error *e)
{
    tg_code code = TG_OK;
    const tg_phantom *p = t->phantom;
    const tg_facts *facts = &t->image->facts;
    double *mu = NULL;
    TG_TRY(TG_NEW(mu, p->n_materials, e));
    TG_TRY(tg_phantom_mu(p, tg_locate_energy_kev(facts), mu, e));
    const double contrast =
        (mu[p->solid[solid].material] - mu[p->solid[around].material]) / mu[p->solid[t->body].material];
    *step = facts->energy_kev.v > 0 || fabs(contrast) > 0.05 ? contrast * tg_noise_scale(t) : (double)NAN;
done:
    tg_free(mu);
    return code;
}

tg_code tg_presence_find(const tg_target *t, int solid, tg_presence *out, tg_error *e)
{
    tg_code code = TG_OK;
    double centre[2], radius, step, inside, outside, u[2];
    *out = TG_UNTOLD;
    if (solid == t->body || !tg_target_circle(t, solid, centre, &radius) || radius < 2 * t->spread_mm) goto done;
    const int around = tg_target_around(t, centre, radius);
    if (around == TG_NO_SOLID) goto done;
    const double clear = 1.5 * t->spread_mm;
    const tg_region disc = {.outline = TG_DISC, .centre_mm = {centre[0], centre[1]}, .outer_mm = 0.5 * radius};
    const tg_region ring = {.outline = TG_RING,
                            .centre_mm = {centre[0], centre[1]},
                            .inner_mm = radius + clear,
                            .outer_mm = radius + clear + fmax(0.3 * radius, 2 * t->grid.step_mm[0])};
    TG_TRY(expect(t, solid, around, &step, e));
    TG_TRY(level(t, &disc, solid, 0, &inside, &u[0], e));
    TG_TRY(level(t, &ring, around, clear, &outside, &u[1], e));
    const double both = hypot(u[0], u[1]), found = fabs(inside - outside);
    if (!(fabs(step) > 10 * both)) goto done; /* NaN, too */
    *out = found < fmax(5 * both, fmin(0.25 * fabs(step), 0.01 * tg_noise_scale(t))) ? TG_MISSING : TG_STANDS;
done:
    return code;
}

tg_code tg_presence_doubt(const tg_target *t, char lost[200], tg_error *e)
{
    tg_code code = TG_OK;
    int stands = 0, missing = 0;
    for (int i = 0; i < (int)t->phantom->n_solids; i++) {
        tg_presence presence;
        TG_TRY(tg_presence_find(t, i, &presence, e));
        stands += presence == TG_STANDS;
        missing += presence == TG_MISSING;
    }
    if (missing >= 2 && missing > stands)
        snprintf(lost, 200,
                 "the body is there, but what stands in it does not fit the description: %d of %d solids that should "
                 "stand out are not at their places",
                 missing, missing + stands);
done:
    return code;
}
