/* The spread of a circular edge (Richard et al. 2012; ASTM E1695), as one sum over the pixels of an annulus.
 *
 * A disc of radius R and contrast c, spread by a point spread of modulation m(f), has the radial profile
 *     g(r) = 2 pi c R Int m(f) J1(2 pi R f) J0(2 pi r f) df,    -g'(r) = (2 pi)^2 c R Int m(f) f J1(2 pi R f) J1(2 pi r
 * f) df. With the two leading orders of J1 for large arguments the product of the two is cos(2 pi f (r - R)) / (2 pi^2
 * f sqrt(r R)) next to the edge, so that -g'(r) sqrt(r / R) = 2 c Int m(f) cos(2 pi f x) df,    x = r - R, is the line
 * spread of a straight edge but for terms of second order in width / R, and those are the same at all frequencies for a
 * Gaussian. With a taper w(x) and h = sqrt(r / R) w cos(2 pi f x), integration by parts moves the derivative from the
 * noisy profile to the known kernel, m(f) ~ Int g h' dr, and dr = dA / (2 pi r) makes it a sum over pixels. */
#include "io/memory.h"
#include "metrics/mtf.h"

#include <gsl/gsl_linalg.h>
#include <math.h>

enum { SECTORS = 720 };

/* In widths of the spread (full width at half maximum). The taper is flat to 2/5 of the reach, where the straight lines
 * begin that are fitted to both sides. */
static const double most_reach = 5, least_radius = 4, skirt = 1.5;

/** How much each direction counts: 1 where the annulus is clear, falling smoothly to 0 where it is not. */
typedef struct {
    double amount[SECTORS], mean;
} directions;

static double h_slope(const tg_spread *s, double r_mm, double f_per_mm, bool odd)
{
    const double x = r_mm - s->radius_mm, turn = 2 * M_PI * f_per_mm;
    double fall;
    const double w = tg_taper(x, s->flat_mm, s->end_mm, &fall);
    if (w <= 0) return 0;
    const double wave = odd ? sin(turn * x) : cos(turn * x), rise = turn * (odd ? cos(turn * x) : -sin(turn * x));
    return sqrt(r_mm / s->radius_mm) * (wave * (fall + w / (2 * r_mm)) + w * rise);
}

static double kernel(const tg_spread *s, double r_mm, double f_per_mm)
{
    return h_slope(s, r_mm, f_per_mm, false);
}

static double amount_at(const directions *d, double phi_rad)
{
    const double at = (phi_rad / (2 * M_PI) + 1) * SECTORS;
    const double below = floor(at), part = at - below;
    const size_t i = (size_t)below % SECTORS;
    return (1 - part) * d->amount[i] + part * d->amount[(i + 1) % SECTORS];
}

static void block(bool *blocked, double phi_rad, double half_rad)
{
    const long middle = lround((phi_rad / (2 * M_PI) + 1) * SECTORS);
    const long half = (long)ceil(fmin(half_rad / (2 * M_PI), 0.5) * SECTORS);
    for (long i = middle - half; i <= middle + half; i++)
        blocked[(i + SECTORS) % SECTORS] = true;
}

