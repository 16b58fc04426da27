#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/noise.h"
#include "metrics/place.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdio.h>

double tg_noise_line_variance(const tg_target *t, const double at_mm[2])
{
    enum { DIRECTIONS = 90 };
    const tg_phantom *p = t->phantom;
    const tg_facts *facts = &t->image->facts;
    double *mu = tg_alloc(p->n_materials, sizeof *mu), *path_mm = tg_alloc(p->n_materials, sizeof *path_mm);
    double sum = NAN, at[2];
    if (mu && path_mm && facts->photons_per_ray.v > 0 && isfinite(facts->energy_kev.v) &&
        tg_phantom_mu(p, facts->energy_kev.v, mu, NULL) == TG_OK) {
        tg_target_to_phantom(t, at_mm, at);
        sum = 0;
        for (int i = 0; i < DIRECTIONS; i++) {
            const double angle = M_PI * i / DIRECTIONS;
            double line = 0;
            tg_phantom_paths(p, (const double[3]){at[0], at[1], t->z_mm}, (const double[3]){cos(angle), sin(angle), 0},
                             path_mm);
            for (size_t k = 0; k < p->n_materials; k++)
                line += mu[k] * path_mm[k];
            sum += exp(line) / facts->photons_per_ray.v / DIRECTIONS;
        }
    }
    tg_free(mu);
    tg_free(path_mm);
    return sum;
}

/** Region of a noise figure: the middle of a body over two fifths of its diameter (IEC 61223-3-5). */
static tg_code place_noise(const tg_target *t, int solid, tg_place *p, tg_error *e)
{
    const double clear = TG_CLEAR_SPREADS * t->spread_mm;
    double radius = 0;
    *p = (tg_place){.region = {.outline = TG_DISC}};
    snprintf(p->region.label, sizeof p->region.label, "%.50s noise", t->phantom->solid[solid].name.v);
    if (!tg_place_circle(t, solid, p->region.centre_mm, &radius))
        snprintf(p->why, sizeof p->why, "it does not reach the section that is measured");
    p->region.outer_mm = 0.4 * radius;
    return tg_place_take(t, solid, clear, TG_LEAST_PIXELS, TG_QUADRATIC, p, e);
}

tg_code tg_measure_noise(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_place place = {0};
    tg_result *r;
    (void)by;
    TG_TRY(tg_place_result(t, "noise", t->phantom->solid[solid].name.v, tg_unit_text(t->unit), out, &r, e));
    if (r->why[0]) goto done;
    TG_TRY(place_noise(t, solid, &place, e));
    r->predicted = tg_theory_sd(&t->theory, tg_noise_line_variance(t, place.region.centre_mm));
    if (place.why[0]) {
        tg_result_null(r, "%s", place.why);
        goto done;
    }
    r->value = place.sd;
    /* a line whose expanded uncertainty is the half width of the interval from chi-square */
    const double k = gsl_cdf_tdist_Pinv(0.975, place.sd_dof);
    tg_result_budget(r, "noise", place.sd * tg_place_sd_expanded(place.sd_dof) / k, place.sd_dof);
    tg_result_combine(r);
    /* twice the standard uncertainty of a ratio of two variances, and a twentieth that nobody would mind */
    if (place.single_sd > place.sd * (1.05 + 2 / sqrt(place.sd_dof)))
        snprintf(r->note, sizeof r->note,
                 "from differences of slices; one slice by itself has %.3g %s: it holds structure common to all",
                 place.single_sd, tg_unit_text(t->unit));
    TG_TRY(tg_results_add_region(out, &place.region, e));
done:
    tg_place_free(&place);
    return code;
}
