#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/noise.h"
#include "metrics/place.h"
#include "recon/fft.h"

#include <complex.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

/* Noise power spectrum: squares of pixels from the uniform part of the body, half overlapping, of the residuals that
 * are left when the mean of the slices (or from a single slice a smooth trend over the whole body) is removed;
 * S = dx dy / (nx ny) |FFT|^2 (unit^2 mm^2), so that its integral over the plane is the variance; averaged over rings
 * of a frequency step 1 / (side dx). Where it falls below 2 % of its peak, leakage would fill it: then a Hann taper w
 * is laid over the squares and S divided by mean w^2 (Welch 1967; Kijewski and Judy 1987). */

enum { LEAST_SQUARES = 8 };

typedef struct {
    size_t side;    /* of a square [pixel] */
    size_t *corner; /* {n} flat index of its first pixel */
    size_t n, slices, bins;
    double *f;    /* {bins} mean frequency of a ring [1/mm] */
    double *s;    /* {bins} mean over squares and slices */
    double *each; /* {slices, n, bins} */
    bool tapered;
    double independent; /* number of squares and slices that share no noise, as far as their statistics go */
    double step_per_mm, nyquist_per_mm;
    char why[200];
} spectrum;

static void spectrum_free(spectrum *s)
{
    tg_free(s->corner);
    tg_free(s->f);
    tg_free(s->s);
    tg_free(s->each);
    *s = (spectrum){0};
}

/** Residuals of one slice over a set of pixels, into a plane. */
static void residuals(const tg_target *t, size_t slice, const tg_trend *trend, const size_t *index, size_t n, double *v,
                      double *plane)
{
    tg_trend_remove(trend, index, n, t->slice[slice], t->n > 1 ? t->mean : NULL, v);
    for (size_t i = 0; i < n; i++)
        plane[index[i]] = v[i];
}

/** Lay squares of one side over the set, half overlapping, in the middle of the rectangle around it.
 *  @param inside  {ny + 1, nx + 1} sums of the set's pixels below and left of each pixel */
static void lay_squares(const size_t *inside, const size_t from[2], const size_t extent[2], size_t nx, spectrum *s)
{
    const size_t step = s->side / 2, row = nx + 1;
    s->n = 0;
    if (extent[0] < s->side || extent[1] < s->side) return;
    const size_t x0 = from[0] + (extent[0] - s->side) % step / 2, y0 = from[1] + (extent[1] - s->side) % step / 2;
    for (size_t y = y0; y + s->side <= from[1] + extent[1]; y += step)
        for (size_t x = x0; x + s->side <= from[0] + extent[0]; x += step) {
            const size_t *low = inside + y * row + x, *high = low + s->side * row;
            if (high[s->side] + low[0] - high[0] - low[s->side] == s->side * s->side) s->corner[s->n++] = y * nx + x;
        }
}

/** The largest squares of which the set holds enough. */
static tg_code choose_squares(const tg_target *t, const size_t *index, size_t n, spectrum *s, tg_error *e)
{
    static const size_t sides[] = {128, 96, 64, 48, 32};
    tg_code code = TG_OK;
    const size_t nx = t->grid.n[0], ny = t->grid.n[1], row = nx + 1;
    size_t *inside = NULL, low[2] = {nx, ny}, high[2] = {0, 0}, extent[2];
    TG_TRY(TG_NEW(inside, row * (ny + 1), e));
    TG_TRY(TG_NEW(s->corner, tg_grid_slice(&t->grid), e));
    for (size_t i = 0; i < n; i++) {
        const size_t at[2] = {index[i] % nx, index[i] / nx};
        inside[(at[1] + 1) * row + at[0] + 1] = 1;
        for (int a = 0; a < 2; a++) {
            low[a] = at[a] < low[a] ? at[a] : low[a];
            high[a] = at[a] + 1 > high[a] ? at[a] + 1 : high[a];
        }
    }
    for (size_t y = 1; y <= ny; y++)
        for (size_t x = 1; x <= nx; x++)
            inside[y * row + x] += inside[y * row + x - 1] + inside[(y - 1) * row + x] - inside[(y - 1) * row + x - 1];
    for (int a = 0; a < 2; a++)
        extent[a] = high[a] > low[a] ? high[a] - low[a] : 0;
    for (size_t i = 0; i < sizeof sides / sizeof *sides && s->n < LEAST_SQUARES; i++) {
        s->side = sides[i];
        lay_squares(inside, low, extent, nx, s);
    }
    if (s->n < LEAST_SQUARES)
        snprintf(s->why, sizeof s->why,
                 "the body holds only %zu clear squares of %zu pixels; a noise spectrum takes at least %d", s->n,
                 s->side, (int)LEAST_SQUARES);
done:
    tg_free(inside);
    return code;
}

