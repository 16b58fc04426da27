#include "metrics/noise.h"

#include "io/memory.h"
#include "metrics/place.h"
#include "metrics/trend.h"
#include "recon/fft.h"

#include <complex.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <string.h>

/** |z|^2 */
static double power(double _Complex z)
{
    return creal(z) * creal(z) + cimag(z) * cimag(z);
}

/** Smallest rectangle of pixels around a set. */
typedef struct {
    size_t x0, y0, nx, ny;
} box;

static box box_around(const size_t *index, size_t n, size_t nx)
{
    size_t x0 = SIZE_MAX, y0 = SIZE_MAX, x1 = 0, y1 = 0;
    for (size_t i = 0; i < n; i++) {
        const size_t x = index[i] % nx, y = index[i] / nx;
        x0 = x < x0 ? x : x0;
        x1 = x > x1 ? x : x1;
        y0 = y < y0 ? y : y0;
        y1 = y > y1 ? y : y1;
    }
    return n ? (box){x0, y0, x1 - x0 + 1, y1 - y0 + 1} : (box){0, 0, 1, 1};
}

/** Spread values over the pixels of their set in an empty transform buffer. @param value  {n}, NULL: 1 each */
static void scatter(const tg_fft *fft, const box *b, const size_t *index, const double *value, size_t n, size_t nx)
{
    memset(fft->real, 0, fft->ny * fft->nx * sizeof *fft->real);
    for (size_t i = 0; i < n; i++)
        fft->real[(index[i] / nx - b->y0) * fft->nx + index[i] % nx - b->x0] = value ? value[i] : 1;
}

/* ---------------------------------------------------------------- sums over pairs of pixels */

/** Sums over the pairs of a set of pixels, sum_ij w_i w_j C(i - j): in the spectra of w and C, on a torus so large that
 *  no pair within reach of C wraps around. */
typedef struct {
    tg_fft fft;
    box b;
    const size_t *index;
    size_t n, nx, row, size; /* of slice and half spectrum */
    double *texture;         /* {size} spectrum of C to a power */
    double *weight;          /* {size} squared spectrum of w */
} pairs;

static tg_code pairs_open(const tg_noise *noise, size_t nx, const size_t *index, size_t n, pairs *p, tg_error *e)
{
    tg_code code = TG_OK;
    *p = (pairs){.b = box_around(index, n, nx), .index = index, .n = n, .nx = nx};
    const size_t margin = 2 * noise->half;
    TG_TRY(tg_fft_create(tg_fft_length(p->b.ny + margin), tg_fft_length(p->b.nx + margin), &p->fft, e));
    p->row = p->fft.nx / 2 + 1;
    p->size = p->fft.ny * p->row;
    TG_TRY(TG_NEW(p->texture, p->size, e));
    TG_TRY(TG_NEW(p->weight, p->size, e));
done:
    return code;
}

static void pairs_close(pairs *p)
{
    tg_fft_free(&p->fft);
    tg_free(p->texture);
    tg_free(p->weight);
}

/** Lay the autocorrelation into a transform buffer, lag 0 at its corner. @param exponent  0, 1, 2: C to a power */
static void lay_out(const tg_noise *noise, const tg_fft *fft, int exponent)
{
    const long half = (long)noise->half, ny = (long)fft->ny, nx = (long)fft->nx;
    const double *c = noise->autocorrelation;
    memset(fft->real, 0, fft->ny * fft->nx * sizeof *fft->real);
    for (long y = -half; y <= half; y++)
        for (long x = -half; x <= half; x++, c++)
            fft->real[(y + ny) % ny * nx + (x + nx) % nx] = exponent == 0 ? 1 : exponent == 1 ? *c : *c * *c;
}

static void pairs_texture(pairs *p, const tg_noise *noise, int exponent)
{
    lay_out(noise, &p->fft, exponent);
    tg_fft_forward(&p->fft);
    for (size_t i = 0; i < p->size; i++)
        p->texture[i] = creal(p->fft.half[i]);
}

