#include "metrics/mtf.h"

#include "io/memory.h"
#include "metrics/noise.h"

#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>

const double tg_mtf_level_of[TG_MTF_LEVELS] = {0.5, 0.1};

double tg_mtf_disc(double diameter_mm, double f_per_mm)
{
    const double x = M_PI * diameter_mm * f_per_mm;
    return x < 1e-6 ? 1 : 2 * j1(x) / x;
}

double tg_mtf_ball(double diameter_mm, double f_per_mm)
{
    const double x = M_PI * diameter_mm * f_per_mm;
    return x < 1e-3 ? 1 - x * x / 10 : 3 * (sin(x) - x * cos(x)) / (x * x * x);
}

double tg_taper(double x, double flat, double end, double *slope)
{
    const double a = fabs(x), turn = M_PI / (end - flat);
    const bool falls = a > flat && a < end;
    if (slope) *slope = falls ? -copysign(0.5 * turn * sin(turn * (a - flat)), x) : 0;
    return a <= flat ? 1 : falls ? 0.5 + 0.5 * cos(turn * (a - flat)) : 0;
}

void tg_mtf_refuse(tg_mtf *out, const char *format, ...)
{
    out->n = 0;
    for (int i = 0; i < TG_MTF_LEVELS; i++) {
        va_list args;
        va_start(args, format);
        out->level[i].f_per_mm = NAN;
        vsnprintf(out->level[i].why, sizeof out->level[i].why, format, args);
        va_end(args);
    }
}

/* ---- the pixels ---- */

tg_code tg_spread_create(const tg_grid *g, double least_mm, double most_mm, tg_spread *s, tg_error *e)
{
    tg_code code = TG_OK;
    const double step_mm = fmin(g->step_mm[0], g->step_mm[1]), a = fmax(least_mm, 0) / step_mm, b = most_mm / step_mm;
    /* the area in pixels, and those that its outlines cut */
    const size_t room = (size_t)fmin((double)tg_grid_slice(g), M_PI * (b * b - a * a) + 8 * (a + b) + 64);
    *s = (tg_spread){.room = room, .least_mm = a * step_mm, .knot_mm = step_mm / 256};
    s->knots = (size_t)ceil((b - a) * 256) + 2;
    TG_TRY(TG_NEW(s->profile, s->knots, e));
    TG_TRY(TG_NEW(s->index, room, e));
    TG_TRY(TG_NEW(s->r_mm, room, e));
    TG_TRY(TG_NEW(s->phi_rad, room, e));
    TG_TRY(TG_NEW(s->share, room, e));
    TG_TRY(TG_NEW(s->net, room, e));
    TG_TRY(TG_NEW(s->fit, TG_SPREAD_TERMS * room, e));
    TG_TRY(TG_NEW(s->model, TG_SPREAD_TERMS * room, e));
done:
    if (code != TG_OK) tg_spread_free(s);
    return code;
}

void tg_spread_free(tg_spread *s)
{
    tg_free(s->index);
    tg_free(s->r_mm);
    tg_free(s->phi_rad);
    tg_free(s->share);
    tg_free(s->net);
    tg_free(s->profile);
    tg_free(s->fit);
    tg_free(s->model);
    *s = (tg_spread){0};
}

/** Gather the pixels by their distance: the kernel interpolated between knots so dense (256 to a pixel) that it bends
 * by less than 1e-5 between them. */
static void lay_profile(tg_spread *s)
{
    for (size_t i = 0; i < s->knots; i++)
        s->profile[i] = 0;
    for (size_t j = 0; j < s->n; j++) {
        const double at = (s->r_mm[j] - s->least_mm) / s->knot_mm, below = floor(at);
        const size_t i = (size_t)below;
        s->profile[i] += (1 - (at - below)) * s->share[j] * s->net[j];
        s->profile[i + 1] += (at - below) * s->share[j] * s->net[j];
    }
}