/** Correlation of what two squares tell of a sum over many rings, one moved against the other along one axis:
 *  sum w^2 w'^2 / sum w^4 (for a single frequency it is (sum w w' / sum w^2)^2, Welch 1967; a sum over frequencies also
 *  has the leakage of each into its neighbours in common). */
static double overlap(const double *w, size_t side, size_t lag)
{
    double sum = 0, all = 0;
    for (size_t i = 0; i < side; i++) {
        all += w[i] * w[i] * w[i] * w[i];
        if (i + lag < side) sum += w[i] * w[i] * w[i + lag] * w[i + lag];
    }
    return sum / all;
}

/** Number of squares that overlap no other, as far as their statistics go: the variance of the mean of n is that of one
 *  times sum_ij rho_ij / n^2. */
static double independent_squares(const spectrum *s, size_t nx, const double *taper)
{
    double pairs = 0;
    for (size_t i = 0; i < s->n; i++)
        for (size_t j = 0; j < s->n; j++) {
            const size_t a = s->corner[i], b = s->corner[j];
            const size_t dx = a % nx > b % nx ? a % nx - b % nx : b % nx - a % nx;
            const size_t dy = a / nx > b / nx ? a / nx - b / nx : b / nx - a / nx;
            if (dx < s->side && dy < s->side) pairs += overlap(taper, s->side, dx) * overlap(taper, s->side, dy);
        }
    return (double)(s->n * s->n) / pairs;
}

/** Transform of a square about its mean, under the taper. @param from  its first pixel in a plane of width nx */
static void transform(const double *from, size_t nx, const double *taper, const tg_fft *fft)
{
    const size_t side = fft->nx;
    double mean = 0;
    for (size_t y = 0; y < side; y++)
        for (size_t x = 0; x < side; x++)
            mean += from[y * nx + x] / (double)(side * side);
    for (size_t y = 0; y < side; y++)
        for (size_t x = 0; x < side; x++)
            fft->real[y * side + x] = taper[y] * taper[x] * (from[y * nx + x] - mean);
    tg_fft_forward(fft);
}

/** Add a transform's power to its rings. @param sum  {bins}  @param count,f  {bins} samples of a ring and the sum of
 *  their frequencies; NULL: known */
static void add_rings(const tg_fft *fft, const tg_grid *g, const spectrum *s, double *sum, double *count, double *f)
{
    const size_t side = s->side, row = side / 2 + 1;
    for (size_t y = 0; y < side; y++)
        for (size_t x = 0; x < row; x++) {
            const double fy = (double)(y <= side / 2 ? y : side - y) / ((double)side * g->step_mm[1]);
            const double at = hypot((double)x / ((double)side * g->step_mm[0]), fy), ring = round(at / s->step_per_mm);
            if (ring < 1 || at > s->nyquist_per_mm || ring > (double)s->bins) continue;
            const size_t bin = (size_t)ring - 1;
            const double twice = x && x < row - 1 ? 2 : 1;
            const double _Complex z = fft->half[y * row + x];
            sum[bin] += twice * (creal(z) * creal(z) + cimag(z) * cimag(z));
            if (!count) continue;
            count[bin] += twice;
            f[bin] += twice * at;
        }
}

/** Periodogram of every square and slice, averaged over rings. @param taper  {side} */
static tg_code analyse(const tg_target *t, const size_t *index, size_t n, const double *taper, spectrum *s, tg_error *e)
{
    tg_code code = TG_OK;
    const size_t side = s->side, nx = t->grid.n[0], all = s->slices * s->n;
    const double *step = t->grid.step_mm, slices = (double)t->n;
    double *plane = NULL, *v = NULL, *count = NULL, squared = 0;
    tg_fft fft = {0};
    tg_trend trend;
    TG_TRY(TG_NEW(plane, tg_grid_slice(&t->grid), e));
    TG_TRY(TG_NEW(v, n, e));
    TG_TRY(TG_NEW(count, s->bins, e));
    TG_TRY(tg_fft_create(side, side, &fft, e));
    tg_trend_over(t->n > 1 ? TG_CONSTANT : TG_CUP, index, n, nx, &trend);
    memset(s->each, 0, all * s->bins * sizeof *s->each);
    memset(s->f, 0, s->bins * sizeof *s->f);
    memset(s->s, 0, s->bins * sizeof *s->s);
    for (size_t k = 0; k < t->n; k++) {
        residuals(t, k, &trend, index, n, v, plane);
        for (size_t q = 0; q < s->n; q++) {
            const bool first = !k && !q;
            transform(plane + s->corner[q], nx, taper, &fft);
            add_rings(&fft, &t->grid, s, s->each + (k * s->n + q) * s->bins, first ? count : NULL, s->f);
        }
    }
    for (size_t i = 0; i < side; i++)
        squared += taper[i] * taper[i] / (double)side;
    /* slices minus their mean are worth one slice less */
    const double lost = t->n > 1 ? slices / (slices - 1) : 1;
    const double scale = step[0] * step[1] / ((double)(side * side) * squared * squared) * lost;
    for (size_t i = 0; i < all * s->bins; i++) {
        s->each[i] *= scale / count[i % s->bins];
        s->s[i % s->bins] += s->each[i] / (double)all;
    }
    for (size_t i = 0; i < s->bins; i++)
        s->f[i] /= count[i];
    s->independent = independent_squares(s, nx, taper) * fmax(slices - 1, 1);
done:
    tg_free(plane);
    tg_free(v);
    tg_free(count);
    tg_fft_free(&fft);
    return code;
}