/** @param weight  {n}, NULL: 1 each */
static void pairs_weight(pairs *p, const double *weight)
{
    scatter(&p->fft, &p->b, p->index, weight, p->n, p->nx);
    tg_fft_forward(&p->fft);
    for (size_t i = 0; i < p->size; i++)
        p->weight[i] = power(p->fft.half[i]);
}

/** The sum; and over all l the squares of g(l) = sum_ij w_i w_j C(i - j + l), the covariance of the weighted sum with
 *  the same one elsewhere.  @param squares  may be NULL */
static double pairs_sum(const pairs *p, double *squares)
{
    double s = 0, q = 0;
    for (size_t i = 0; i < p->size; i++) {
        const size_t column = i % p->row;
        const double twice = column && column < p->row - 1 ? 2 : 1, g = p->weight[i] * p->texture[i];
        s += twice * g;
        q += twice * g * g;
    }
    const double scale = 1 / (double)(p->fft.ny * p->fft.nx);
    if (squares) *squares = q * scale;
    return s * scale;
}

double tg_noise_mean_variance(const tg_noise *noise, size_t nx, const size_t *index, const double *weight, size_t n)
{
    pairs p;
    double sum = NAN;
    if (n && pairs_open(noise, nx, index, n, &p, NULL) == TG_OK) {
        pairs_texture(&p, noise, 1);
        pairs_weight(&p, weight);
        sum = fmax(pairs_sum(&p, NULL), 0) / (weight ? 1 : (double)n * (double)n);
    }
    if (n) pairs_close(&p);
    return sum;
}

/** sum_ij C^2(i - j), the weights being 1. The scatter of an estimated texture adds its own square, sum_l C^2(l) /
 *  pixels at every lag (Bartlett 1946): taken out. */
static double squared_sum(pairs *p, const tg_noise *noise)
{
    double within = 0;
    if (noise->pixels > 0) {
        pairs_texture(p, noise, 0);
        within = pairs_sum(p, NULL) / ((double)p->n * noise->pixels);
    }
    pairs_texture(p, noise, 2);
    return pairs_sum(p, NULL) / (1 + within);
}

double tg_noise_independent(const tg_noise *noise, size_t nx, const size_t *index, size_t n)
{
    pairs p;
    double independent = NAN;
    if (n && pairs_open(noise, nx, index, n, &p, NULL) == TG_OK) {
        pairs_weight(&p, NULL);
        independent = (double)n * (double)n / squared_sum(&p, noise);
    }
    if (n) pairs_close(&p);
    return independent;
}

tg_code tg_noise_weigh(const tg_noise *noise, const tg_trend *trend, const size_t *index, size_t n, tg_noise_worth *out,
                       tg_error *e)
{
    tg_code code = TG_OK;
    const double count = (double)n;
    double *mode = NULL, squares, lost = 0, lost_squares = 0;
    pairs p;
    TG_TRY(pairs_open(noise, trend->nx, index, n, &p, e));
    TG_TRY(TG_NEW(mode, n, e));

    pairs_weight(&p, NULL);
    const double correlated = squared_sum(&p, noise);
    pairs_texture(&p, noise, 1);
    const double sum = pairs_sum(&p, &squares);
    for (size_t k = 0; k < trend->modes; k++) {
        tg_trend_mode(trend, k, index, n, mode);
        pairs_weight(&p, mode);
        const double taken = fmin(fmax(pairs_sum(&p, NULL), 0), 0.5 * count);
        lost += taken;
        lost_squares += taken * taken;
    }
    /* a smooth mode is nearly an eigenvector of the covariance matrix: traces of the matrix projected on the rest */
    const double freedom = fmax(count - lost, 1), trace = fmax(correlated - lost_squares, 0);
    *out = (tg_noise_worth){.mean_variance = fmax(sum, 0) / (count * count),
                            .mean_dof =
                                noise->pixels > 0 ? fmax(noise->pixels * sum * sum / squares, 1) : (double)INFINITY,
                            .freedom = freedom,
                            .sd_dof = fmax(freedom * freedom / trace, 1)};
done:
    pairs_close(&p);
    tg_free(mode);
    return code;
}

/* ---------------------------------------------------------------- learning */

