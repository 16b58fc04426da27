#include "io/memory.h"
#include "metrics/locate.h"
#include "metrics/sample.h"
#include "recon/fft.h"

#include <complex.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>

enum { ANGLES = 4096, MOST_RINGS = 400, MOST_PIXELS = 2048 };

/** The inside of the body in rings about its middle: the slice, and the phantom as it should look. Contrast against the
 *  body as a part of the step at its edge, about the mean of the ring; 0 near the outline. Angle 0 of the slice is the
 *  turn of the outline as it was found (0 for a round one), that of the phantom its own. */
typedef struct {
    size_t rings;
    double step_mm;
    float *slice, *drawn; /* {rings, ANGLES} */
} polar;

/** How slice and phantom agree over the turn [contrast squared mm2]. */
typedef struct {
    double cross[ANGLES]; /* slice and phantom turned by an angle */
    double own[ANGLES];   /* phantom and phantom turned by an angle */
    double mirrored;      /* slice and mirror image of the phantom, in the turn that is best */
    double area_mm2;
    double noise;    /* SD of the slice's contrast about the phantom in its best turn */
    double likeness; /* correlation coefficient of the two where the phantom's pattern is strong, noise apart */
} agreement;

static double ring_mm(const polar *p, size_t ring)
{
    return ((double)ring + 1) * p->step_mm;
}

/** Blur along the lines of one axis of a square by a box of 2 half + 1 pixels.  @param line  {n} scratch */
static void box_blur(float *v, size_t n, size_t axis, size_t half, double *line)
{
    for (size_t k = 0; k < n; k++) {
        float *const start = axis == 0 ? v + k * n : v + k;
        const size_t stride = axis == 0 ? 1 : n;
        double sum = 0;
        for (size_t i = 0; i < n; i++)
            line[i] = (double)start[i * stride];
        for (size_t i = 0; i < n + half; i++) {
            if (i < n) sum += line[i];
            if (i > 2 * half) sum -= line[i - 2 * half - 1];
            if (i >= half) start[(i - half) * stride] = (float)(sum / (2 * (double)half + 1));
        }
    }
}

/** Integral of a triangle of half width and area 1 from minus infinity. */
static double triangle(double u)
{
    if (u <= -1 || u >= 1) return u > 0;
    return u < 0 ? 0.5 * (1 + u) * (1 + u) : 1 - 0.5 * (1 - u) * (1 - u);
}

/** What a solid covers of a row, as seen through triangles two pixels wide: whatever is thinner than a pixel keeps its
 *  area and its place. By lines within the height of the solid.
 *  @param low,high  where the solid ends along y  @param line  {pixels} written */
static void cover_row(const tg_contour_model *m, const tg_solid *s, const tg_grid *g, size_t row, double low,
                      double high, double *line)
{
    enum { LINES = 16 };
    const double y = tg_grid_mm(g, 1, (double)row), step_mm = g->step_mm[0], last = (double)g->n[0] - 1;
    const double from = fmax(y - step_mm, low), height = fmin(y + step_mm, high) - from;
    for (size_t i = 0; i < g->n[0]; i++)
        line[i] = 0;
    for (int k = 0; k < LINES && height > 0; k++) {
        const double at = from + height * (k + 0.5) / LINES;
        const double weight = height / LINES / step_mm * (1 - fabs(at - y) / step_mm);
        const double point[2] = {m->middle_mm[0] + g->first_mm[0], m->middle_mm[1] + at};
        double t[2];
        if (!tg_section_chord(s, m->z_mm, point, 0, t)) continue;
        const double a = t[0] / step_mm, b = t[1] / step_mm;
        for (double i = fmax(ceil(a - 1), 0); i <= fmin(floor(b + 1), last); i++)
            line[(size_t)i] += weight * (triangle(b - i) - triangle(a - i));
    }
}

