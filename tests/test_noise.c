/* The texture of noise: sums over pairs of pixels, learning it from slices, drawing it again. */
#include "metrics/noise.h"
#include "near.h"
#include "synthetic.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_sf_bessel.h>

enum { POINTS = 512 }; /* of Gauss and Legendre: four to the fastest oscillation */

/** Autocorrelation of isotropic noise: C(r) = int S(f) J0(2 pi f r) 2 pi f df / the same at r = 0, on a pixel grid. */
static tg_noise exact_noise(double (*power)(double, double), double cutoff_per_mm, double step_mm, size_t half)
{
    const size_t width = 2 * half + 1;
    tg_noise noise = {.half = half, .sd = 1, .dof = 1e6, .autocorrelation = tg_alloc(width * width, sizeof(double))};
    gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(POINTS);
    ck_assert_ptr_nonnull(noise.autocorrelation);
    for (size_t i = 0; i < width * width; i++) {
        const double r = step_mm * hypot((double)(i / width) - (double)half, (double)(i % width) - (double)half);
        double sum = 0, all = 0;
        for (size_t k = 0; k < rule->n; k++) {
            double f, w;
            gsl_integration_glfixed_point(0, cutoff_per_mm, k, &f, &w, rule);
            sum += w * f * power(f, cutoff_per_mm) * gsl_sf_bessel_J0(2 * M_PI * f * r);
            all += w * f * power(f, cutoff_per_mm);
        }
        noise.autocorrelation[i] = sum / all;
    }
    gsl_integration_glfixed_table_free(rule);
    return noise;
}

static double lag(const tg_noise *noise, long dx, long dy)
{
    const long half = (long)noise->half, width = 2 * half + 1;
    if (labs(dx) > half || labs(dy) > half) return 0;
    return noise->autocorrelation[(dy + half) * width + dx + half];
}

/** Pixels of a disc around the middle of a grid, some of them left out. */
static size_t disc(size_t nx, double radius, size_t leave_out, size_t *index)
{
    size_t n = 0;
    for (size_t i = 0; i < nx * nx; i++) {
        const double x = (double)(i % nx) - 0.5 * (double)(nx - 1), y = (double)(i / nx) - 0.5 * (double)(nx - 1);
        if (hypot(x, y) <= radius && (!leave_out || i % leave_out)) index[n++] = i;
    }
    return n;
}

/* the sums by Fourier are the sums over all pairs */
START_TEST(pairs_of_pixels)
{
    enum { NX = 33 };
    size_t index[NX * NX];
    double weight[NX * NX];
    tg_noise noise = exact_noise(synthetic_hann, 0.5, 0.7, 9);
    const size_t n = disc(NX, 11, 5, index);
    double plain = 0, weighted = 0, square = 0;
    for (size_t i = 0; i < n; i++)
        weight[i] = sin((double)i) / (double)n;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++) {
            const double c = lag(&noise, (long)(index[i] % NX) - (long)(index[j] % NX),
                                 (long)(index[i] / NX) - (long)(index[j] / NX));
            plain += c / (double)(n * n);
            weighted += weight[i] * weight[j] * c;
            square += c * c;
        }
    CK_NEAR(tg_noise_mean_variance(&noise, NX, index, NULL, n), plain, 1e-10, 0, "double sum over pairs");
    CK_NEAR(tg_noise_mean_variance(&noise, NX, index, weight, n), weighted, 1e-10, 0,
            "double sum over pairs, weighted");
    CK_NEAR(tg_noise_independent(&noise, NX, index, n), (double)(n * n) / square, 1e-10, 0, "double sum of squares");
    tg_noise_free(&noise);
}
END_TEST

/* white noise: 1 / n, n, n less the surfaces of a trend (textbook) */
START_TEST(white)
{
    enum { NX = 40 };
    size_t index[NX * NX];
    double one = 1;
    const tg_noise noise = {.autocorrelation = &one, .sd = 1};
    const size_t n = disc(NX, 12, 0, index);
    tg_trend trend;
    tg_noise_worth worth;
    tg_error e = {0};
    CK_NEAR(tg_noise_mean_variance(&noise, NX, index, NULL, n), 1 / (double)n, 1e-12, 0, "variance of a mean");
    CK_NEAR(tg_noise_independent(&noise, NX, index, n), n, 1e-12, 0, "independent pixels");
    tg_trend_over(TG_QUADRATIC, index, n, NX, &trend);
    CK_OK(tg_noise_weigh(&noise, &trend, index, n, &worth, &e));
    CK_NEAR(worth.freedom, n - 6, 1e-10, 0, "sum of squares around a quadratic");
    CK_NEAR(worth.sd_dof, n - 6, 1e-10, 0, "degrees of freedom around a quadratic");
}
END_TEST

