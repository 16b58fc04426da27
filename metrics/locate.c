#include "metrics/locate.h"

#include "io/memory.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { LEVELS = 1024, RAYS = 180 };

/** The threshold between two classes of values in [low, high) that parts them best (Otsu 1979). NaN: one class only. */
static double threshold(const float *v, size_t n, double low, double high)
{
    double count[LEVELS] = {0}, total = 0, mean = 0, best = 0, at = NAN;
    const double width = (high - low) / LEVELS;
    if (!(width > 0)) return NAN;
    for (size_t i = 0; i < n; i++) {
        const double level = ((double)v[i] - low) / width;
        if (level >= 0 && level <= LEVELS) count[(int)fmin(level, LEVELS - 1)]++;
    }
    for (int k = 0; k < LEVELS; k++) {
        total += count[k];
        mean += k * count[k];
    }
    mean /= total;
    double below = 0, sum = 0;
    for (int k = 0; k + 1 < LEVELS; k++) {
        below += count[k];
        sum += k * count[k];
        const double part = below / total, between = mean * part - sum / total;
        const double apart = part > 0 && part < 1 ? between * between / (part * (1 - part)) : 0;
        if (apart > best) {
            best = apart;
            at = low + (k + 1) * width;
        }
    }
    return at;
}

/** Mark the pixels at least as high as a level that hang together with one of them, over their sides.
 *  @param mark  0 free; set to `name`  @param stack {n} scratch  @return how many */
static size_t flood(const float *v, const tg_grid *g, double level, size_t seed, int32_t name, int32_t *mark,
                    size_t *stack)
{
    size_t depth = 0, area = 0;
    stack[depth++] = seed;
    mark[seed] = name;
    while (depth) {
        const size_t i = stack[--depth], x = i % g->n[0], y = i / g->n[0];
        const size_t next[4] = {i - 1, i + 1, i - g->n[0], i + g->n[0]};
        const bool there[4] = {x > 0, x + 1 < g->n[0], y > 0, y + 1 < g->n[1]};
        area++;
        for (int k = 0; k < 4; k++) {
            if (!there[k] || mark[next[k]] || !((double)v[next[k]] >= level)) continue;
            mark[next[k]] = name;
            stack[depth++] = next[k];
        }
    }
    return area;
}

/** The largest connected part of the slice above a level.  @return its name in `mark`, its area in pixels */
static int32_t largest(const float *v, const tg_grid *g, double level, int32_t *mark, size_t *stack, size_t *area)
{
    const size_t n = tg_grid_slice(g);
    int32_t name = 0, best = 0;
    *area = 0;
    memset(mark, 0, n * sizeof *mark);
    for (size_t i = 0; i < n; i++) {
        if (mark[i] || !((double)v[i] >= level)) continue;
        const size_t size = flood(v, g, level, i, ++name, mark, stack);
        if (size > *area) {
            *area = size;
            best = name;
        }
    }
    return best;
}

/** Mean position of the marked pixels. */
static void centroid(const int32_t *mark, const tg_grid *g, int32_t name, double centre_mm[2])
{
    double sx = 0, sy = 0, n = 0;
    for (size_t i = 0; i < tg_grid_slice(g); i++) {
        if (mark[i] != name) continue;
        sx += (double)(i % g->n[0]);
        sy += (double)(i / g->n[0]);
        n++;
    }
    centre_mm[0] = tg_grid_mm(g, 0, sx / n);
    centre_mm[1] = tg_grid_mm(g, 1, sy / n);
}

/** Where a ray from outside first meets the marked part; NaN when that is at the border of the image: the outline is
 *  beyond. */