/** Lay a solid of some contrast over a picture of the phantom. */
static void lay(const tg_contour_model *m, const tg_solid *s, double contrast, const tg_grid *g, double *line, float *v)
{
    enum { DIRECTIONS = 360 };
    double middle[2], low = INFINITY, high = -INFINITY;
    if (!tg_section_middle(s, m->z_mm, middle)) return;
    for (int k = 0; k < DIRECTIONS; k++) {
        const double angle = k * 2 * M_PI / DIRECTIONS;
        const double y = middle[1] + tg_section_radius(s, m->z_mm, middle, angle) * sin(angle) - m->middle_mm[1];
        low = fmin(low, y);
        high = fmax(high, y);
    }
    for (size_t row = 0; row < g->n[1]; row++) {
        const double y = tg_grid_mm(g, 1, (double)row);
        if (y + g->step_mm[1] < low || y - g->step_mm[1] > high) continue;
        cover_row(m, s, g, row, low, high, line);
        for (size_t i = 0; i < g->n[0]; i++)
            v[row * g->n[0] + i] += (float)(line[i] * (contrast - (double)v[row * g->n[0] + i]));
    }
}

/** The phantom at turn 0 about the middle of its body, as contrast against the body, blurred by about the spread.
 *  @param g,drawn  set on success */
static tg_code draw(const tg_contour_model *m, const tg_phantom *phantom, const double *mu, double reach_mm, tg_grid *g,
                    float **drawn, tg_error *e)
{
    tg_code code = TG_OK;
    const double origin[2] = {0, 0}, body = mu[m->solid->material];
    const size_t pixels = (size_t)fmin(ceil(4 * reach_mm / m->grid->step_mm[0]), MOST_PIXELS);
    double *line = NULL;
    float *v = NULL;
    *g = tg_grid_square(pixels, 2 * reach_mm, origin);
    TG_TRY(TG_NEW(v, tg_grid_slice(g), e));
    TG_TRY(TG_NEW(line, pixels, e));
    for (size_t i = 0; i < tg_grid_slice(g); i++)
        v[i] = -1;
    for (size_t i = 0; i < phantom->n_solids; i++)
        lay(m, &phantom->solid[i], (mu[phantom->solid[i].material] - body) / body, g, line, v);
    /* two boxes along an axis make a triangle whose full width at half maximum is that of the spread */
    const size_t half = (size_t)round(0.5 * fmax(m->spread_mm / g->step_mm[0] - 1, 0));
    for (size_t axis = 0; axis < 2; axis++)
        for (int k = 0; k < 2; k++)
            box_blur(v, pixels, axis, half, line);
    *drawn = v;
    v = NULL;
done:
    tg_free(v);
    tg_free(line);
    return code;
}

/** One ring of a slice.  @param one  the value that counts as contrast 1  @param inside {ANGLES} how far the body
 *  reaches [mm] */
static void take_ring(const float *v, const tg_grid *g, const double centre_mm[2], double turn_rad, double r_mm,
                      double zero, double one, const double *inside, float *ring)
{
    double mean = 0;
    size_t n = 0;
    for (size_t i = 0; i < ANGLES; i++) {
        const double angle = turn_rad + 2 * M_PI * (double)i / ANGLES;
        const double at[2] = {centre_mm[0] + r_mm * cos(angle), centre_mm[1] + r_mm * sin(angle)};
        const double value = r_mm < inside[i] ? (tg_sample(v, g, at) - zero) / one : (double)NAN;
        ring[i] = (float)value;
        if (isnan(value)) continue;
        /* what is much denser than the body shall not outweigh all else */
        ring[i] = (float)fmin(fmax(value, -1.5), 1.5);
        mean += (double)ring[i];
        n++;
    }
    for (size_t i = 0; i < ANGLES; i++)
        ring[i] = isnan(ring[i]) ? 0 : ring[i] - (float)(mean / (double)n);
}

static void polar_free(polar *p)
{
    tg_free(p->slice);
    tg_free(p->drawn);
    *p = (polar){0};
}