static size_t largest(const double *v, size_t n)
{
    size_t best = 0;
    for (size_t i = 1; i < n; i++)
        if (v[i] > v[best]) best = i;
    return best;
}

/** The spectrum of a target's body. Fills `why` where there is none. */
static tg_code measure_spectrum(const tg_target *t, spectrum *s, tg_error *e)
{
    tg_code code = TG_OK;
    size_t *index = NULL, n;
    double *taper = NULL;
    const double step = fmax(t->grid.step_mm[0], t->grid.step_mm[1]);
    *s = (spectrum){.slices = t->n};
    TG_TRY(tg_noise_pixels(t, &index, &n, e));
    TG_TRY(choose_squares(t, index, n, s, e));
    if (s->why[0]) goto done;
    s->bins = s->side / 2;
    s->step_per_mm = 1 / ((double)s->side * step);
    s->nyquist_per_mm = 1 / (2 * step);
    TG_TRY(TG_NEW(s->f, s->bins, e));
    TG_TRY(TG_NEW(s->s, s->bins, e));
    TG_TRY(TG_NEW(s->each, s->slices * s->n * s->bins, e));
    TG_TRY(TG_NEW(taper, s->side, e));
    for (size_t i = 0; i < s->side; i++)
        taper[i] = 0.5 - 0.5 * cos(2 * M_PI * ((double)i + 0.5) / (double)s->side);
    TG_TRY(analyse(t, index, n, taper, s, e)); /* without leakage one sees whether it would matter */
    const size_t peak = largest(s->s, s->bins);
    for (size_t i = peak; i < s->bins; i++)
        s->tapered = s->tapered || s->s[i] < 0.02 * s->s[peak];
    if (!s->tapered) {
        for (size_t i = 0; i < s->side; i++)
            taper[i] = 1;
        TG_TRY(analyse(t, index, n, taper, s, e));
    }
    if (!(s->s[peak] > 0)) snprintf(s->why, sizeof s->why, "there is no noise in the image");
done:
    tg_free(index);
    tg_free(taper);
    return code;
}

/** Standard uncertainty of a figure that changes by sum_k slope_k dS_k: from how that sum scatters between squares.
 *  @param dof  its degrees of freedom */
static double scatter(const spectrum *s, const double *slope, double *dof)
{
    const size_t n = s->n * s->slices;
    double sum = 0, square = 0;
    for (size_t q = 0; q < n; q++) {
        double z = 0;
        for (size_t k = 0; k < s->bins; k++)
            z += slope[k] * (s->each[q * s->bins + k] - s->s[k]);
        sum += z;
        square += z * z;
    }
    *dof = fmax(s->independent - 1, 1);
    return sqrt(fmax(square - sum * sum / (double)n, 0) / ((double)n * *dof));
}

/** int f S df / int S df up to the pixels' Nyquist frequency, and how it changes with S.
 *  Below the first ring S is the straight line through the first two, but not below 0. @param slope  {bins} or NULL */
static double mean_frequency(const double *f, const double *s, size_t bins, double nyquist, double *slope)
{
    const double along = f[0] / (f[1] - f[0]), origin = (1 + along) * s[0] - along * s[1];
    double below = 0, above = 0;
    for (int pass = 0; pass < 2; pass++) /* sums, then slopes */
        for (size_t k = 0; k < bins; k++) {
            const double low = k ? f[k - 1] : 0, high = k + 1 < bins ? f[k + 1] : 2 * nyquist - f[k];
            const double weight = 0.5 * (high - low);
            double share = weight; /* of S_k in the integral of S */
            if (origin > 0 && k < 2) share += 0.5 * f[0] * (k ? -along : 1 + along);
            if (pass && slope) slope[k] = (f[k] * weight - above / below * share) / below;
            if (pass) continue;
            below += share * s[k];
            above += f[k] * weight * s[k];
        }
    return above / below;
}

