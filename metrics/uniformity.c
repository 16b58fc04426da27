#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/noise.h"
#include "metrics/place.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/** Depth of the edge under the rim of a body: rims of edge regions, and the ring of cupping (IEC 61223-3-5). */
static const double depth_mm = 10;

enum { PLACES = 4, FARTHEST_DEG = 44 /* that an edge region moves aside: it stays the nearest to its name */ };
static const char *const place_names[PLACES] = {"right", "top", "left", "bottom"};

/** Distance from the middle of the body to its outline; where it is no circle, to the last pixel of the object. */
static double rim_mm(const tg_target *t, const double from_mm[2], double angle_rad)
{
    const tg_grid *g = &t->grid;
    double middle[2], radius;
    if (tg_target_circle(t, t->body, middle, &radius)) return radius;
    const double step = 0.5 * fmin(g->step_mm[0], g->step_mm[1]);
    double rim = 0;
    for (double d = 0;; d += step) {
        const double x = round(tg_grid_index(g, 0, from_mm[0] + d * cos(angle_rad)));
        const double y = round(tg_grid_index(g, 1, from_mm[1] + d * sin(angle_rad)));
        if (!(x >= 0 && y >= 0 && x < (double)g->n[0] && y < (double)g->n[1])) return rim;
        if (t->label[(size_t)y * g->n[0] + (size_t)x] != TG_NO_SOLID) rim = d;
    }
}

/** Distance to the nearest other solid at a point; 0 off the body. */
static double clear_at(const tg_target *t, const double mm[2])
{
    const tg_grid *g = &t->grid;
    const double x = round(tg_grid_index(g, 0, mm[0])), y = round(tg_grid_index(g, 1, mm[1]));
    if (!(x >= 0 && y >= 0 && x < (double)g->n[0] && y < (double)g->n[1])) return 0;
    const size_t i = (size_t)y * g->n[0] + (size_t)x;
    return t->label[i] == t->body ? (double)t->clear_mm[i] : 0;
}

/** Find the clear place of an edge region nearest to its angle, and take it. */
static tg_code place_edge(const tg_target *t, const tg_place *centre, int quarter, tg_place *p, tg_error *e)
{
    const double clear = TG_CLEAR_SPREADS * t->spread_mm, radius = centre->region.outer_mm;
    double middle[2], body_mm;
    *p = (tg_place){.region = {.outline = TG_DISC, .outer_mm = radius}};
    snprintf(p->region.label, sizeof p->region.label, "%.50s %s", t->phantom->solid[t->body].name.v,
             place_names[quarter]);
    if (!tg_place_circle(t, t->body, middle, &body_mm)) {
        snprintf(p->why, sizeof p->why, "it does not reach the section that is measured");
        return TG_OK;
    }
    for (int i = 0; i <= 2 * FARTHEST_DEG; i++) { /* 0, 1, -1, 2, -2, ... degrees aside */
        const int aside = i % 2 ? (i + 1) / 2 : -(i / 2);
        const double angle = (90 * quarter + aside) * M_PI / 180;
        const double distance = rim_mm(t, middle, angle) - depth_mm - radius;
        if (distance < 2 * radius) continue;
        p->region.centre_mm[0] = middle[0] + distance * cos(angle);
        p->region.centre_mm[1] = middle[1] + distance * sin(angle);
        if (clear_at(t, p->region.centre_mm) < radius + clear) continue;
        if (aside)
            snprintf(p->note, sizeof p->note,
                     "measured %d degrees from its place, where the body is clear of other solids", abs(aside));
        return tg_place_take(t, t->body, clear, TG_LEAST_PIXELS, TG_PLANE, p, e);
    }
    snprintf(p->why, sizeof p->why,
             body_mm - depth_mm < 3 * radius ? "the body is too small for a region 1 cm inside its rim"
                                             : "other solids leave no clear place 1 cm inside the rim");
    return TG_OK;
}

/** Fill a result with the difference of two places. */
static void differ(const tg_target *t, const tg_place *edge, const tg_place *centre, tg_result *r)
{
    const char *why = centre->why[0] ? centre->why : edge->why;
    if (why[0]) {
        tg_result_null(r, "%s: %s", why == edge->why ? edge->region.label : centre->region.label, why);
        return;
    }
    r->value = edge->mean - centre->mean;
    snprintf(r->note, sizeof r->note, "%s", edge->note[0] ? edge->note : centre->note);
    /* regions so far apart share no noise: the covariance of filtered back-projection falls as 1 / distance^3 */
    tg_result_budget(r, "noise", edge->u, edge->dof);
    tg_result_budget(r, "noise", centre->u, centre->dof);
    tg_place_budget_slices(t, edge, centre, r);
    tg_result_budget(r, "position", tg_place_position_u(t, edge), INFINITY);
    tg_result_budget(r, "position", tg_place_position_u(t, centre), INFINITY);
    tg_result_combine(r);
}

/** 95 % for the largest of all differences at once (Sidak 1967). That they share the centre makes them hang together,
 *  for which the bound still holds: they cover a little more than 95 %. */
static double simultaneous(double dof)
{
    return gsl_cdf_tdist_Pinv(0.5 + 0.5 * pow(0.95, 1.0 / PLACES), dof);
}

