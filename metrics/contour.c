#include "metrics/contour.h"

#include "io/memory.h"
#include "metrics/sample.h"

#include <gsl/gsl_linalg.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>

enum { PARAMETERS = 4 }; /* x, y, scale, turn */

/** The model outline seen from the centre in one direction of the image. */
typedef struct {
    double radius_mm, cosine; /* cosine of the angle between the ray and the outline's normal */
    double normal[2], slope;  /* outward normal; dr/dangle */
} ray;

static double radius(const tg_contour_model *m, const tg_contour *o, double angle)
{
    return o->scale * tg_section_radius(m->solid, m->z_mm, m->middle_mm, angle - o->turn_rad);
}

static ray look(const tg_contour_model *m, const tg_contour *o, double angle)
{
    const double h = 1e-3;
    ray r = {.radius_mm = radius(m, o, angle)};
    if (!m->round) r.slope = (radius(m, o, angle + h) - radius(m, o, angle - h)) / (2 * h);
    const double normal = angle - atan2(r.slope, r.radius_mm);
    r.cosine = cos(angle - normal);
    r.normal[0] = cos(normal);
    r.normal[1] = sin(normal);
    return r;
}

/** Distance of a point from the model outline along its normal, and how it changes with the parameters. */
static double distance(const tg_contour_model *m, const tg_contour *o, const double point_mm[2],
                       double change[PARAMETERS])
{
    const double x = point_mm[0] - o->centre_mm[0], y = point_mm[1] - o->centre_mm[1];
    const ray r = look(m, o, atan2(y, x));
    change[0] = r.normal[0];
    change[1] = r.normal[1];
    change[2] = r.radius_mm * r.cosine / o->scale;
    change[3] = -r.slope * r.cosine;
    return (hypot(x, y) - r.radius_mm) * r.cosine;
}

/** Solve the normal equations; a becomes the inverse.  @return false: they are singular */
static bool solve(size_t n, double a[PARAMETERS * PARAMETERS], const double b[PARAMETERS], double x[PARAMETERS])
{
    gsl_matrix_view matrix = gsl_matrix_view_array_with_tda(a, n, n, PARAMETERS);
    if (gsl_linalg_cholesky_decomp1(&matrix.matrix) || gsl_linalg_cholesky_invert(&matrix.matrix)) return false;
    for (size_t i = 0; i < n; i++) {
        x[i] = 0;
        for (size_t j = 0; j < n; j++)
            x[i] += a[i * PARAMETERS + j] * b[j];
        if (!isfinite(x[i])) return false;
    }
    return true;
}

/** Scale of the scatter: 1.4826 times the median of the absolute distances; NaN counts for nothing. */
static double robust_scatter(const double *d, size_t n, double *scratch)
{
    size_t used = 0;
    for (size_t i = 0; i < n; i++)
        if (!isnan(d[i])) scratch[used++] = fabs(d[i]);
    if (!used) return 0;
    gsl_sort(scratch, 1, used);
    return 1.4826 * gsl_stats_median_from_sorted_data(scratch, 1, used);
}

/** What the final distances say of the fit. @param d {n} their distances, NaN: outlier or not seen  @param a inverse */
static void judge_fit(const tg_contour_model *m, const double (*point_mm)[2], const double *d, size_t n, size_t free,
                      const double a[PARAMETERS * PARAMETERS], double *scratch, tg_contour *o)
{
    double sum = 0, neighbours = 0;
    size_t used = 0;
    for (size_t i = 0; i < n; i++) {
        if (isnan(d[i])) continue;
        const double next = d[(i + 1) % n];
        sum += d[i] * d[i];
        if (!isnan(next)) neighbours += d[i] * next;
        scratch[used++] = atan2(point_mm[i][1] - o->centre_mm[1], point_mm[i][0] - o->centre_mm[0]);
    }
    gsl_sort(scratch, 1, used);
    o->gap_rad = 2 * M_PI;
    if (used) {
        o->gap_rad = scratch[0] + 2 * M_PI - scratch[used - 1];
        for (size_t i = 1; i < used; i++)
            o->gap_rad = fmax(o->gap_rad, scratch[i] - scratch[i - 1]);
    }
    o->seen = (double)used / (double)n;
    for (size_t i = 0; i < n; i++)
        scratch[i] = d[(i + 1) % n] - d[i];
    o->jitter_mm = robust_scatter(scratch, n, scratch) / M_SQRT2;
    /* neighbouring directions hang together: as in an autoregressive series, their number counts less */
    const double hang = sum > 0 ? fmin(fmax(neighbours / sum, 0), 0.9) : 0, loss = (1 + hang) / (1 - hang);
    o->dof = fmax(((double)used - (double)free) / loss, 1);
    o->scatter_mm = sqrt(sum / fmax((double)used - (double)free, 1));
    const double u = o->scatter_mm * sqrt(loss);
    o->centre_u_mm = u * sqrt(0.5 * (a[0] + a[PARAMETERS + 1]));
    o->scale_u = u * sqrt(a[2 * PARAMETERS + 2]);
    o->turn_u_rad = m->turns ? u * sqrt(a[3 * PARAMETERS + 3]) : 0;
}