static void meet(const int32_t *mark, const tg_grid *g, int32_t name, const double from_mm[2], double angle,
                 double point_mm[2])
{
    const double c = cos(angle), s = sin(angle), pace = 0.5 * g->step_mm[0];
    bool outside = false;
    point_mm[0] = point_mm[1] = NAN;
    for (double r = hypot((double)g->n[0] * g->step_mm[0], (double)g->n[1] * g->step_mm[1]); r >= 0; r -= pace) {
        const double x = from_mm[0] + r * c, y = from_mm[1] + r * s;
        const double ix = round(tg_grid_index(g, 0, x)), iy = round(tg_grid_index(g, 1, y));
        if (!(ix >= 0 && iy >= 0 && ix < (double)g->n[0] && iy < (double)g->n[1])) continue;
        if (mark[(size_t)iy * g->n[0] + (size_t)ix] == name) {
            if (outside) {
                point_mm[0] = x + 0.5 * pace * c;
                point_mm[1] = y + 0.5 * pace * s;
            }
            return;
        }
        outside = true;
    }
}

/** Fit the coarse points from every turn that an outline may have, and keep the best. */
static bool fit_coarse(const tg_contour_model *m, const double (*point_mm)[2], double *scratch, tg_contour *o)
{
    const tg_contour start = *o;
    const int turns = m->turns ? 36 : 1;
    double best = INFINITY;
    for (int k = 0; k < turns; k++) {
        /* 0, 10, -10, 20, ...: of equal fits the one that turns least is kept */
        tg_contour here = start;
        here.turn_rad = (k % 2 ? 1 : -1) * ((k + 1) / 2) * 2 * M_PI / turns;
        if (!tg_contour_fit(m, point_mm, RAYS, scratch, &here)) continue;
        const double cost = here.scatter_mm / (here.seen * here.seen);
        if (cost < 0.98 * best) {
            best = cost;
            *o = here;
        }
    }
    return isfinite(best);
}

/** Where the body is, to a pixel or so.  @param o  written  @return false: there is none */
static tg_code find_coarse(const tg_contour_model *m, tg_contour *o, char lost[200], tg_error *e)
{
    tg_code code = TG_OK;
    const tg_grid *g = m->grid;
    const size_t n = tg_grid_slice(g);
    const double expected = tg_section_area_mm2(m->solid, m->z_mm) / (g->step_mm[0] * g->step_mm[1]);
    int32_t *mark = NULL;
    size_t *stack = NULL, area = 0;
    double(*point_mm)[2] = NULL, *scratch = NULL;
    TG_TRY(TG_NEW(mark, n, e));
    TG_TRY(TG_NEW(stack, n, e));
    TG_TRY(TG_NEW(point_mm, RAYS, e));
    TG_TRY(TG_NEW(scratch, 2 * RAYS, e));

    double low = INFINITY, high = -INFINITY;
    for (size_t i = 0; i < n; i++) {
        if (!isfinite(m->image[i])) continue;
        low = fmin(low, (double)m->image[i]);
        high = fmax(high, (double)m->image[i]);
    }
    /* dense solids may part the values above the body's: while what stands out is too small, look lower */
    int32_t body = 0;
    for (int k = 0; k < 5 && (double)area < 0.5 * fmin(expected, (double)n); k++) {
        high = threshold(m->image, n, low, high);
        if (isnan(high)) break;
        body = largest(m->image, g, high, mark, stack, &area);
    }
    if (!area) {
        snprintf(lost, 200, "the image is empty: no part of it stands out");
        goto done;
    }
    *o = (tg_contour){.scale = 1};
    centroid(mark, g, body, o->centre_mm);
    for (size_t k = 0; k < RAYS; k++)
        meet(mark, g, body, o->centre_mm, 2 * M_PI * (double)k / RAYS, point_mm[k]);
    if (!fit_coarse(m, (const double(*)[2])point_mm, scratch, o))
        snprintf(lost, 200, "no outline like that of the body '%s' is in the image", m->solid->name.v);
done:
    tg_free(mark);
    tg_free(stack);
    tg_free(point_mm);
    tg_free(scratch);
    return code;
}