bool tg_spread_settle(tg_spread *s, const float *mean)
{
    const size_t k = s->terms;
    double right[TG_SPREAD_TERMS] = {0}, c[TG_SPREAD_TERMS] = {0};
    gsl_matrix_view a = gsl_matrix_view_array(s->inverse, k, k);
    gsl_matrix_set_zero(&a.matrix);
    s->fitted = 0;
    s->rest = 0;
    for (size_t j = 0; j < s->n; j++) {
        const double *x = s->fit + TG_SPREAD_TERMS * j;
        for (size_t p = 0; p < k; p++) {
            right[p] += x[p] * (double)mean[s->index[j]];
            for (size_t q = 0; q < k; q++)
                s->inverse[k * p + q] += x[p] * x[q];
        }
    }
    if (gsl_linalg_cholesky_decomp1(&a.matrix) || gsl_linalg_cholesky_invert(&a.matrix)) return false;
    for (size_t p = 0; p < k; p++)
        for (size_t q = 0; q < k; q++)
            c[p] += s->inverse[k * p + q] * right[q];
    for (size_t j = 0; j < s->n; j++) {
        s->net[j] = (double)mean[s->index[j]];
        double rest = s->net[j];
        bool fitted = false;
        for (size_t p = 0; p < k; p++) {
            const double x = s->fit[TG_SPREAD_TERMS * j + p];
            fitted = fitted || x != 0;
            rest -= x * c[p];
            s->net[j] -= s->model[TG_SPREAD_TERMS * j + p] * c[p];
        }
        if (fitted) {
            s->fitted++;
            s->rest += rest * rest;
        }
    }
    lay_profile(s);
    return s->fitted > k;
}

double tg_spread_sum(const tg_spread *s, double f_per_mm)
{
    double sum = 0;
    for (size_t i = 0; i < s->knots; i++)
        if (s->profile[i] != 0) sum += s->kernel(s, s->least_mm + s->knot_mm * (double)i, f_per_mm) * s->profile[i];
    return sum;
}

/* ---- curve and levels ---- */

static double object(const tg_spread *s, double f)
{
    return s->object ? s->object(s->size_mm, f) : 1;
}

static double modulation(const tg_spread *s, double f, double whole)
{
    return tg_spread_sum(s, f) / (whole * object(s, f));
}

static double nyquist(const tg_target *t)
{
    return 0.5 / fmax(t->grid.step_mm[0], t->grid.step_mm[1]);
}

/** Where the modulation passes a level between two frequencies (regula falsi with halved ends: Illinois). */
static double crossing(const tg_spread *s, double whole, double level, double a, double ya, double b, double yb)
{
    double f = b;
    ya -= level;
    yb -= level;
    for (int i = 0; i < 30 && fabs(b - a) > 1e-9 * b; i++) {
        f = (a * yb - b * ya) / (yb - ya);
        const double y = modulation(s, f, whole) - level;
        if (fabs(y) < 1e-9) break;
        if (y * yb < 0) {
            a = b;
            ya = yb;
        } else {
            ya *= 0.5;
        }
        b = f;
        yb = y;
    }
    return f;
}

/** Field that would carry the level below Nyquist, were the modulation to go on falling as a Gaussian does. */
static double field_needed(const tg_target *t, const tg_mtf *out, double level)
{
    const double last = fmin(out->modulation[out->n - 1], 0.95), f = out->f_per_mm[out->n - 1];
    return (double)t->grid.n[0] * 0.5 / (f * sqrt(log(level) / log(last)));
}

static void lay_curve(const tg_target *t, const tg_spread *s, tg_mtf *out)
{
    enum { WANTED = 64 };
    const double whole = tg_spread_sum(s, 0), most = nyquist(t);
    /* a Gaussian is down to 0.02 at 1.05 / width */
    const double step = fmin(most, 1.3 / s->width_mm) / WANTED;
    double *const f = out->f_per_mm, *const m = out->modulation;
    int found = 0;
    m[0] = 1;
    for (out->n = 1; out->n < TG_MTF_POINTS && m[out->n - 1] > 0.02; out->n++) {
        const size_t i = out->n;
        f[i] = step * (double)i;
        if (f[i] > most * (1 + 1e-9) || object(s, f[i]) < 0.5) break;
        m[i] = modulation(s, f[i], whole);
        for (; found < TG_MTF_LEVELS && m[i] < tg_mtf_level_of[found]; found++)
            out->level[found] =
                (tg_mtf_level){.f_per_mm = crossing(s, whole, tg_mtf_level_of[found], f[i - 1], m[i - 1], f[i], m[i])};
    }
    for (int i = found; i < TG_MTF_LEVELS; i++) {
        tg_mtf_level *l = &out->level[i];
        *l = (tg_mtf_level){.f_per_mm = NAN};
        if (f[out->n - 1] > 0.98 * most)
            snprintf(
                l->why, sizeof l->why,
                "the pixels are too coarse: the modulation is still %.2f at their Nyquist frequency; a field of at "
                "most %.3g mm would do",
                m[out->n - 1], field_needed(t, out, tg_mtf_level_of[i]));
        else
            snprintf(l->why, sizeof l->why, "the modulation does not fall to %g", tg_mtf_level_of[i]);
    }
    for (int i = 0; i < found; i++)
        if (object(s, out->level[i].f_per_mm) < 0.8) {
            out->level[i].f_per_mm = NAN;
            snprintf(out->level[i].why, sizeof out->level[i].why, "too thick: %.3g mm blur it by more than a fifth",
                     s->size_mm);
        }
}