tg_code tg_noise_pixels(const tg_target *t, size_t **index, size_t *n, tg_error *e)
{
    const size_t pixels = tg_grid_slice(&t->grid);
    tg_code code = TG_OK;
    *n = 0;
    TG_TRY(TG_NEW(*index, pixels, e));
    for (size_t i = 0; i < pixels; i++)
        if (t->label[i] == t->body && (double)t->clear_mm[i] >= TG_CLEAR_SPREADS * t->spread_mm && tg_place_valid(t, i))
            (*index)[(*n)++] = i;
done:
    return code;
}

/** Sum over a set's pairs at every lag: the autocorrelation of what stands in the transform buffer, into the same. */
static void correlate(const tg_fft *fft)
{
    const size_t size = fft->ny * (fft->nx / 2 + 1);
    tg_fft_forward(fft);
    for (size_t i = 0; i < size; i++)
        fft->half[i] = power(fft->half[i]);
    tg_fft_inverse(fft);
}

/** Add the lags of a transform buffer to a table {2 half + 1, 2 half + 1}. */
static void gather(const tg_fft *fft, size_t reach, double *lags)
{
    const long half = (long)reach, ny = (long)fft->ny, nx = (long)fft->nx;
    for (long y = -half; y <= half; y++)
        for (long x = -half; x <= half; x++)
            *lags++ += fft->real[(y + ny) % ny * nx + (x + nx) % nx];
}

/** 1 up to `flat`, falling as a cosine to 0 beyond `half`. */
static double taper(double lag, double flat, double half)
{
    if (lag <= flat) return 1;
    return lag > half ? 0 : 0.5 + 0.5 * cos(M_PI * (lag - flat) / (half + 1 - flat));
}

/** Sums over pairs of residuals (all slices), of pixels, and of the smooth modes that the residuals lack. */
static tg_code sum_lags(const tg_target *t, const size_t *index, size_t n, size_t half, double *residual, double *count,
                        double *modes, double *square, tg_error *e)
{
    tg_code code = TG_OK;
    const size_t nx = t->grid.n[0];
    const box b = box_around(index, n, nx);
    tg_fft fft = {0};
    double *v = NULL;
    tg_trend trend;
    TG_TRY(TG_NEW(v, n, e));
    TG_TRY(tg_fft_create(tg_fft_length(b.ny + half), tg_fft_length(b.nx + half), &fft, e));
    scatter(&fft, &b, index, NULL, n, nx);
    correlate(&fft);
    gather(&fft, half, count);

    tg_trend_over(t->n > 1 ? TG_CONSTANT : TG_CUP, index, n, nx, &trend);
    *square = 0;
    for (size_t k = 0; k < t->n; k++) {
        *square += tg_trend_remove(&trend, index, n, t->slice[k], t->n > 1 ? t->mean : NULL, v);
        scatter(&fft, &b, index, v, n, nx);
        correlate(&fft);
        gather(&fft, half, residual);
    }
    for (size_t k = 0; k < trend.modes; k++) {
        tg_trend_mode(&trend, k, index, n, v);
        scatter(&fft, &b, index, v, n, nx);
        correlate(&fft);
        gather(&fft, half, modes);
    }
done:
    tg_fft_free(&fft);
    tg_free(v);
    return code;
}

double tg_noise_scale(const tg_target *t)
{
    return fabs(t->noise.level + (t->unit == TG_HU ? 1000 : 0));
}