/** Least squares parabola over rings [a, b); its peak and how it changes with S. @param slope  {bins} zeroed */
static double parabola_peak(const spectrum *s, size_t a, size_t b, double *slope)
{
    const double middle = 0.5 * (s->f[a] + s->f[b - 1]), half = 0.5 * (s->f[b - 1] - s->f[a]);
    double m[5] = {0}, r[3] = {0}, inverse[3][3];
    for (size_t k = a; k < b; k++) {
        const double x = (s->f[k] - middle) / half;
        for (int i = 0; i < 5; i++)
            m[i] += pow(x, i);
        for (int i = 0; i < 3; i++)
            r[i] += pow(x, i) * s->s[k];
    }
    const double det =
        m[0] * (m[2] * m[4] - m[3] * m[3]) - m[1] * (m[1] * m[4] - m[3] * m[2]) + m[2] * (m[1] * m[3] - m[2] * m[2]);
    const double cofactor[3][3] = {{m[2] * m[4] - m[3] * m[3], m[2] * m[3] - m[1] * m[4], m[1] * m[3] - m[2] * m[2]},
                                   {m[2] * m[3] - m[1] * m[4], m[0] * m[4] - m[2] * m[2], m[1] * m[2] - m[0] * m[3]},
                                   {m[1] * m[3] - m[2] * m[2], m[1] * m[2] - m[0] * m[3], m[0] * m[2] - m[1] * m[1]}};
    double c[3] = {0};
    for (int i = 0; i < 3; i++)
        for (int j = 0; j < 3; j++) {
            inverse[i][j] = cofactor[i][j] / det;
            c[i] += inverse[i][j] * r[j];
        }
    if (!(c[2] < 0)) return NAN;
    const double x = -c[1] / (2 * c[2]);
    for (size_t k = a; k < b; k++) {
        const double u = (s->f[k] - middle) / half;
        const double d1 = inverse[1][0] + inverse[1][1] * u + inverse[1][2] * u * u;
        const double d2 = inverse[2][0] + inverse[2][1] * u + inverse[2][2] * u * u;
        slope[k] = half * (-d1 / (2 * c[2]) + c[1] * d2 / (2 * c[2] * c[2]));
    }
    return fabs(x) <= 1 ? middle + half * x : (double)NAN;
}

/** Mean of a ring and its neighbours: single rings of a flat spectrum look like peaks. */
static double smoothed(const spectrum *s, size_t k)
{
    const size_t low = k ? k - 1 : 0, high = k + 1 < s->bins ? k + 1 : k;
    return (s->s[low] + s->s[k] + s->s[high]) / 3;
}

/** Rings around the peak whose power is at least seven tenths of it. False: it falls to one side only, or to none. */
static bool peak_rings(const spectrum *s, size_t *a, size_t *b)
{
    size_t peak = 0;
    for (size_t k = 1; k < s->bins; k++)
        if (smoothed(s, k) > smoothed(s, peak)) peak = k;
    const double level = 0.7 * smoothed(s, peak);
    *a = *b = peak;
    while (*a > 0 && smoothed(s, *a - 1) >= level)
        --*a;
    while (*b < s->bins && smoothed(s, *b) >= level)
        ++*b;
    if (*a == 0 || *b == s->bins) return false;
    while (*b - *a < 5) { /* a parabola needs some rings to be told from noise */
        if (*a > 0) --*a;
        if (*b < s->bins) ++*b;
    }
    return true;
}

enum { FINE = 2000 }; /* frequencies at which theory is asked */

/** What theory expects; NaN where the image does not say enough. @param peak  else the mean */
static double expected(const tg_target *t, const spectrum *s, bool peak, double f[FINE], double theory[FINE])
{
    for (size_t i = 0; i < FINE; i++) {
        f[i] = s->nyquist_per_mm * (double)(i + 1) / FINE;
        theory[i] = tg_theory_nps(&t->theory, 1, f[i]);
        if (isnan(theory[i])) return NAN;
    }
    return peak ? f[largest(theory, FINE)] : mean_frequency(f, theory, FINE, s->nyquist_per_mm, NULL);
}

static void middle_of(const tg_target *t, const spectrum *s, size_t square, double mm[2])
{
    const double last = 0.5 * ((double)s->side - 1);
    mm[0] = tg_grid_mm(&t->grid, 0, (double)(s->corner[square] % t->grid.n[0]) + last);
    mm[1] = tg_grid_mm(&t->grid, 1, (double)(s->corner[square] / t->grid.n[0]) + last);
}