/** One step of Gauss-Newton with weights.  @param a  the inverse of the normal equations  @return false: singular */
static bool step(const tg_contour_model *m, const double (*point_mm)[2], double *d, size_t n, size_t free,
                 double *scratch, double a[PARAMETERS * PARAMETERS], tg_contour *o, double *moved_mm)
{
    double change[PARAMETERS], b[PARAMETERS] = {0}, x[PARAMETERS] = {0};
    for (size_t i = 0; i < n; i++)
        d[i] = isnan(point_mm[i][0]) ? (double)NAN : distance(m, o, point_mm[i], change);
    /* a fiftieth of a pixel: where noise is absent the grid still leaves its own marks */
    const double reach = 4.685 * fmax(robust_scatter(d, n, scratch), 0.02 * m->grid->step_mm[0]);
    for (size_t i = 0; i < PARAMETERS * PARAMETERS; i++)
        a[i] = 0;
    for (size_t i = 0; i < n; i++) {
        if (!(fabs(d[i]) < reach)) {
            d[i] = NAN;
            continue;
        }
        const double part = d[i] / reach, weight = (1 - part * part) * (1 - part * part);
        distance(m, o, point_mm[i], change);
        for (size_t j = 0; j < free; j++) {
            b[j] += weight * change[j] * d[i];
            for (size_t k = 0; k < free; k++)
                a[j * PARAMETERS + k] += weight * change[j] * change[k];
        }
    }
    if (!solve(free, a, b, x)) return false;
    o->centre_mm[0] += x[0];
    o->centre_mm[1] += x[1];
    o->scale = fmin(fmax(o->scale + x[2], 0.5 * o->scale), 2 * o->scale);
    o->turn_rad += x[3];
    *moved_mm = hypot(x[0], x[1]) + (fabs(x[2]) + fabs(x[3])) * radius(m, o, 0);
    return true;
}

bool tg_contour_fit(const tg_contour_model *m, const double (*point_mm)[2], size_t n, double *scratch, tg_contour *o)
{
    const size_t free = m->turns ? 4 : 3;
    double a[PARAMETERS * PARAMETERS], moved = INFINITY;
    double *d = scratch, *sorted = scratch + n;
    for (int k = 0; k < 30 && moved > 1e-4 * m->grid->step_mm[0]; k++)
        if (!step(m, point_mm, d, n, free, sorted, a, o, &moved)) return false;
    judge_fit(m, point_mm, d, n, free, a, sorted, o);
    return o->seen * (double)n > (double)free;
}

/** The profiles across the outline: directions are arcs, each with the mean profile of its rays. */
typedef struct {
    size_t arcs, rays, samples; /* rays per arc; samples per profile */
    double step_mm;             /* between samples; sample j is at (j - samples / 2) step_mm from the outline */
    double *profile, *count;    /* {samples} of one arc, and how many rays are behind it */
    double *inside, *outside;   /* {arcs} levels, NaN: not seen */
    double *cross_mm;           /* {arcs} where the half of the step is, along the ray; NaN: nowhere */
    double (*point_mm)[2];      /* {arcs} the same in the image */
    double *scratch;            /* {2 arcs} */
} profiles;

static void profiles_free(profiles *p)
{
    tg_free(p->profile);
    tg_free(p->count);
    tg_free(p->inside);
    tg_free(p->outside);
    tg_free(p->cross_mm);
    tg_free(p->point_mm);
    tg_free(p->scratch);
    *p = (profiles){0};
}

static tg_code profiles_create(const tg_contour_model *m, profiles *p, tg_error *e)
{
    tg_code code = TG_OK;
    const double around = 2 * sqrt(M_PI * tg_section_area_mm2(m->solid, m->z_mm)), step_mm = m->grid->step_mm[0];
    *p = (profiles){.step_mm = 0.25 * step_mm};
    /* arcs of four spread widths: noise hardly hangs together from one to the next */
    p->arcs = (size_t)fmin(fmax(around / (4 * m->spread_mm), 16), 96);
    p->rays = (size_t)ceil(fmin(around / step_mm, 1e5) / (double)p->arcs) + 1;
    p->samples = 2 * (size_t)fmin(m->width_mm / p->step_mm, 1e4) + 1;
    TG_TRY(TG_NEW(p->profile, p->samples, e));
    TG_TRY(TG_NEW(p->count, p->samples, e));
    TG_TRY(TG_NEW(p->inside, p->arcs, e));
    TG_TRY(TG_NEW(p->outside, p->arcs, e));
    TG_TRY(TG_NEW(p->cross_mm, p->arcs, e));
    TG_TRY(TG_NEW(p->point_mm, p->arcs, e));
    TG_TRY(TG_NEW(p->scratch, 2 * p->arcs, e));
done:
    if (code != TG_OK) profiles_free(p);
    return code;
}