/** Level and SD by medians, around a smooth trend that is fitted again without what stands out by three SD. */
static tg_code learn_robust(const tg_target *t, const size_t *index, size_t n, tg_noise *noise, tg_error *e)
{
    enum { FITS = 5 };
    tg_code code = TG_OK;
    double *v = NULL, *size = NULL;
    size_t *kept = NULL;
    TG_TRY(TG_NEW(v, n, e));
    TG_TRY(TG_NEW(size, n, e));
    TG_TRY(TG_NEW(kept, n, e));
    for (size_t i = 0; i < n; i++) {
        v[i] = (double)t->slice[0][index[i]];
        kept[i] = index[i];
    }
    gsl_sort(v, 1, n);
    noise->level = gsl_stats_median_from_sorted_data(v, 1, n);
    for (int k = 0; k < FITS; k++) {
        tg_trend trend;
        tg_trend_over(TG_CUP, kept, n, t->grid.n[0], &trend);
        tg_trend_remove(&trend, kept, n, t->slice[0], NULL, v);
        for (size_t i = 0; i < n; i++)
            size[i] = fabs(v[i]);
        gsl_sort(size, 1, n);
        noise->robust_sd = 1.4826 * gsl_stats_median_from_sorted_data(size, 1, n);
        size_t left = 0;
        for (size_t i = 0; i < n; i++)
            if (fabs(v[i]) <= 3 * noise->robust_sd) kept[left++] = kept[i];
        if (left < TG_LEAST_PIXELS) break; /* no noise: nothing lies within three times nothing */
        n = left;
    }
done:
    tg_free(v);
    tg_free(size);
    tg_free(kept);
    return code;
}

tg_code tg_noise_learn(const tg_target *t, tg_noise *noise, tg_error *e)
{
    tg_code code = TG_OK;
    size_t *index = NULL, n;
    double *count = NULL, *modes = NULL, square;
    tg_noise made = {.sd = NAN, .level = NAN, .robust_sd = NAN};
    TG_TRY(tg_noise_pixels(t, &index, &n, e));
    const box b = box_around(index, n, t->grid.n[0]);
    /* flat up to the size of a body's regions, a tenth of its diameter; the table covers at most half of the pixels */
    const double wanted = fmax(0.11 * (double)(b.nx > b.ny ? b.nx : b.ny), 12), side = sqrt((double)n);
    const double flat = n < TG_LEAST_PIXELS ? 0 : ceil(fmin(wanted, 0.25 * side));
    made.half = (size_t)(1.25 * flat);
    const size_t width = 2 * made.half + 1, lags = width * width;
    TG_TRY(TG_NEW(made.autocorrelation, lags, e));
    double *c = made.autocorrelation;
    c[lags / 2] = 1;
    if (n < TG_LEAST_PIXELS) goto done;

    TG_TRY(TG_NEW(count, lags, e));
    TG_TRY(TG_NEW(modes, lags, e));
    c[lags / 2] = 0;
    TG_TRY(sum_lags(t, index, n, made.half, c, count, modes, &square, e));
    const double slices = t->n > 1 ? (double)t->n - 1 : 1;
    double low = 0, gain = 0;
    for (size_t i = 0; i < lags; i++) {
        const double y = (double)(i / width) - (double)made.half, x = (double)(i % width) - (double)made.half;
        const double w = count[i] > 0.05 * (double)n ? taper(hypot(x, y), flat, (double)made.half) / count[i] : 0;
        c[i] *= w / slices;
        modes[i] *= w;
        low += c[i];
        gain += modes[i];
    }
    /* the fitted modes took noise power of frequency 0 with them: C + S(0) h, with S(0) = sum(C + S(0) h) */
    const double floor = fmax(low, 0) / (1 - fmin(gain, 0.8));
    double squares = 0;
    for (size_t i = 0; i < lags; i++)
        c[i] += floor * modes[i];
    const double variance = c[lags / 2];
    made.pixels = (double)n * slices;
    if (variance > 0) {
        double own = 0;
        for (size_t i = 0; i < lags; i++) {
            c[i] /= variance;
            squares += c[i] * c[i] * count[i] / (double)n;
            own += count[i] / (double)n / made.pixels;
        }
        made.dof = made.pixels * (1 + own) / squares;
    } else {
        memset(c, 0, lags * sizeof *c);
        c[lags / 2] = 1;
        made.dof = made.pixels;
    }
    made.sd = sqrt(fmax(variance, 0));
    TG_TRY(learn_robust(t, index, n, &made, e));
done:
    tg_free(index);
    tg_free(count);
    tg_free(modes);
    if (code == TG_OK)
        *noise = made;
    else
        tg_noise_free(&made);
    return code;
}

void tg_noise_free(tg_noise *noise)
{
    tg_free(noise->autocorrelation);
    *noise = (tg_noise){0};
}
