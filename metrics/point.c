/* The spread of a point: the image of a thin cylinder or a small sphere. Its kernel is the radial average of the
 * two-dimensional Fourier transform, J0(2 pi f r) under a flat-topped taper. */
#include "io/memory.h"
#include "metrics/mtf.h"

#include <math.h>
#include <stdio.h>

/* In widths of the spread (full width at half maximum). The taper is flat to 3/8 of the reach and ends at 6/8; the
 * background is fitted from 5/8 on. Band-limited spreads ring on: the reach is as long as the surroundings allow. */
static const double least_reach = 5, most_reach = 8, skirt = 1.5;

static double kernel(const tg_spread *s, double r_mm, double f_per_mm)
{
    const double taper = tg_taper(r_mm, s->flat_mm, s->end_mm, NULL);
    return taper > 0 ? taper * j0(2 * M_PI * f_per_mm * r_mm) : 0;
}

/** How far the surroundings are clear: of other solids with their skirts, and of the end of the image. */
static tg_code clear_reach(const tg_target *t, int solid, const double centre_mm[2], const tg_spread *s,
                           double *reach_mm, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_intruder *list = NULL;
    size_t n = 0, nearest = 0;
    const double width = s->width_mm, blur = skirt * width;
    *reach_mm = most_reach * width;
    for (int axis = 0; axis < 2; axis++) {
        const double low = t->grid.first_mm[axis], high = tg_grid_mm(&t->grid, axis, (double)t->grid.n[axis] - 1);
        *reach_mm = fmin(*reach_mm, fmin(centre_mm[axis] - low, high - centre_mm[axis]));
    }
    if (*reach_mm < least_reach * width) {
        tg_mtf_refuse(out, "too near the end of the image: %.3g mm around it are needed", least_reach * width);
        goto done;
    }
    TG_TRY(tg_mtf_intruders(t, solid, centre_mm, 0.5 * s->size_mm, 0, *reach_mm + blur, &list, &n, e));
    for (size_t i = 0; i < n; i++)
        if (list[i].r_mm < list[nearest].r_mm) nearest = i;
    if (n) *reach_mm = fmin(*reach_mm, list[nearest].r_mm - blur);
    if (*reach_mm < least_reach * width)
        tg_mtf_refuse(out, "too near to %s: %.3g mm around it must be clear", tg_intruder_name(t, &list[nearest]),
                      least_reach * width + blur);
done:
    tg_free(list);
    return code;
}

/** Pixels within reach of a centre, and the background under them: a plane. */
static bool gather(const tg_target *t, const double centre_mm[2], double reach_mm, tg_spread *s, tg_mtf *out)
{
    const tg_grid *g = &t->grid;
    const tg_region disc = {.outline = TG_DISC, .centre_mm = {centre_mm[0], centre_mm[1]}, .outer_mm = reach_mm};
    size_t x0, x1, y0, y1;
    tg_region_bounds(&disc, g, &x0, &x1, &y0, &y1);
    s->n = 0;
    s->terms = 3;
    s->flat_mm = 0.375 * reach_mm;
    s->end_mm = 0.75 * reach_mm;
    for (size_t iy = y0; iy < y1; iy++)
        for (size_t ix = x0; ix < x1 && s->n < s->room; ix++) {
            const double dx = tg_grid_mm(g, 0, (double)ix) - centre_mm[0];
            const double dy = tg_grid_mm(g, 1, (double)iy) - centre_mm[1], r = hypot(dx, dy);
            if (r > reach_mm) continue;
            const size_t j = s->n++, k = TG_SPREAD_TERMS * j;
            s->index[j] = iy * g->n[0] + ix;
            if (!tg_mtf_usable(t, s->index[j], out)) return false;
            s->r_mm[j] = r;
            s->phi_rad[j] = atan2(dy, dx);
            s->share[j] = g->step_mm[0] * g->step_mm[1];
            const double plane[3] = {1, dx, dy};
            for (size_t p = 0; p < 3; p++) {
                s->model[k + p] = plane[p];
                s->fit[k + p] = r < 0.625 * reach_mm ? 0 : plane[p];
            }
        }
    if (!tg_spread_settle(s, t->mean)) {
        tg_mtf_refuse(out, "too few pixels around it");
        return false;
    }
    return true;
}

/** A Gaussian as wide as the spread, at a pixel. */
static double weight(const tg_spread *s, size_t j)
{
    return exp(-4 * M_LN2 * pow(s->r_mm[j] / s->width_mm, 2));
}

/** Move the centre to the middle of the spread: the maximum of its product with a Gaussian of like width, which for a
 *  Gaussian is twice the way to the weighted centroid. The search starts at the brightest (or darkest) pixel. */
static bool find_centre(const tg_target *t, double reach_mm, tg_spread *s, double centre_mm[2], tg_mtf *out)
{
    const double place_mm[2] = {centre_mm[0], centre_mm[1]}, width = s->width_mm;
    double peak = -1, step = INFINITY;
    if (!gather(t, centre_mm, reach_mm, s, out)) return false;
    for (size_t j = 0; j < s->n; j++)
        if (s->r_mm[j] < width && fabs(s->net[j]) > peak) {
            peak = fabs(s->net[j]);
            centre_mm[0] = place_mm[0] + s->r_mm[j] * cos(s->phi_rad[j]);
            centre_mm[1] = place_mm[1] + s->r_mm[j] * sin(s->phi_rad[j]);
        }
    for (int i = 0; i < 50 && step > 1e-4 * width; i++) {
        double sum = 0, x = 0, y = 0;
        if (!gather(t, centre_mm, reach_mm, s, out)) return false;
        for (size_t j = 0; j < s->n; j++) {
            const double g = s->net[j] * weight(s, j);
            sum += g;
            x += g * s->r_mm[j] * cos(s->phi_rad[j]);
            y += g * s->r_mm[j] * sin(s->phi_rad[j]);
        }
        centre_mm[0] += 2 * x / sum;
        centre_mm[1] += 2 * y / sum;
        step = hypot(2 * x / sum, 2 * y / sum);
        const double away = hypot(centre_mm[0] - place_mm[0], centre_mm[1] - place_mm[1]);
        if (!(away < width + 2 * t->grid.step_mm[0])) {
            tg_mtf_refuse(out, "not found at its place");
            return false;
        }
    }
    return gather(t, centre_mm, reach_mm, s, out);
}