static double offset_mm(const profiles *p, size_t j)
{
    return ((double)j - (double)(p->samples / 2)) * p->step_mm;
}

static double arc_angle(const profiles *p, double arc)
{
    return 2 * M_PI * arc / (double)p->arcs;
}

/** Mean profile of an arc; NaN where fewer than half of its rays lie in the image. */
static void take_profile(const tg_contour_model *m, const tg_contour *o, size_t arc, profiles *p)
{
    for (size_t j = 0; j < p->samples; j++)
        p->profile[j] = p->count[j] = 0;
    for (size_t i = 0; i < p->rays; i++) {
        const double angle = arc_angle(p, (double)arc + ((double)i + 0.5) / (double)p->rays - 0.5);
        const double c = cos(angle), s = sin(angle), r = radius(m, o, angle);
        for (size_t j = 0; j < p->samples; j++) {
            const double ray_mm = r + offset_mm(p, j);
            const double point[2] = {o->centre_mm[0] + ray_mm * c, o->centre_mm[1] + ray_mm * s};
            const double v = tg_sample(m->image, m->grid, point);
            if (isnan(v)) continue;
            p->profile[j] += v;
            p->count[j]++;
        }
    }
    for (size_t j = 0; j < p->samples; j++)
        p->profile[j] = 2 * p->count[j] >= (double)p->rays ? p->profile[j] / p->count[j] : (double)NAN;
}

/** Mean of a profile between two distances from the outline; NaN where nothing is seen of it. */
static double level(const profiles *p, double from_mm, double to_mm)
{
    double sum = 0;
    size_t n = 0;
    for (size_t j = 0; j < p->samples; j++) {
        const double at = offset_mm(p, j);
        if (at < from_mm || at > to_mm || isnan(p->profile[j])) continue;
        sum += p->profile[j];
        n++;
    }
    return sum / (double)n;
}

/** The first crossing of half of the step on the way from outside inwards; NaN: none. */
static double crossing(const profiles *p, double inside, double outside)
{
    const double half = 0.5 * (inside + outside), sign = inside > outside ? 1 : -1;
    double before = NAN;
    for (size_t j = p->samples; j-- > 0;) {
        const double above = sign * (p->profile[j] - half);
        if (above >= 0) return offset_mm(p, j) + p->step_mm * above / (above - before);
        before = above;
    }
    return NAN;
}

static double median(const double *v, size_t n, double *scratch)
{
    size_t used = 0;
    for (size_t i = 0; i < n; i++)
        if (!isnan(v[i])) scratch[used++] = v[i];
    if (!used) return NAN;
    gsl_sort(scratch, 1, used);
    return gsl_stats_median_from_sorted_data(scratch, 1, used);
}

/** Levels and crossings of every arc, about the outline as it is known. */
static void cross(const tg_contour_model *m, tg_contour *o, profiles *p)
{
    const double clear = 1.5 * m->spread_mm;
    for (size_t k = 0; k < p->arcs; k++) {
        take_profile(m, o, k, p);
        p->inside[k] = level(p, -INFINITY, -clear);
        p->outside[k] = level(p, clear, INFINITY);
        p->cross_mm[k] = crossing(p, p->inside[k], p->outside[k]);
    }
    o->inside = median(p->inside, p->arcs, p->scratch);
    o->outside = median(p->outside, p->arcs, p->scratch);
    for (size_t k = 0; k < p->arcs; k++) {
        /* a step of half or twice the usual height is something else */
        const double part = (p->inside[k] - p->outside[k]) / (o->inside - o->outside);
        if (!(part > 0.5 && part < 2)) p->cross_mm[k] = NAN;
        const double angle = arc_angle(p, (double)k), r = radius(m, o, angle) + p->cross_mm[k];
        p->point_mm[k][0] = o->centre_mm[0] + r * cos(angle);
        p->point_mm[k][1] = o->centre_mm[1] + r * sin(angle);
    }
}

tg_code tg_contour_find(const tg_contour_model *m, tg_contour *o, bool *found, tg_error *e)
{
    tg_code code = TG_OK;
    profiles p;
    TG_TRY(profiles_create(m, &p, e));
    *found = true;
    double moved = INFINITY;
    for (int k = 0; k < 8 && *found && moved > 1e-3 * m->grid->step_mm[0]; k++) {
        const tg_contour before = *o;
        cross(m, o, &p);
        *found = tg_contour_fit(m, (const double(*)[2])p.point_mm, p.arcs, p.scratch, o);
        moved = hypot(o->centre_mm[0] - before.centre_mm[0], o->centre_mm[1] - before.centre_mm[1]) +
                (fabs(o->scale - before.scale) + fabs(o->turn_rad - before.turn_rad)) * radius(m, o, 0);
    }
    profiles_free(&p);
done:
    return code;
}

