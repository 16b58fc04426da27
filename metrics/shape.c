/* Size and place of the solids, from their outlines in the mean slice. */
#include "io/memory.h"
#include "metrics/contour.h"
#include "metrics/measure.h"
#include "metrics/mtf.h"
#include "metrics/place.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

enum { SPREADS = 4 }; /* least radius of a solid whose outline is told from its spread */

/** How far the pixels of a third solid stay away from the outline of one: what is around it may be measured up to
 * there.
 *  @param around  the solid that surrounds it */
static double room_mm(const tg_target *t, int solid, const double centre_mm[2], double radius_mm, int around)
{
    const tg_grid *g = &t->grid;
    double least = INFINITY;
    for (size_t i = 0; i < tg_grid_slice(g); i++) {
        if (t->label[i] == solid || t->label[i] == around) continue;
        const double x = tg_grid_mm(g, 0, (double)(i % g->n[0])), y = tg_grid_mm(g, 1, (double)(i / g->n[0]));
        least = fmin(least, fabs(hypot(x - centre_mm[0], y - centre_mm[1]) - radius_mm));
    }
    return least;
}

/** What is to be looked for, or why it cannot be told (then r is null). */
static void model(const tg_target *t, int solid, const double centre_mm[2], double radius_mm, tg_contour_model *m,
                  tg_result *r)
{
    *m = (tg_contour_model){.solid = &t->phantom->solid[solid],
                            .z_mm = t->z_mm,
                            .spread_mm = t->spread_mm,
                            .round = true,
                            .image = t->mean,
                            .grid = &t->grid};
    tg_target_to_phantom(t, centre_mm, m->middle_mm);
    if (!(radius_mm > 0)) {
        tg_result_null(r, "its section at z = %.4g mm is no circle", t->z_mm);
        return;
    }
    if (radius_mm < SPREADS * t->spread_mm) {
        tg_result_null(r, "its radius of %.3g mm is less than %d spread widths of %.3g mm", radius_mm, SPREADS,
                       t->spread_mm);
        return;
    }
    const int around = tg_target_around(t, centre_mm, radius_mm);
    const double room = room_mm(t, solid, centre_mm, radius_mm, around) - t->spread_mm;
    m->width_mm = fmin(fmin(SPREADS * t->spread_mm, room), 0.8 * radius_mm);
    if (m->width_mm < 2 * t->spread_mm)
        tg_result_null(r, "another solid is within 3 spread widths of %.3g mm of its outline", t->spread_mm);
}

/** Find the outline of a solid; r is null where that cannot be. */
static tg_code find(const tg_target *t, int solid, tg_contour *o, double centre_mm[2], double *radius_mm, tg_result *r,
                    tg_error *e)
{
    tg_code code = TG_OK;
    tg_contour_model m;
    tg_place place = {0};
    bool found = false;
    if (*t->lost) {
        tg_result_null(r, "%s", t->lost);
        goto done;
    }
    if (!tg_target_circle(t, solid, centre_mm, radius_mm)) *radius_mm = 0;
    model(t, solid, centre_mm, *radius_mm, &m, r);
    if (*r->why) goto done;
    *o = (tg_contour){.centre_mm = {centre_mm[0], centre_mm[1]}, .scale = 1};
    TG_TRY(tg_contour_find(&m, o, &found, e));
    TG_TRY(tg_place_mean(t, solid, &place, e));
    const tg_image *image = t->image;
    if (!found || o->seen < 0.75)
        tg_result_null(r, "its outline is not in the image as a whole, or does not stand out");
    else if (o->jitter_mm > 0.2 * t->spread_mm) /* the noise of a profile is more than a fifth of the step */
        tg_result_null(r, "its outline is lost in noise: it strays by %.2g mm", o->jitter_mm);
    else if (place.clipped || fmin(o->inside, o->outside) <= image->least || fmax(o->inside, o->outside) >= image->most)
        tg_result_null(r, "the values beside its outline are clipped");
done:
    tg_place_free(&place);
    return code;
}

tg_code tg_measure_diameter(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    (void)by;
    tg_code code = TG_OK;
    tg_contour o;
    double centre[2], radius = 0;
    tg_result *r = tg_results_add(out, "diameter", t->phantom->solid[solid].name.v, "mm");
    if (!r) return tg_no_memory(e, 1, sizeof *r);
    TG_TRY(find(t, solid, &o, centre, &radius, r, e));
    if (radius > 0) r->predicted = 2 * radius;
    if (*r->why) goto done;
    /* a blurred circle has its half of the step at a smaller radius, by variance / 2 R for a Gaussian spread */
    const double sigma = t->spread_mm / 2.354820045, bent = sigma * sigma / radius;
    r->value = 2 * radius * o.scale + bent;
    tg_result_budget(r, "noise", 2 * radius * o.scale_u, o.dof);
    tg_result_budget(r, "method", bent / sqrt(3), INFINITY);
    /* what sampling leaves: a twentieth of a pixel at most on each side */
    tg_result_budget(r, "sampling", 0.1 * t->grid.step_mm[0] / sqrt(3), INFINITY);
    tg_result_combine(r);
done:
    return code;
}

/** 95 % for a distance in the plane whose standard uncertainty s along either axis is known: the circle around the
 * place, for which r^2 / (2 s^2) is distributed as F with 2 and those degrees of freedom. */
static double in_a_plane(double dof)
{
    return sqrt(2 * gsl_cdf_fdist_Pinv(0.95, 2, dof));
}

tg_code tg_measure_position(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    (void)by;
    tg_code code = TG_OK;
    double place[2], found[2], radius = 0, u, dof, u_sampling = 0;
    tg_contour o;
    tg_result *r = tg_results_add(out, "position", t->phantom->solid[solid].name.v, "mm");
    if (!r) return tg_no_memory(e, 1, sizeof *r);
    r->predicted = 0;
    if (!*t->lost && tg_target_circle(t, solid, place, &radius) && radius < SPREADS * t->spread_mm) {
        TG_TRY(tg_point_find(t, solid, found, &u, &dof, &u_sampling, r->why, e));
    } else {
        TG_TRY(find(t, solid, &o, place, &radius, r, e));
        memcpy(found, o.centre_mm, sizeof found);
        u = o.centre_u_mm;
        dof = o.dof;
    }
    if (*r->why) goto done;
    tg_result_budget(r, "noise", u, dof);
    tg_result_budget(r, "sampling", u_sampling, INFINITY);
    if (solid == t->body) {
        /* the body is what the pose was found by: its place is judged in the image itself */
        r->value = hypot(t->shift_mm[0], t->shift_mm[1]);
    } else {
        r->value = hypot(found[0] - place[0], found[1] - place[1]);
        const double far = hypot(place[0] - t->shift_mm[0], place[1] - t->shift_mm[1]);
        tg_result_budget(r, "position", hypot(t->shift_u_mm, far * t->turn_u_rad), INFINITY);
    }
    tg_result_combine_by(r, in_a_plane);
done:
    return code;
}