static tg_code polar_create(const tg_contour_model *m, const tg_contour *o, const tg_phantom *phantom, const double *mu,
                            polar *p, tg_error *e)
{
    tg_code code = TG_OK;
    const double origin[2] = {0, 0}, start = m->round ? 0 : o->turn_rad;
    double *inside = NULL, reach = 0;
    float *drawn = NULL;
    tg_grid g;
    *p = (polar){0};
    TG_TRY(TG_NEW(inside, ANGLES, e));
    for (size_t i = 0; i < ANGLES; i++) {
        const double r = tg_section_radius(m->solid, m->z_mm, m->middle_mm, 2 * M_PI * (double)i / ANGLES);
        inside[i] = r * fmin(o->scale, 1) - 2 * m->spread_mm;
        reach = fmax(reach, r);
    }
    p->step_mm = fmax(m->grid->step_mm[0], reach / MOST_RINGS);
    p->rings = (size_t)(reach / p->step_mm);
    TG_TRY(TG_NEW(p->slice, p->rings * ANGLES, e));
    TG_TRY(TG_NEW(p->drawn, p->rings * ANGLES, e));
    TG_TRY(draw(m, phantom, mu, reach, &g, &drawn, e));
    for (size_t k = 0; k < p->rings; k++) {
        take_ring(m->image, m->grid, o->centre_mm, start, ring_mm(p, k), o->inside, o->inside - o->outside, inside,
                  p->slice + k * ANGLES);
        take_ring(drawn, &g, origin, 0, ring_mm(p, k), 0, 1, inside, p->drawn + k * ANGLES);
    }
done:
    tg_free(inside);
    tg_free(drawn);
    if (code != TG_OK) polar_free(p);
    return code;
}

static tg_code agree(const polar *p, agreement *a, tg_error *e)
{
    tg_code code = TG_OK;
    tg_fft fft[5] = {0}; /* slice, phantom, sums of their products: cross, own, mirrored */
    for (int i = 0; i < 5; i++)
        TG_TRY(tg_fft_create(1, ANGLES, &fft[i], e));
    for (size_t k = 0; k < p->rings; k++) {
        const double cell = 2 * M_PI / ANGLES * ring_mm(p, k) * p->step_mm;
        for (size_t i = 0; i < ANGLES; i++) {
            fft[0].real[i] = (double)p->slice[k * ANGLES + i];
            fft[1].real[i] = (double)p->drawn[k * ANGLES + i];
            a->area_mm2 += fft[0].real[i] != 0 ? cell : 0;
        }
        tg_fft_forward(&fft[0]);
        tg_fft_forward(&fft[1]);
        for (size_t i = 0; i <= ANGLES / 2; i++) {
            fft[2].half[i] += cell * fft[0].half[i] * conj(fft[1].half[i]);
            fft[3].half[i] += cell * fft[1].half[i] * conj(fft[1].half[i]);
            fft[4].half[i] += cell * fft[0].half[i] * fft[1].half[i];
        }
    }
    tg_fft_inverse(&fft[2]);
    tg_fft_inverse(&fft[3]);
    tg_fft_inverse(&fft[4]);
    for (size_t i = 0; i < ANGLES; i++) {
        a->cross[i] = fft[2].real[i];
        a->own[i] = fft[3].real[i];
        a->mirrored = fmax(a->mirrored, fft[4].real[i]);
    }
done:
    for (int i = 0; i < 5; i++)
        tg_fft_free(&fft[i]);
    return code;
}

/** Hold the slice against the phantom in its best turn: noise from the median of what is left, so that edges and
 *  strangers count little, and how well the two agree where the phantom's own pattern is strong. */