/** Directions whose part of the annulus is clear of other solids with their skirts, and on the image. */
static tg_code look_around(const tg_target *t, int solid, const double centre_mm[2], const tg_spread *s, directions *d,
                           tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    bool blocked[SECTORS] = {false};
    tg_intruder *list = NULL;
    size_t n = 0;
    const double blur = skirt * s->width_mm, far = s->radius_mm + s->end_mm;
    const double from = fmax(0, s->radius_mm - s->end_mm - blur);
    TG_TRY(tg_mtf_intruders(t, solid, centre_mm, s->radius_mm, from, far + blur, &list, &n, e));
    for (size_t i = 0; i < n; i++)
        block(blocked, list[i].phi_rad, list[i].r_mm > blur ? asin(blur / list[i].r_mm) : M_PI);
    for (int i = 0; i < SECTORS; i++) {
        const double phi = 2 * M_PI * i / SECTORS;
        const double way[2] = {cos(phi), sin(phi)};
        for (int axis = 0; axis < 2; axis++) {
            const double index = tg_grid_index(&t->grid, axis, centre_mm[axis] + far * way[axis]);
            if (index < 0 || index > (double)t->grid.n[axis] - 1) block(blocked, phi, 0);
        }
    }
    /* the ends of an arc fade over four widths of the spread, so that the sum over pixels stays smooth */
    const double fade = fmin(fmax(4 * s->width_mm / (2 * M_PI * s->radius_mm) * SECTORS, 4), 0.25 * SECTORS);
    d->mean = 0;
    for (int i = 0; i < SECTORS; i++) {
        int gap = 0;
        while (gap < fade && !blocked[(i + gap) % SECTORS] && !blocked[(i - gap + SECTORS) % SECTORS])
            gap++;
        d->amount[i] = 1 - tg_taper(gap, 0, fade, NULL);
        d->mean += d->amount[i] / SECTORS;
    }
    if (d->mean < 0.4)
        tg_mtf_refuse(out, "only %.0f %% of its edge are clear of %s and the end of the image", 100 * d->mean,
                      n ? tg_intruder_name(t, &list[0]) : "other solids");
done:
    tg_free(list);
    return code;
}

/** Pixels of the annulus. The background that is taken away is the slope of each side, and the middle of the step. */
static bool gather(const tg_target *t, const double centre_mm[2], const directions *d, tg_spread *s, tg_mtf *out)
{
    const tg_grid *g = &t->grid;
    const double r0 = s->radius_mm - s->end_mm, r1 = s->radius_mm + s->end_mm;
    const double area = g->step_mm[0] * g->step_mm[1], tiny = 0.5 * g->step_mm[0];
    const tg_region disc = {.outline = TG_DISC, .centre_mm = {centre_mm[0], centre_mm[1]}, .outer_mm = r1};
    size_t x0, x1, y0, y1;
    tg_region_bounds(&disc, g, &x0, &x1, &y0, &y1);
    s->n = 0;
    s->terms = 4;
    for (size_t iy = y0; iy < y1; iy++)
        for (size_t ix = x0; ix < x1; ix++) {
            const double dx = tg_grid_mm(g, 0, (double)ix) - centre_mm[0];
            const double dy = tg_grid_mm(g, 1, (double)iy) - centre_mm[1], r2 = dx * dx + dy * dy;
            if (r2 > r1 * r1 || (r0 > 0 && r2 < r0 * r0) || r2 < tiny * tiny) continue;
            const double phi = atan2(dy, dx), amount = amount_at(d, phi), r = sqrt(r2);
            if (amount <= 0 || s->n == s->room) continue;
            const size_t j = s->n++;
            s->index[j] = iy * g->n[0] + ix;
            if (!tg_mtf_usable(t, s->index[j], out)) return false;
            s->r_mm[j] = r;
            s->phi_rad[j] = phi;
            s->share[j] = area * amount / (2 * M_PI * r * d->mean);
            const double x = r - s->radius_mm;
            double *fit = s->fit + TG_SPREAD_TERMS * j, *model = s->model + TG_SPREAD_TERMS * j;
            for (int p = 0; p < TG_SPREAD_TERMS; p++)
                fit[p] = model[p] = 0;
            const int side = x < 0 ? 0 : 2;
            if (fabs(x) > s->flat_mm) {
                fit[side] = 1;
                fit[side + 1] = x;
            }
            model[0] = model[2] = 0.5;
            model[side + 1] = x;
        }
    if (!tg_spread_settle(s, t->mean)) {
        tg_mtf_refuse(out, "too few pixels at its edge");
        return false;
    }
    return true;
}

/** Move centre and radius to where the edge is. An edge displaced by q shows it in the phase 2 pi f q of its spectrum;
 *  q = a + b cos(phi) + c sin(phi) is fitted over all directions. */