/** Why an outline is not that of the body; lost stays empty when it is. */
static void doubt(const tg_contour_model *m, const tg_contour *o, char lost[200])
{
    const char *name = m->solid->name.v;
    const double across = 2 * sqrt(tg_section_area_mm2(m->solid, m->z_mm) / M_PI);
    if (o->seen < 1.0 / 3)
        snprintf(lost, 200, "only %.0f %% of the outline of the body '%s' is in the image", 100 * o->seen, name);
    else if (o->gap_rad > 150 * M_PI / 180)
        snprintf(lost, 200, "%.0f degrees of the outline of the body '%s' on end are not in the image",
                 o->gap_rad * 180 / M_PI, name);
    else if (fabs(o->scale - 1) > 0.05)
        snprintf(lost, 200,
                 "the body measures %.4g mm across, '%s' of the phantom %.4g mm: another phantom, or wrong pixels",
                 o->scale * across, name, across);
    else if (!(o->inside > o->outside))
        snprintf(lost, 200, "the body '%s' is not denser than what is around it", name);
    else if (o->scatter_mm > fmax(2 * m->grid->step_mm[0], 0.01 * across))
        snprintf(lost, 200, "the outline does not have the shape of the body '%s': it strays by %.2g mm", name,
                 o->scatter_mm);
}

/** The body's outline to a small part of a pixel, and the spread across it. */
static tg_code find_fine(tg_contour_model *m, tg_contour *o, char lost[200], tg_error *e)
{
    tg_code code = TG_OK;
    double spread;
    bool found;
    for (int k = 0; k < 2; k++) {
        TG_TRY(tg_contour_find(m, o, &found, e));
        if (!found)
            snprintf(lost, 200, "the edge of the body '%s' does not stand out", m->solid->name.v);
        else
            doubt(m, o, lost);
        if (*lost) goto done;
        TG_TRY(tg_contour_spread(m, o, &spread, e));
        if (!isnan(spread)) m->spread_mm = spread;
        m->width_mm = fmax(4 * m->spread_mm, 6 * m->grid->step_mm[0]);
    }
done:
    return code;
}

double tg_locate_energy_kev(const tg_facts *facts)
{
    if (facts->energy_kev.v > 0) return facts->energy_kev.v;
    return facts->tube_kv.v > 0 ? 0.5 * facts->tube_kv.v : 70;
}

tg_code tg_locate(const tg_image *image, const float *slice, const tg_phantom *phantom, double z_mm, tg_located *out,
                  tg_error *e)
{
    tg_code code = TG_OK;
    const double pixel = image->grid.step_mm[0];
    tg_contour_model m = {.solid = &phantom->solid[0],
                          .z_mm = z_mm,
                          .width_mm = 12 * pixel,
                          .spread_mm = 3 * pixel,
                          .image = slice,
                          .grid = &image->grid};
    tg_contour o;
    double *mu = NULL, radius, middle[2];
    *out = (tg_located){.spread_mm = NAN};
    m.round = tg_section_circle(m.solid, z_mm, m.middle_mm, &radius);
    m.turns = !m.round;
    m.width_mm = fmin(m.width_mm, 0.8 * radius);
    if (radius < 10 * pixel) {
        snprintf(out->lost, sizeof out->lost, "the body '%s' is less than 20 pixels wide", m.solid->name.v);
        goto done;
    }
    TG_TRY(TG_NEW(mu, phantom->n_materials, e));
    TG_TRY(tg_phantom_mu(phantom, tg_locate_energy_kev(&image->facts), mu, e));
    TG_TRY(find_coarse(&m, &o, out->lost, e));
    if (*out->lost) goto done;
    TG_TRY(find_fine(&m, &o, out->lost, e));
    if (*out->lost) goto done;
    out->spread_mm = m.spread_mm;
    TG_TRY(tg_locate_turn(&m, &o, phantom, mu, out, e));
    if (*out->lost) goto done;
    tg_pose_to_image(&(tg_pose){.turn_rad = out->pose.turn_rad}, m.middle_mm, middle);
    for (int a = 0; a < 2; a++)
        out->pose.shift_mm[a] = o.centre_mm[a] - middle[a];
    out->shift_u_mm = hypot(o.centre_u_mm, out->turn_u_rad * hypot(middle[0], middle[1]));
done:
    tg_free(mu);
    return code;
}