/** Noise of the Hann window with linear interpolation between channels of pitch 1: the window's power, periodic with
 * the channels, times the interpolation's sinc^4 (Kijewski and Judy 1987). */
static double hann_linear(double f, double cutoff)
{
    const double aliased = fabs(f - round(f)), sinc = sin(M_PI * f) / (M_PI * f);
    const double a = 0.5 + 0.5 * cos(2 * M_PI * aliased);
    return f < cutoff ? aliased * aliased * a * a * pow(sinc, 4) / f : 0;
}

/** SD of the mean over a disc against the SD of a point in noise of power S, in the continuous plane:
 *  int S |2 J1(pi D f) / (pi D f)|^2 2 pi f df / int S 2 pi f df. */
static double disc_ratio(double (*power)(double, double), double cutoff, double diameter)
{
    double sum = 0, all = 0;
    gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(POINTS);
    for (size_t k = 0; k < rule->n; k++) {
        double f, w;
        gsl_integration_glfixed_point(0, cutoff, k, &f, &w, rule);
        const double a = M_PI * diameter * f, spectrum = 2 * gsl_sf_bessel_J1(a) / a;
        sum += w * f * power(f, cutoff) * spectrum * spectrum;
        all += w * f * power(f, cutoff);
    }
    gsl_integration_glfixed_table_free(rule);
    return sqrt(sum / all);
}

/* SD of a disc's mean over that of a pixel, for D channels of pitch 1 and pixels of a half: .408 .179 .073 for D = 5,
 * 10, 20 (tabulated with 1 / sqrt(n) = .113 .056 .028 beside them, to show how wrong that is; from memory: another disc
 * of pixels, so 1.5 %). The disc of pixels differs from the round one in the plane by less than half a pixel of its
 * diameter, and the ratio falls as D^-1.5. */
START_TEST(discs_of_hann_noise)
{
    static const struct {
        double diameter, ratio, white;
    } table[] = {{5, 0.408, 0.113}, {10, 0.179, 0.056}, {20, 0.073, 0.028}};
    enum { NX = 80 };
    size_t index[NX * NX];
    const double step = 0.5, top = 4; /* sinc^4 leaves nothing beyond */
    tg_noise noise = exact_noise(hann_linear, top, step, 45);
    for (size_t i = 0; i < 3; i++) {
        const double diameter = table[i].diameter;
        const size_t n = disc(NX, 0.5 * diameter / step, 0, index);
        const double got = sqrt(tg_noise_mean_variance(&noise, NX, index, NULL, n));
        CK_NEAR(got, disc_ratio(hann_linear, top, diameter), 1.5 * 0.5 * step / diameter, 0, "integral in the plane");
        CK_NEAR(got, table[i].ratio, 1.5 * 0.5 * step / diameter, 0.0005, "table");
        CK_NEAR(1 / sqrt((double)n), table[i].white, 0.02, 0.0005, "table, pixels taken as independent");
    }
    tg_noise_free(&noise);
}
END_TEST

static const Synthetic_solid body[] = {{"body", 0, 0, 60, 0}, {"rod", 30, 18, 8, 300}};
static const Synthetic plain = {
    .pixels = 128, .step_mm = 1, .fwhm_mm = 2, .slices = 1, .sd = 10, .solid = body, .solids = 2, .seed = 3};

/* what is learnt from slices is what they were made with: SD and short lags within four standard errors of the mean
 * over the draws, 1 / sqrt(independent pixels) each, and dof within the scatter of the SD itself */