/* ---- uncertainty ---- */

/** Variance of the noise of one slice where the weights are, and its degrees of freedom: between slices, or of one
 *  slice around its fitted background. */
static double local_variance(const tg_target *t, const tg_spread *s, const double *w, double *dof)
{
    const double apart = tg_noise_independent(&t->noise, t->grid.n[0], s->index, s->n) / (double)s->n;
    double sum = 0, second = 0, fourth = 0;
    if (t->n < 2) {
        *dof = fmax(1, apart * (double)(s->fitted - s->terms));
        return s->rest / (double)(s->fitted - s->terms);
    }
    for (size_t j = 0; j < s->n; j++) {
        double scatter = 0;
        for (size_t k = 0; k < t->n; k++) {
            const double d = (double)t->slice[k][s->index[j]] - (double)t->mean[s->index[j]];
            scatter += d * d;
        }
        const double w2 = w[j] * w[j];
        sum += w2 * scatter / (double)(t->n - 1);
        second += w2;
        fourth += w2 * w2;
    }
    *dof = fmax(1, (double)(t->n - 1) * apart * second * second / fourth);
    return sum / second;
}

double tg_spread_noise(const tg_target *t, const tg_spread *s, double *w, double *dof)
{
    double pull[TG_SPREAD_TERMS] = {0}, back[TG_SPREAD_TERMS] = {0};
    for (size_t j = 0; j < s->n; j++)
        for (size_t p = 0; p < s->terms; p++)
            pull[p] += w[j] * s->model[TG_SPREAD_TERMS * j + p];
    for (size_t p = 0; p < s->terms; p++)
        for (size_t q = 0; q < s->terms; q++)
            back[p] += s->inverse[s->terms * p + q] * pull[q];
    for (size_t j = 0; j < s->n; j++)
        for (size_t p = 0; p < s->terms; p++)
            w[j] -= s->fit[TG_SPREAD_TERMS * j + p] * back[p];
    const double variance = local_variance(t, s, w, dof);
    return sqrt(variance * tg_noise_mean_variance(&t->noise, t->grid.n[0], s->index, w, s->n) / (double)t->n);
}

/** Standard uncertainty of a figure that changes by a times the sum of the kernel at f and b times that at 0.
 *  @param w  {n} scratch */
static double noise_of(const tg_target *t, const tg_spread *s, double a, double f, double b, double *w, double *dof)
{
    for (size_t j = 0; j < s->n; j++)
        w[j] = s->share[j] * (a * s->kernel(s, s->r_mm[j], f) + b * s->kernel(s, s->r_mm[j], 0));
    return tg_spread_noise(t, s, w, dof);
}

/** What the two tapers leave, as a share of the frequency: found on closed forms of Gaussian, Hann, cosine and
 *  Shepp-Logan windows (0.1 to 1 % there). The sharper the band ends, the longer the spread rings beyond the taper; the
 *  ratio of the two frequencies tells how sharply (Gaussian 1.82, Hann 1.66, Shepp-Logan 1.4). */
static double method_share(const tg_target *t, const tg_mtf *out)
{
    const double half = out->level[TG_MTF_HALF].f_per_mm, tenth = out->level[TG_MTF_TENTH].f_per_mm;
    const double ratio = (isnan(tenth) ? nyquist(t) : tenth) / half;
    return isnan(ratio) ? 0.002 : 0.002 + 0.08 * fmin(fmax(1.65 - ratio, 0), 0.4);
}

static double sinc(double x)
{
    return x < 1e-9 ? 1 : sin(M_PI * x) / (M_PI * x);
}

/** Modulation beyond the measured curve. Back-projection with linear interpolation repeats the filtered spectrum of the
 *  rays at multiples of the sampling frequency, under interpolation and aperture (Kak and Slaney 1988, ch. 3); where
 *  the scan is not known the modulation is taken to go on falling as a Gaussian does. */