tg_code tg_measure_uniformity(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    const char *const body = t->phantom->solid[solid].name.v;
    tg_place centre = {0}, edge[PLACES] = {{.n = 0}};
    tg_result difference[PLACES] = {{.n_budget = 0}}, *r;
    int worst = 0;
    (void)by;
    if (!t->lost[0]) {
        if (solid != t->body)
            snprintf(centre.why, sizeof centre.why, "uniformity is a figure of the phantom's body");
        else
            TG_TRY(tg_place_mean(t, solid, &centre, e));
        for (int i = 0; i < PLACES && !centre.why[0]; i++)
            TG_TRY(place_edge(t, &centre, i, &edge[i], e));
    }
    for (int i = 0; i < PLACES; i++) {
        char where[sizeof difference->where];
        snprintf(where, sizeof where, "%.50s %s", body, place_names[i]);
        TG_TRY(tg_place_result(t, "uniformity", where, tg_unit_text(t->unit), out, &r, e));
        if (!r->why[0]) differ(t, &edge[i], &centre, r);
        difference[i] = *r;
        /* a place that could not be had may be the worst */
        if (!isnan(difference[worst].value) && !(fabs(r->value) <= fabs(difference[worst].value))) worst = i;
        if (!isnan(r->value)) TG_TRY(tg_results_add_region(out, &edge[i].region, e));
    }
    if (!isnan(difference[worst].value)) TG_TRY(tg_results_add_region(out, &centre.region, e));
    TG_TRY(tg_place_result(t, "uniformity", body, tg_unit_text(t->unit), out, &r, e));
    *r = difference[worst];
    snprintf(r->where, sizeof r->where, "%s", body);
    tg_result_combine_by(r, simultaneous);
done:
    tg_place_free(&centre);
    for (int i = 0; i < PLACES; i++)
        tg_place_free(&edge[i]);
    return code;
}

/* ---------------------------------------------------------------- cupping */

/** Mean over circles around the middle of a body, in steps of a pixel. */
static tg_code profile(const tg_target *t, const char *name, const double middle[2], double radius_mm, tg_results *out,
                       tg_error *e)
{
    tg_code code = TG_OK;
    const tg_grid *g = &t->grid;
    const double step = fmax(g->step_mm[0], g->step_mm[1]), clear = TG_CLEAR_SPREADS * t->spread_mm;
    const size_t bins = (size_t)(radius_mm / step) + 1;
    double *sum = NULL, *count = NULL, *where = NULL;
    size_t filled = 0;
    TG_TRY(TG_NEW(sum, bins, e));
    TG_TRY(TG_NEW(count, bins, e));
    TG_TRY(TG_NEW(where, bins, e));
    for (size_t i = 0; i < tg_grid_slice(g); i++) {
        const double x = tg_grid_mm(g, 0, (double)(i % g->n[0])), y = tg_grid_mm(g, 1, (double)(i / g->n[0]));
        const double d = hypot(x - middle[0], y - middle[1]);
        if (t->label[i] != t->body || (double)t->clear_mm[i] < clear || d >= radius_mm || !isfinite(t->mean[i]))
            continue;
        const size_t bin = (size_t)(d / step);
        sum[bin] += (double)t->mean[i];
        where[bin] += d;
        count[bin]++;
    }
    for (size_t i = 0; i < bins; i++)
        filled += count[i] > 0;
    tg_curve *c = tg_results_add_curve(out, "radial-profile", name, "mm", tg_unit_text(t->unit), filled, false);
    if (!c) TG_TRY(tg_no_memory(e, filled, 2 * sizeof(double)));
    for (size_t i = 0, k = 0; i < bins; i++)
        if (count[i] > 0) {
            c->x[k] = where[i] / count[i];
            c->y[k++] = sum[i] / count[i];
        }
done:
    tg_free(sum);
    tg_free(count);
    tg_free(where);
    return code;
}

tg_code tg_measure_cupping(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    const char *const name = t->phantom->solid[solid].name.v;
    const double width = fmax(2, 3 * fmax(t->grid.step_mm[0], t->grid.step_mm[1]));
    double middle[2], radius;
    tg_place centre = {0}, ring = {.region = {.outline = TG_RING}};
    tg_result *r;
    (void)by;
    TG_TRY(tg_place_result(t, "cupping", name, tg_unit_text(t->unit), out, &r, e));
    if (r->why[0]) goto done;
    if (!tg_target_circle(t, solid, middle, &radius)) {
        tg_result_null(r, "the section of the body is no circle");
        goto done;
    }
    TG_TRY(tg_place_mean(t, solid, &centre, e));
    snprintf(ring.region.label, sizeof ring.region.label, "%.50s ring", name);
    memcpy(ring.region.centre_mm, middle, sizeof middle);
    ring.region.inner_mm = radius - depth_mm - 0.5 * width;
    ring.region.outer_mm = radius - depth_mm + 0.5 * width;
    if (!(ring.region.inner_mm > centre.region.outer_mm))
        snprintf(ring.why, sizeof ring.why, "the body is too small for a ring 1 cm inside its rim");
    TG_TRY(tg_place_take(t, solid, TG_CLEAR_SPREADS * t->spread_mm, TG_LEAST_PIXELS, TG_PLANE, &ring, e));
    differ(t, &centre, &ring, r);
    if (isnan(r->value)) goto done;
    TG_TRY(tg_results_add_region(out, &centre.region, e));
    TG_TRY(tg_results_add_region(out, &ring.region, e));
    TG_TRY(profile(t, name, middle, radius, out, e));
done:
    tg_place_free(&centre);
    tg_place_free(&ring);
    return code;
}