START_TEST(learning)
{
    enum { DRAWS = 40 };
    Synthetic s = plain;
    Synthetic_case c;
    tg_error e = {0};
    s.slices = _i % 2 ? 4 : 1;
    s.power = _i / 2 ? synthetic_hann : NULL;
    s.cutoff_per_mm = 0.45;
    tg_noise want = exact_noise(synthetic_hann, s.cutoff_per_mm, s.step_mm, 4);
    double sum = 0, square = 0, dof = 0, independent = 0, at[4][4] = {{0}};
    CK_OK(synthetic_make(&s, &c, &e));
    for (uint64_t draw = 0; draw < DRAWS; draw++) {
        CK_OK(synthetic_draw(&s, draw, &c, &e));
        const tg_noise *got = &c.target.noise;
        ck_assert_double_eq(lag(got, 0, 0), 1);
        sum += got->sd / DRAWS;
        square += got->sd * got->sd / DRAWS;
        dof += got->dof / DRAWS;
        for (long y = 0; y < 4; y++)
            for (long x = 0; x < 4; x++)
                at[y][x] += lag(got, x, y) / DRAWS;
    }
    independent = DRAWS * dof;
    CK_NEAR(sum, s.sd, 4 / sqrt(2 * independent), 0, "SD that was put in");
    for (long y = 0; y < 4; y++)
        for (long x = 0; x < 4; x++) {
            const double truth = s.power ? lag(&want, x, y) : !x && !y;
            CK_NEAR(at[y][x], truth, 0, 4 * 1.5 / sqrt(independent), "autocorrelation that was put in");
        }
    /* relative SD of an SD is 1 / sqrt(2 dof); its own estimate from 40 draws is good to 1 / sqrt(2 * 39) = 11 % */
    CK_NEAR(sqrt((square - sum * sum) * DRAWS / (DRAWS - 1)) / sum, 1 / sqrt(2 * dof), 4 * 0.115, 0,
            "scatter of the SD");
    tg_noise_free(&want);
    synthetic_free(&c);
}
END_TEST

/* no noise, and no uniform part: an answer in either case */
START_TEST(nothing_to_learn)
{
    static const Synthetic_solid small[] = {{"body", 0, 0, 8, 0}};
    Synthetic s = plain;
    Synthetic_case c;
    tg_error e = {0};
    s.sd = 0;
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    ck_assert_double_lt(c.target.noise.sd, 1e-3);
    synthetic_free(&c);
    s.solid = small;
    s.solids = 1;
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    ck_assert(isnan(c.target.noise.sd));
    ck_assert_double_eq(lag(&c.target.noise, 0, 0), 1);
    synthetic_free(&c);
}
END_TEST

/* a trend is fitted exactly, and what it cannot tell apart it leaves alone */
START_TEST(trend)
{
    enum { NX = 20 };
    size_t index[NX * NX];
    float v[NX * NX];
    double slope[2], c[TG_CUP];
    tg_trend t;
    const size_t n = disc(NX, 7, 0, index);
    for (size_t i = 0; i < (size_t)NX * NX; i++) {
        const float x = (float)(i % NX), y = (float)(i / NX);
        v[i] = 3 + 2 * x - y + 0.5F * x * y;
    }
    tg_trend_over(TG_QUADRATIC, index, n, NX, &t);
    CK_NEAR(tg_trend_remove(&t, index, n, v, NULL, NULL), 0, 0, 1e-12 * (double)n, "a quadratic");
    tg_trend_fit(&t, index, n, v, NULL, c);
    tg_trend_slope(&t, c, slope);
    CK_NEAR(slope[0], 2 + 0.5 * 9.5, 1e-9, 0, "slope along x at the middle");
    CK_NEAR(slope[1], -1 + 0.5 * 9.5, 1e-9, 0, "slope along y at the middle");
    tg_trend_over(TG_QUADRATIC, index, 2, NX, &t); /* two pixels: a constant and one slope */
    CK_NEAR(tg_trend_remove(&t, index, 2, v, NULL, NULL), 0, 0, 1e-12, "two pixels");
}
END_TEST

Suite *suite_noise(void);
Suite *suite_noise(void)
{
    SUITE_BEGIN("noise", 60);
    tcase_add_test(tcase, pairs_of_pixels);
    tcase_add_test(tcase, white);
    tcase_add_test(tcase, discs_of_hann_noise);
    tcase_add_loop_test(tcase, learning, 0, 4);
    tcase_add_test(tcase, nothing_to_learn);
    tcase_add_test(tcase, trend);
    return suite;
}