static double beyond(const tg_target *t, const tg_mtf *out, double f)
{
    const double pitch = t->image->scan.channels ? tg_scan_pitch_mm(&t->image->scan) : (double)NAN;
    const double base = fabs(f - round(f * pitch) / pitch);
    const double repeated = tg_theory_mtf(&t->theory, base) * base / f * pow(sinc(f * pitch) / sinc(base * pitch), 3);
    if (isfinite(repeated)) return fabs(repeated);
    const int i = isnan(out->level[TG_MTF_TENTH].f_per_mm) ? TG_MTF_HALF : TG_MTF_TENTH;
    return pow(tg_mtf_level_of[i], pow(f / out->level[i].f_per_mm, 2));
}

/** What aliasing may add to the modulation of a point at one place among the pixels: the four nearest repetitions of
 *  the spectrum, averaged over directions, at phases that are not known. */
static double aliased(const tg_target *t, const tg_mtf *out, double f)
{
    enum { DIRECTIONS = 64 };
    double sum = 0;
    for (int axis = 0; axis < 2; axis++)
        for (int i = 0; i < DIRECTIONS; i++) {
            const double angle = 2 * M_PI * i / DIRECTIONS, repeat = 1 / t->grid.step_mm[axis];
            sum += beyond(t, out, hypot(repeat + f * cos(angle), f * sin(angle))) / DIRECTIONS;
        }
    return sqrt(2) * sum; /* each pair of repetitions adds 2 sum cos(phase), root mean square sqrt(2) sum */
}

/** What the channels' sampling may add to the modulation of an edge. It folds the spectrum of the rays at 1 / pitch;
 * the phase is the edge's place among the channels, which turns from view to view by as much as its centre is off the
 *  axis: J0(2 pi d / pitch). An edge around the axis sees one phase in all views. */
static double folded(const tg_target *t, const tg_region *ring, double f)
{
    const tg_scan *scan = &t->image->scan;
    const double pitch = scan->channels ? tg_scan_pitch_mm(scan) : 0, mirror = 1 / pitch - f;
    if (!(pitch > 0) || mirror < f) return 0;
    const double known = t->image->facts.aperture_mm.v, aperture = isnan(known) ? pitch : known;
    const double turns = hypot(ring->centre_mm[0], ring->centre_mm[1]) / pitch;
    const double left = fmin(1, 1 / (M_PI * sqrt(turns))); /* envelope of J0 */
    return left * f / mirror * fabs(sinc(mirror * aperture) / sinc(f * aperture)) / sqrt(2);
}

tg_code tg_spread_curve(const tg_target *t, const tg_spread *s, double *width_mm, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    double *w = NULL, dof;
    TG_TRY(TG_NEW(w, s->n, e));
    if (!(noise_of(t, s, 0, 0, 1 / tg_spread_sum(s, 0), w, &dof) < 0.1)) {
        tg_mtf_refuse(out, "too much noise for its contrast; pool more slices");
        goto done;
    }
    lay_curve(t, s, out);
    const double seen = 0.4413 / out->level[TG_MTF_HALF].f_per_mm; /* of a Gaussian with this frequency */
    if (fabs(seen - *width_mm) > 0.05 * *width_mm) *width_mm = fmin(fmax(seen, 0.5 * *width_mm), 2 * *width_mm);
done:
    tg_free(w);
    return code;
}

/* A figure that method and sampling leave more uncertain than this is none. */
static const double most_share = 0.15;