static tg_code compare(const polar *p, size_t best, agreement *a, tg_error *e)
{
    enum { APART = 16 }; /* angles between samples */
    tg_code code = TG_OK;
    const double gain = a->cross[best] / a->own[0], strong = a->own[0] / a->area_mm2;
    double *rest = NULL, slice = 0, both = 0, drawn = 0, cells = 0;
    size_t n = 0;
    TG_TRY(TG_NEW(rest, p->rings * ANGLES / APART, e));
    for (size_t k = 0; k < p->rings; k++) {
        for (size_t i = 0; i < ANGLES; i += APART) {
            const double here = (double)p->slice[k * ANGLES + i];
            const double there = (double)p->drawn[k * ANGLES + (i + ANGLES - best) % ANGLES], r = ring_mm(p, k);
            if (here != 0) rest[n++] = fabs(here - gain * there);
            if (there * there < strong) continue;
            slice += r * here * here;
            both += r * here * there;
            drawn += r * there * there;
            cells += r;
        }
    }
    gsl_sort(rest, 1, n);
    a->noise = n ? 1.4826 * gsl_stats_median_from_sorted_data(rest, 1, n) : 0;
    a->likeness = both / sqrt(drawn * fmax(slice - cells * a->noise * a->noise, both * both / drawn));
done:
    tg_free(rest);
    return code;
}

/** Turn between two indices, folded to what a symmetry of order n leaves different: -ANGLES / 2n .. ANGLES / 2n. */
static double folded(double difference, int n)
{
    const double period = (double)ANGLES / n;
    return difference - period * round(difference / period);
}

/** How many indices the turn of an outline that is not round may be off. */
static double slack(const tg_contour_model *m, const tg_contour *o)
{
    const double size = sqrt(tg_section_area_mm2(m->solid, m->z_mm));
    return 2 + (4 * o->turn_u_rad + m->spread_mm / size) * ANGLES / (2 * M_PI);
}

/** Whether the best turn stands out: against noise, against what else is in the slice, and against other turns. */
static void doubt(const agreement *a, const bool *may, size_t best, int order, bool round, double spread_mm,
                  char lost[200])
{
    const double gain = a->cross[best] / a->own[0];
    /* standard uncertainty of cross, for noise that passed the same Gaussian spread: correlated over 2.27 FWHM^2 */
    const double u = a->noise * spread_mm * sqrt(2.27 * a->own[0]);
    if (!(a->cross[best] > 5 * u)) {
        snprintf(lost, 200, "the pattern of the solids does not stand out from the noise");
        return;
    }
    /* the turn of an outline that is not round holds for the phantom as it is, not for its mirror image */
    if (round && a->mirrored > fmax(1.1 * a->cross[best], a->cross[best] + 5 * u)) {
        snprintf(lost, 200, "the mirror image of the phantom fits better: the image or the description is mirrored");
        return;
    }
    if (gain < 0.25 || a->likeness < 0.5) {
        snprintf(lost, 200, "what is inside of the body is not the pattern of the phantom: another phantom?");
        return;
    }
    /* the lobe of the best turn: as far as the phantom is still much like itself */
    size_t lobe = 0;
    while (lobe < ANGLES / 2 && a->own[lobe] > 0.5 * a->own[0])
        lobe++;
    for (size_t i = 0; i < ANGLES; i++) {
        const double apart = folded((double)i - (double)best, order);
        const bool peak =
            a->cross[i] >= a->cross[(i + 1) % ANGLES] && a->cross[i] >= a->cross[(i + ANGLES - 1) % ANGLES];
        if (!may[i] || !peak || fabs(apart) <= (double)lobe) continue;
        const double unlike = 1 - a->own[(size_t)fabs(apart)] / a->own[0];
        const double lead = a->cross[best] - a->cross[i];
        if (lead < fmax(3 * u * sqrt(2 * unlike), 0.3 * gain * a->own[0] * unlike)) {
            snprintf(lost, 200, "two turns of the phantom, %.4g degrees apart, fit equally well",
                     fabs(apart) * 360 / ANGLES);
            return;
        }
    }
}

/** Where the top of the agreement is, by a parabola over the part of the lobe where it is one.
 *  @param curvature  of cross, per index squared, positive */