/** Gather the pixels around the middle of a solid whose image is about so wide; or a why. */
static tg_code gather_around(const tg_target *t, int solid, double size_mm, double width_mm, tg_spread *s,
                             double centre_mm[2], double *reach_mm, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_spread_free(s);
    TG_TRY(tg_spread_create(&t->grid, 0, most_reach * width_mm, s, e));
    s->width_mm = width_mm;
    s->size_mm = size_mm;
    s->kernel = kernel;
    TG_TRY(clear_reach(t, solid, centre_mm, s, reach_mm, out, e));
    if (!*out->level[0].why) find_centre(t, *reach_mm, s, centre_mm, out);
done:
    return code;
}

tg_code tg_mtf_by_point(const tg_target *t, int solid, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_spread s = {0};
    double centre_mm[2], radius_mm, reach_mm = 0;
    double width = fmax(t->spread_mm, fmin(t->grid.step_mm[0], t->grid.step_mm[1]));
    *out = (tg_mtf){0};
    if (!tg_target_circle(t, solid, centre_mm, &radius_mm))
        tg_mtf_refuse(out, "its section is no circle");
    else if (2 * radius_mm > width)
        tg_mtf_refuse(out, "too thick for a wire: %.3g mm across, and the spread is %.3g mm wide", 2 * radius_mm,
                      width);
    /* the spread at the body's edge is only a first guess of its width here */
    for (int pass = 0; pass < 3 && !*out->level[0].why; pass++) {
        TG_TRY(gather_around(t, solid, 2 * radius_mm, width, &s, centre_mm, &reach_mm, out, e));
        if (*out->level[0].why) break;
        s.object = t->phantom->solid[solid].shape == TG_SPHERE ? tg_mtf_ball : tg_mtf_disc;
        TG_TRY(tg_spread_curve(t, &s, &width, out, e));
        if (width == s.width_mm) break;
    }
    if (!out->n) goto done;
    out->region = (tg_region){.outline = TG_DISC, .centre_mm = {centre_mm[0], centre_mm[1]}, .outer_mm = reach_mm};
    TG_TRY(tg_spread_uncertainty(t, &s, out, e));
done:
    tg_spread_free(&s);
    return code;
}

/** What the pixels' sampling may leave in the centre of a spread: the first repetitions of its spectrum. That of a
 *  Gaussian of variance v under one of its own width has the variance v / 2, and its centre of weight strays by
 *  2 pi v / h exp(-pi^2 v / h^2) sin(phase) for each; the maximum of the product is at twice the way. */
static double strays(double width_mm, double step_mm)
{
    const double v = width_mm * width_mm / (8 * M_LN2);
    return 2 * 2 * M_PI * v / step_mm * exp(-M_PI * M_PI * v / (step_mm * step_mm)) * M_SQRT1_2;
}

tg_code tg_point_find(const tg_target *t, int solid, double centre_mm[2], double *u_noise, double *dof,
                      double *u_sampling, char why[200], tg_error *e)
{
    tg_code code = TG_OK;
    tg_spread s = {0};
    tg_mtf out = {0};
    double radius_mm, reach_mm, slope = 0, u2 = 0, *w = NULL;
    if (!tg_target_circle(t, solid, centre_mm, &radius_mm)) tg_mtf_refuse(&out, "its section is no circle");
    const double width = hypot(t->spread_mm, 2 * radius_mm);
    if (!*out.level[0].why) TG_TRY(gather_around(t, solid, 2 * radius_mm, width, &s, centre_mm, &reach_mm, &out, e));
    if (*out.level[0].why) goto done;
    /* the centre c solves sum_j g(r_j) (x_j - c) net_j = 0: what moves that sum by its slope moves c by one */
    TG_TRY(TG_NEW(w, s.n, e));
    for (size_t j = 0; j < s.n; j++)
        slope += weight(&s, j) * s.net[j] * (1 - 4 * M_LN2 * pow(s.r_mm[j] / width, 2));
    for (int axis = 0; axis < 2; axis++) {
        for (size_t j = 0; j < s.n; j++)
            w[j] = weight(&s, j) * s.r_mm[j] * (axis ? sin(s.phi_rad[j]) : cos(s.phi_rad[j])) / slope;
        u2 += 0.5 * pow(tg_spread_noise(t, &s, w, dof), 2);
    }
    *u_noise = sqrt(u2);
    /* between slices each pixel tells its own noise: over all directions (weights 1) half as many again as along one
     * axis (cos^2: <cos^2>^2 / <cos^4> = 2 / 3) */
    if (t->n > 1) *dof *= 1.5;
    *u_sampling = strays(t->spread_mm, fmax(t->grid.step_mm[0], t->grid.step_mm[1]));
    if (!(*u_noise < 0.1 * width)) tg_mtf_refuse(&out, "lost in noise: its place is uncertain by %.2g mm", *u_noise);
done:
    snprintf(why, 200, "%s", out.level[0].why);
    tg_spread_free(&s);
    tg_free(w);
    return code;
}