static tg_code add_curve(const tg_target *t, const char *name, const spectrum *s, tg_results *out, tg_error *e)
{
    double variance = 0, mm[2]; /* the middle of a body is noisier than its edge: mean over the squares */
    for (size_t q = 0; q < s->n; q++) {
        middle_of(t, s, q, mm);
        variance += tg_noise_line_variance(t, mm) / (double)s->n;
    }
    const bool known = isfinite(tg_theory_nps(&t->theory, variance, s->f[0]));
    tg_curve *c = tg_results_add_curve(out, "nps", name, "1/mm", t->unit == TG_HU ? "HU^2 mm^2" : "", s->bins, known);
    if (!c) return tg_no_memory(e, s->bins, 3 * sizeof(double));
    for (size_t k = 0; k < s->bins; k++) {
        c->x[k] = s->f[k];
        c->y[k] = s->s[k];
        if (known) c->predicted[k] = tg_theory_nps(&t->theory, variance, s->f[k]);
    }
    return TG_OK;
}

static tg_code add_squares(const tg_target *t, const char *name, const spectrum *s, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    const double half = 0.5 * (double)s->side;
    for (size_t q = 0; q < s->n && code == TG_OK; q++) {
        tg_region r = {.outline = TG_BOX, .half_mm = {half * t->grid.step_mm[0], half * t->grid.step_mm[1]}};
        middle_of(t, s, q, r.centre_mm);
        snprintf(r.label, sizeof r.label, "%.50s nps", name);
        code = tg_results_add_region(out, &r, e);
    }
    return code;
}

/** Peak or mean of a spectrum. @param work  {2 FINE + bins} */
static tg_code add_figure(const tg_target *t, const char *name, const spectrum *s, bool peak, double *work,
                          tg_results *out, tg_error *e)
{
    tg_result *r = tg_results_add(out, peak ? "nps-peak" : "nps-mean", name, "1/mm");
    double *const slope = work + 2 * FINE, dof;
    size_t a = 0, b = 0;
    if (!r) return tg_no_memory(e, 1, sizeof *r);
    if (s->why[0]) {
        tg_result_null(r, "%s", s->why);
        return TG_OK;
    }
    r->predicted = expected(t, s, peak, work, work + FINE);
    memset(slope, 0, s->bins * sizeof *slope);
    if (!peak)
        r->value = mean_frequency(s->f, s->s, s->bins, s->nyquist_per_mm, slope);
    else if (peak_rings(s, &a, &b))
        r->value = parabola_peak(s, a, b, slope);
    if (isnan(r->value)) {
        tg_result_null(r, "the noise power has no peak between 0 and the pixels' Nyquist frequency");
        return TG_OK;
    }
    const double u = scatter(s, slope, &dof);
    tg_result_budget(r, "noise", u, dof);
    /* a peak that is no parabola is known to a ring, half of it to either side. The blur of a ring fills the origin,
     * where S is a cone, and draws the mean down by 0.2 to 0.4 ring^2 / mean (closed forms of Hann, Hamming, cosine) */
    const double ring = s->step_per_mm;
    tg_result_budget(r, "resolution", peak ? ring / sqrt(12) : 0.25 * ring * ring / r->value, (double)INFINITY);
    tg_result_combine(r);
    if (s->s[s->bins - 1] > 0.05 * s->s[largest(s->s, s->bins)])
        snprintf(r->note, sizeof r->note,
                 "the noise reaches beyond the pixels' Nyquist frequency; use a smaller field");
    return TG_OK;
}

tg_code tg_measure_nps(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    const char *const name = t->phantom->solid[solid].name.v;
    spectrum s = {0};
    double *work = NULL;
    (void)by;
    if (t->lost[0])
        snprintf(s.why, sizeof s.why, "%s", t->lost);
    else if (solid != t->body)
        snprintf(s.why, sizeof s.why, "the noise spectrum is a figure of the phantom's body");
    else
        TG_TRY(measure_spectrum(t, &s, e));
    TG_TRY(TG_NEW(work, 2 * FINE + s.bins, e));
    TG_TRY(add_figure(t, name, &s, true, work, out, e));
    TG_TRY(add_figure(t, name, &s, false, work, out, e));
    if (s.why[0]) goto done;
    TG_TRY(add_curve(t, name, &s, out, e));
    TG_TRY(add_squares(t, name, &s, out, e));
done:
    spectrum_free(&s);
    tg_free(work);
    return code;
}