enum { FINE = 8, SIDE = 4 }; /* bins per pixel of the edge spread; bins on each side that a slope is fitted to */

/** Add every pixel near the outline to the bin of its own distance, as a part of the local step. */
static void spread_bins(const tg_contour_model *m, const tg_contour *o, const profiles *p, double *sum, double *count,
                        size_t bins)
{
    const tg_grid *g = m->grid;
    const double bin_mm = g->step_mm[0] / FINE, half_mm = 0.5 * (double)bins * bin_mm;
    double middle[2], inner, outer = 0;
    tg_section_circle(m->solid, m->z_mm, middle, &inner);
    for (int k = 0; k < 360; k++)
        outer = fmax(outer, radius(m, o, k * M_PI / 180));
    for (size_t y = 0; y < g->n[1]; y++) {
        for (size_t x = 0; x < g->n[0]; x++) {
            const double at[2] = {tg_grid_mm(g, 0, (double)x), tg_grid_mm(g, 1, (double)y)};
            const double dx = at[0] - o->centre_mm[0], dy = at[1] - o->centre_mm[1], r = hypot(dx, dy);
            if (r < o->scale * inner - half_mm || r > outer + 2 * half_mm) continue;
            const double angle = atan2(dy, dx);
            const double turn = angle < 0 ? angle + 2 * M_PI : angle;
            const size_t k = (size_t)(turn / (2 * M_PI) * (double)p->arcs + 0.5) % p->arcs;
            double change[PARAMETERS];
            if (!(fabs(p->cross_mm[k]) < fmax(4 * o->scatter_mm, 0.2 * g->step_mm[0]))) continue;
            const double place = (distance(m, o, at, change) + half_mm) / bin_mm;
            const double part = ((double)m->image[y * g->n[0] + x] - p->outside[k]) / (p->inside[k] - p->outside[k]);
            if (!(place >= 0 && place < (double)bins) || isnan(part)) continue;
            sum[(size_t)place] += part;
            count[(size_t)place]++;
        }
    }
}

/** Full width at half maximum of a peak [samples], by linear interpolation; NaN where it does not fall to the half. */
static double half_width(const double *v, size_t n)
{
    size_t top = 0;
    for (size_t i = 1; i < n; i++)
        if (v[i] > v[top]) top = i;
    const double half = 0.5 * v[top];
    size_t a = top, b = top;
    while (a > 0 && v[a] > half)
        a--;
    while (b + 1 < n && v[b] > half)
        b++;
    if (v[a] > half || v[b] > half || a == top || b == top) return NAN;
    const double left = (double)a + (half - v[a]) / (v[a + 1] - v[a]);
    const double right = (double)b - (half - v[b]) / (v[b - 1] - v[b]);
    return right - left;
}

tg_code tg_contour_spread(const tg_contour_model *m, const tg_contour *o, double *spread_mm, tg_error *e)
{
    tg_code code = TG_OK;
    profiles p = {0};
    tg_contour here = *o;
    double *sum = NULL, *count = NULL, *slope = NULL;
    const double bin_mm = m->grid->step_mm[0] / FINE;
    const size_t bins = (size_t)fmin(2 * m->width_mm / bin_mm, 1e5);
    TG_TRY(profiles_create(m, &p, e));
    TG_TRY(TG_NEW(sum, bins, e));
    TG_TRY(TG_NEW(count, bins, e));
    TG_TRY(TG_NEW(slope, bins, e));
    cross(m, &here, &p);
    spread_bins(m, o, &p, sum, count, bins);
    for (size_t i = 0; i < bins; i++)
        sum[i] /= count[i];
    /* minus the slope of a line through 2 SIDE + 1 bins (Savitzky and Golay 1964) */
    for (size_t i = SIDE; i + SIDE < bins; i++)
        for (size_t k = 1; k <= SIDE; k++)
            slope[i] += (double)k * (sum[i - k] - sum[i + k]);
    const double wide = half_width(slope, bins) * bin_mm;
    /* which widens the peak as a parabola of that half width does: its variance is a fifth of the square */
    const double own = (SIDE + 0.5) * bin_mm, square = wide * wide - 8 * M_LN2 * own * own / 5;
    const double least = 1.2 * m->grid->step_mm[0];
    *spread_mm = isnan(wide) ? (double)NAN : sqrt(fmax(square, least * least));
done:
    tg_free(sum);
    tg_free(count);
    tg_free(slope);
    profiles_free(&p);
    return code;
}