tg_code tg_spread_uncertainty(const tg_target *t, const tg_spread *s, tg_mtf *out, tg_error *e)
{
    tg_code code = TG_OK;
    double *w = NULL;
    const double whole = tg_spread_sum(s, 0), share = method_share(t, out);
    TG_TRY(TG_NEW(w, s->n, e));
    double alias[TG_MTF_LEVELS] = {0};
    for (int i = 0; i < TG_MTF_LEVELS; i++) {
        const double f = out->level[i].f_per_mm;
        if (isnan(f)) continue;
        alias[i] = s->radius_mm > 0 ? tg_mtf_level_of[i] * folded(t, &out->region, f) : aliased(t, out, f);
    }
    for (int i = 0; i < TG_MTF_LEVELS; i++) {
        tg_mtf_level *l = &out->level[i];
        const double f = l->f_per_mm, h = 1e-3 * f;
        if (isnan(f)) continue;
        const double slope = (modulation(s, f + h, whole) - modulation(s, f - h, whole)) / (2 * h);
        l->u_noise =
            noise_of(t, s, 1 / (object(s, f) * whole * slope), f, -tg_mtf_level_of[i] / (whole * slope), w, &l->dof);
        l->u_method = share * f;
        l->u_sampling = alias[i] / fabs(slope);
        if (!(l->u_noise < 0.04 * f)) {
            l->f_per_mm = NAN;
            snprintf(l->why, sizeof l->why,
                     "too much noise: its standard uncertainty would be %.0f %%; pool more slices",
                     100 * l->u_noise / f);
        } else if (!(hypot(l->u_method, l->u_sampling) < most_share * f)) {
            const double share_of_f = hypot(l->u_method, l->u_sampling) / f;
            l->f_per_mm = NAN;
            snprintf(l->why, sizeof l->why,
                     "too coarsely sampled: its standard uncertainty would be %.0f %%; use smaller pixels or an edge "
                     "off the axis",
                     100 * share_of_f);
        }
    }
done:
    tg_free(w);
    return code;
}

/* ---- what else is near ---- */

bool tg_mtf_usable(const tg_target *t, size_t index, tg_mtf *out)
{
    for (size_t k = 0; k < t->n; k++) {
        const double v = (double)t->slice[k][index];
        if (v > t->image->least && v < t->image->most) continue;
        if (isnan(v))
            tg_mtf_refuse(out, "pixels around it hold no number");
        else
            tg_mtf_refuse(out, "clipped: the image's pixel type ends at %.6g", v);
        return false;
    }
    return true;
}

/** Index of the material of a solid; -1 outside everything. */
static int matter(const tg_target *t, int solid)
{
    return solid < 0 ? -1 : (int)t->phantom->solid[solid].material;
}

static tg_code add_intruder(tg_intruder **list, size_t *n, double x, double y, int solid, tg_error *e)
{
    tg_intruder *i = tg_append(list, n, sizeof **list);
    if (!i) return tg_no_memory(e, *n + 1, sizeof *i);
    *i = (tg_intruder){hypot(x, y), atan2(y, x), solid};
    return TG_OK;
}

tg_code tg_mtf_intruders(const tg_target *t, int solid, const double centre_mm[2], double radius_mm, double from_mm,
                         double to_mm, tg_intruder **list, size_t *n, tg_error *e)
{
    tg_code code = TG_OK;
    const tg_grid *g = &t->grid;
    const double skin = fmax(g->step_mm[0], g->step_mm[1]);
    const tg_region ring = {
        .outline = TG_RING, .centre_mm = {centre_mm[0], centre_mm[1]}, .inner_mm = from_mm, .outer_mm = to_mm};
    const int around = matter(t, tg_target_around(t, centre_mm, radius_mm));
    size_t x0, x1, y0, y1;
    *list = NULL;
    *n = 0;
    tg_region_bounds(&ring, g, &x0, &x1, &y0, &y1);
    for (size_t iy = y0; iy < y1; iy++)
        for (size_t ix = x0; ix < x1; ix++) {
            const double x = tg_grid_mm(g, 0, (double)ix), y = tg_grid_mm(g, 1, (double)iy);
            if (!tg_region_holds(&ring, x, y)) continue;
            const double dx = x - centre_mm[0], dy = y - centre_mm[1], r = hypot(dx, dy);
            const int label = t->label[iy * g->n[0] + ix];
            const bool own = r < radius_mm + skin && label == solid;
            const bool other = r > radius_mm - skin && matter(t, label) == around;
            if (!own && !other) TG_TRY(add_intruder(list, n, dx, dy, label, e));
        }
    for (int k = 0; k < (int)t->phantom->n_solids; k++) {
        double at_mm[2], thin_mm;
        if (k == solid || !tg_target_circle(t, k, at_mm, &thin_mm) || thin_mm > skin) continue;
        const double dx = at_mm[0] - centre_mm[0], dy = at_mm[1] - centre_mm[1], r = hypot(dx, dy);
        if (r >= from_mm && r <= to_mm) TG_TRY(add_intruder(list, n, dx, dy, k, e));
    }
done:
    if (code != TG_OK) {
        tg_free(*list);
        *list = NULL;
    }
    return code;
}

const char *tg_intruder_name(const tg_target *t, const tg_intruder *i)
{
    return i->solid < 0 ? "the outside" : t->phantom->solid[i->solid].name.v;
}