static double top(const agreement *a, size_t best, double *curvature)
{
    size_t half = 2;
    while (half < ANGLES / 16 && a->own[half] > 0.95 * a->own[0])
        half++;
    double s0 = 0, s2 = 0, s4 = 0, v0 = 0, v1 = 0, v2 = 0;
    for (size_t i = 0; i <= 2 * half; i++) {
        const double x = (double)i - (double)half, v = a->cross[(best + i + ANGLES - half) % ANGLES];
        s0 += 1;
        s2 += x * x;
        s4 += x * x * x * x;
        v0 += v;
        v1 += x * v;
        v2 += x * x * v;
    }
    *curvature = -2 * (s0 * v2 - s2 * v0) / (s0 * s4 - s2 * s2);
    return (double)best + fmin(fmax(v1 / s2 / *curvature, -(double)half), (double)half);
}

/** The turn with its uncertainty, from the pattern and from the outline, by their weights.
 *  @param agreed  whether the pattern tells something */
static void settle(const tg_contour_model *m, const tg_contour *o, const agreement *a, bool agreed, size_t best,
                   int outline_order, int order, tg_located *out)
{
    double turn = 0, weight = 0;
    if (agreed) {
        /* noise that hangs together over 1.5 FWHM along edges whose slope is 1 / 1.06 FWHM of their height */
        double curvature;
        turn = top(a, best, &curvature);
        const double gain = a->cross[best] / a->own[0], noise = a->noise * m->spread_mm;
        weight = gain * curvature / fmax(1.5 * 1.06 * noise * noise, 1e-12 * curvature * gain);
    }
    if (!m->round) {
        const double own = (double)best - folded((double)best, outline_order), unit = 2 * M_PI / ANGLES;
        const double u = fmax(o->turn_u_rad / unit, 1e-6), own_weight = 1 / (u * u);
        turn = (turn * weight + own * own_weight) / (weight + own_weight);
        weight += own_weight;
        turn += o->turn_rad / unit;
    }
    /* where noise is absent, the pixels still leave some hundredths of their width */
    const double grid = 0.03 * m->grid->step_mm[0] / (0.5 * sqrt(tg_section_area_mm2(m->solid, m->z_mm)));
    out->turn_known = true;
    out->pose.turn_rad = folded(turn, order > 1 ? order : 1) * 2 * M_PI / ANGLES;
    out->turn_u_rad = hypot(2 * M_PI / ANGLES / sqrt(weight), grid);
}

tg_code tg_locate_turn(const tg_contour_model *m, const tg_contour *o, const tg_phantom *phantom, const double *mu,
                       tg_located *out, tg_error *e)
{
    tg_code code = TG_OK;
    const int outline_order = tg_section_symmetry(phantom, 0, 1, m->z_mm, m->middle_mm);
    const int order = tg_section_symmetry(phantom, 0, phantom->n_solids, m->z_mm, m->middle_mm);
    polar p = {0};
    agreement *a = NULL;
    bool *may = NULL;
    size_t best = 0;
    if (order == 0) goto done; /* nothing has a turn */
    TG_TRY(TG_NEW(a, 1, e));
    TG_TRY(TG_NEW(may, ANGLES, e));
    TG_TRY(polar_create(m, o, phantom, mu, &p, e));
    TG_TRY(agree(&p, a, e));
    const bool pattern = a->own[0] > 1e-9 * a->area_mm2;
    if (pattern) {
        double most = -INFINITY;
        for (size_t i = 0; i < ANGLES; i++) {
            may[i] = m->round || fabs(folded((double)i, outline_order)) <= slack(m, o);
            if (!may[i] || a->cross[i] <= most) continue;
            most = a->cross[i];
            best = i;
        }
        TG_TRY(compare(&p, best, a, e));
        doubt(a, may, best, order, m->round, m->spread_mm, out->lost);
    }
    if (!*out->lost && (pattern || !m->round)) settle(m, o, a, pattern, best, outline_order, order, out);
done:
    polar_free(&p);
    tg_free(a);
    tg_free(may);
    return code;
}