static bool find_edge(const tg_target *t, const directions *d, tg_spread *s, double centre_mm[2], tg_mtf *out)
{
    const double place_mm[2] = {centre_mm[0], centre_mm[1]}, radius_mm = s->radius_mm, f = 0.25 / s->width_mm;
    double step = INFINITY, shape[9] = {0};
    for (int i = 0; i < SECTORS; i++) {
        const double phi = 2 * M_PI * i / SECTORS, b[3] = {1, cos(phi), sin(phi)};
        for (int p = 0; p < 9; p++)
            shape[p] += d->amount[i] * b[p / 3] * b[p % 3] / (SECTORS * d->mean);
    }
    gsl_matrix_view normal = gsl_matrix_view_array(shape, 3, 3);
    const bool solvable = !gsl_linalg_cholesky_decomp1(&normal.matrix);
    for (int i = 0; i < 20 && solvable; i++) {
        if (!gather(t, centre_mm, d, s, out)) return false;
        if (step < 1e-4 * s->width_mm) return true;
        double q[3] = {0};
        const double whole = 2 * M_PI * f * tg_spread_sum(s, f);
        for (size_t j = 0; j < s->n; j++) {
            const double odd = h_slope(s, s->r_mm[j], f, true) * s->share[j] * s->net[j] / whole;
            q[0] += odd;
            q[1] += odd * cos(s->phi_rad[j]);
            q[2] += odd * sin(s->phi_rad[j]);
        }
        gsl_vector_view q_view = gsl_vector_view_array(q, 3);
        if (gsl_linalg_cholesky_svx(&normal.matrix, &q_view.vector)) break;
        s->radius_mm += q[0];
        centre_mm[0] += q[1];
        centre_mm[1] += q[2];
        step = fabs(q[0]) + hypot(q[1], q[2]);
        const double away = hypot(centre_mm[0] - place_mm[0], centre_mm[1] - place_mm[1]);
        if (!(away + fabs(s->radius_mm - radius_mm) < 2 * s->width_mm + 2 * t->grid.step_mm[0])) break;
    }
    tg_mtf_refuse(out, "its edge was not found at its place");
    return false;
}

tg_code tg_mtf_by_edge(const tg_target *t, int solid, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_spread s = {0};
    directions d;
    double centre_mm[2], radius_mm;
    const double step = fmin(t->grid.step_mm[0], t->grid.step_mm[1]);
    *out = (tg_mtf){0};
    if (!tg_target_circle(t, solid, centre_mm, &radius_mm)) {
        tg_mtf_refuse(out, "its section is no circle");
        goto done;
    }
    double width = fmax(t->spread_mm, step);
    /* the spread at the body's edge is only a first guess of its width here */
    for (int pass = 0; pass < 3; pass++) {
        if (radius_mm < least_radius * width) {
            tg_mtf_refuse(
                out, "it has no edge of its own: its radius of %.3g mm is less than %g widths of the spread (%.3g mm)",
                radius_mm, least_radius, width);
            goto done;
        }
        /* not to the centre, where the pixels are too few to stand for an integral over directions */
        const double reach = fmin(most_reach * width, 0.9 * radius_mm), play = reach + 2 * width + 2 * step;
        tg_spread_free(&s);
        TG_TRY(tg_spread_create(&t->grid, radius_mm - play, radius_mm + play, &s, e));
        s.width_mm = width;
        s.kernel = kernel;
        s.radius_mm = radius_mm;
        s.end_mm = reach;
        s.flat_mm = 0.4 * reach;
        TG_TRY(look_around(t, solid, centre_mm, &s, &d, out, e));
        if (*out->level[0].why || !find_edge(t, &d, &s, centre_mm, out)) goto done;
        radius_mm = s.radius_mm;
        TG_TRY(tg_spread_curve(t, &s, &width, out, e));
        if (!out->n) goto done;
        if (width == s.width_mm) break;
    }
    out->region = (tg_region){.outline = TG_RING,
                              .centre_mm = {centre_mm[0], centre_mm[1]},
                              .inner_mm = fmax(0, radius_mm - s.end_mm),
                              .outer_mm = radius_mm + s.end_mm};
    TG_TRY(tg_spread_uncertainty(t, &s, out, e));
done:
    tg_spread_free(&s);
    return code;
}
