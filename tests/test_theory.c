#include "metrics/theory.h"

#include "io/memory.h"
#include "phantoms/random.h"
#include "recon/fft.h"
#include "recon/reconstruct.h"
#include "recon/weights.h"
#include "tests/near.h"

#include <complex.h>
#include <string.h>

/* A parallel scan of `views` over half a turn with a pitch of 1 mm, and the image that a kernel makes of it. */
static tg_sinogram make_scan(tg_geometry geometry, size_t channels, size_t views, size_t rows)
{
    tg_error e = {0};
    tg_sinogram s;
    tg_scan scan = {.geometry = geometry,
                    .channels = channels,
                    .views = views,
                    .rows = rows,
                    .channel_zero = 0.5 * ((double)channels - 1),
                    .channel_step = 1,
                    .row_step_mm = 1};
    if (geometry != TG_PARALLEL) {
        scan.source_axis_mm = 1000;
        scan.source_detector_mm = 1500;
        scan.channel_step = geometry == TG_FAN_EQUIANGULAR ? 1e-3 : 1.5;
    }
    CK_OK(TG_NEW(scan.angle_rad, views, &e));
    for (size_t i = 0; i < views; i++)
        scan.angle_rad[i] = (geometry == TG_PARALLEL ? M_PI : 2 * M_PI) * (double)i / (double)views;
    CK_OK(tg_sinogram_create(&scan, &s, &e));
    tg_scan_free(&scan);
    return s;
}

static tg_image reconstruct(const tg_sinogram *s, const char *kernel, size_t pixels, double field_mm, double x_mm,
                            double y_mm)
{
    tg_error e = {0};
    tg_recipe r = {0};
    tg_image image;
    CK_OK(tg_fields_default(tg_recipe_fields, &r, &e));
    CK_OK(tg_field_set(tg_fields_find(tg_recipe_fields, "kernel"), &r, kernel, NULL, 0, &e));
    r.pixels = (tg_number){(double)pixels, 1};
    r.field_mm = (tg_number){field_mm, 1};
    r.centre_mm = (tg_vector){{x_mm, y_mm, 0}, 1};
    CK_OK(tg_reconstruct(s, &r, NULL, &image, &e));
    tg_fields_free(tg_recipe_fields, &r);
    return image;
}

/* An image that only says how it was made. */
static tg_image made_with(const tg_scan *scan, const char *kernel)
{
    tg_error e = {0};
    tg_image image;
    const tg_grid grid = {{1, 1, 1}, {1, 1, 1}, {0, 0, 0}};
    CK_OK(tg_image_create(&grid, TG_PER_MM, &image, &e));
    CK_OK(tg_scan_copy(scan, &image.scan, &e));
    image.method = tg_copy_text("fbp");
    image.kernel = tg_copy_text(kernel);
    image.facts.aperture_mm = (tg_number){1e-9, 1};
    return image;
}

/* What theory expects of an image; the windows by name own nothing that must be freed. */
static tg_theory learned(const tg_image *image)
{
    tg_theory theory;
    tg_theory_learn(image, &theory);
    return theory;
}

/* ---- closed forms ---- */

/* The formulas of the windows with linear interpolation, integrated and solved with scipy (quad, brentq): F_lin of the
 * variance pi^2 F_lin / (12 M tau^2) (Chesler, Riederer and Pelc 1977), frequencies of MTF 50 and 10 %, peak and mean
 * frequency of the NPS up to Nyquist (Riederer, Pelc and Chesler 1978), all in 1 / pitch. */
static const struct {
    const char *kernel;
    double f_lin, f50, f10, peak, mean;
} forms[] = {
    {"ramp", 0.46402, 0.44295, NAN, 0.26889, 0.27464},
    {"shepp-logan", 0.30396, 0.36606, NAN, 0.22137, 0.24882},
    {"cosine", 0.12537, 0.27611, 0.43715, 0.16848, 0.19224},
    {"hann", 0.06596, 0.22147, 0.36901, 0.13444, 0.15807},
    {"hamming", 0.07725, 0.23019, 0.39698, 0.13935, 0.16747},
    {"parzen", 0.02997, 0.16824, 0.29655, 0.10185, 0.12409},
    {"butterworth@0.5", 0.14034, 0.27290, 0.49778, 0.16484, 0.19579},
};

START_TEST(closed_form)
{
    enum { CELLS = 2000 };
    tg_sinogram s = make_scan(TG_PARALLEL, 8, 100, 1);
    tg_image image = made_with(&s.scan, forms[_i].kernel);
    const tg_theory theory = learned(&image);
    const double sd = tg_theory_sd(&theory, 4.0);
    CK_NEAR(sd * sd / 4 * 12 * 100 / (M_PI * M_PI), forms[_i].f_lin, 0, 6e-6, "F_lin, 5 digits");
    const double want[] = {forms[_i].f50, forms[_i].f10};
    for (int i = 0; i < 2; i++) {
        const double f = tg_theory_mtf_frequency(&theory, i ? 0.1 : 0.5);
        if (isnan(want[i])) {
            ck_assert(isnan(f));
            continue;
        }
        CK_NEAR(f, want[i], 0, 6e-6, "MTF 50 and 10 %, 5 digits");
        CK_NEAR(tg_theory_mtf(&theory, f), i ? 0.1 : 0.5, 1e-6, 0, "the MTF there");
    }
    double peak = 0, at = 0, sum = 0, mean = 0;
    for (int i = 0; i < CELLS; i++) {
        const double f = 0.5 * (i + 0.5) / CELLS, nps = tg_theory_nps(&theory, 1, f);
        if (nps > peak) peak = nps, at = f;
        sum += nps;
        mean += f * nps;
    }
    CK_NEAR(at, forms[_i].peak, 0, 1.3e-4, "frequency of the NPS peak, half a cell");
    CK_NEAR(mean / sum, forms[_i].mean, 0, 6e-6, "mean frequency of the NPS, 5 digits");
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

/* The NPS over the plane is the variance: int S 2 pi f df, all repetitions included (Parseval). */
START_TEST(parseval)
{
    enum { CELLS = 40000 };
    tg_sinogram s = make_scan(TG_PARALLEL, 8, 100, 1);
    tg_image image = made_with(&s.scan, "shepp-logan");
    const tg_theory theory = learned(&image);
    double sum = 0;
    for (int i = 0; i < CELLS; i++) { /* to 20 / pitch: what lies beyond is below 1e-4 of it */
        const double f = 20 * (i + 0.5) / CELLS;
        sum += 2 * M_PI * f * tg_theory_nps(&theory, 1, f) * 20 / CELLS;
    }
    CK_NEAR(sqrt(sum), tg_theory_sd(&theory, 1), 1e-4, 0, "Parseval");
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

/* The worked example of a 20 cm water disc at 70 keV, mu 0.1929/cm: 1000 views, pitch 1 mm, SD of line integrals .01539
 * (2e5 photons a ray): 15.6 HU with linear interpolation. */
START_TEST(example_in_hu)
{
    tg_sinogram s = make_scan(TG_PARALLEL, 8, 1000, 1);
    tg_image image = made_with(&s.scan, "ramp");
    image.unit = TG_HU;
    tg_theory theory = learned(&image);
    ck_assert(isnan(tg_theory_sd(&theory, 1))); /* HU of unknown water */
    image.facts.mu_water_per_mm = (tg_number){0.01929, 1};
    theory = learned(&image);
    CK_NEAR(tg_theory_sd(&theory, .01539 * .01539), 15.6, 0, 0.051, "worked example, 3 digits");
    const double hu = tg_theory_nps(&theory, 1, 0.2);
    image.unit = TG_PER_MM;
    theory = learned(&image);
    CK_NEAR(hu / tg_theory_nps(&theory, 1, 0.2), pow(1000 / 0.01929, 2), 1e-12, 0, "HU squared");
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

/* Apertures of detector and focal spot, scaled to the axis: m = 1.8, 1.0 mm each make .556 and .444 mm. */
START_TEST(apertures)
{
    tg_sinogram s = make_scan(TG_FAN_EQUISPACED, 8, 100, 1);
    s.scan.source_axis_mm = 500, s.scan.source_detector_mm = 900;
    s.scan.channel_step = 0.18; /* 0.1 mm at the axis */
    tg_image image = made_with(&s.scan, "ramp");
    tg_theory theory = learned(&image);
    const double f = 0.9, bare = tg_theory_mtf(&theory, f);
    image.facts.aperture_mm.v = 1.0 / 1.8;
    image.facts.focal_spot_mm = (tg_number){1, 1};
    theory = learned(&image);
    const double x = M_PI * f * 0.5556, y = M_PI * f * 0.4444;
    CK_NEAR(tg_theory_mtf(&theory, f) / bare, sin(x) / x * sin(y) / y, 1e-4, 0, "sinc of either, common practice");
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(unknown)
{
    tg_sinogram s = make_scan(TG_PARALLEL, 8, 100, 1);
    tg_image image = made_with(&s.scan, "/no/such/kernel"), other = made_with(&s.scan, "hann"),
             blank = made_with(&s.scan, "hann"), wide = made_with(&s.scan, "hann");
    other.method[0] = 'x';
    blank.scan.channels = 0;
    wide.facts.aperture_mm.v = NAN;
    const tg_theory no_kernel = learned(&image), no_method = learned(&other), no_scan = learned(&blank),
                    no_aperture = learned(&wide);
    ck_assert(isnan(tg_theory_sd(&no_kernel, 1)) && isnan(tg_theory_mtf(&no_kernel, 0.1)));
    ck_assert(isnan(tg_theory_nps(&no_method, 1, 0.1)) && isnan(tg_theory_mtf_frequency(&no_method, 0.5)));
    ck_assert(isnan(tg_theory_sd(&no_scan, 1)));
    ck_assert(isnan(tg_theory_mtf(&no_aperture, 0.1)) && isnan(tg_theory_mtf_frequency(&no_aperture, 0.5)));
    ck_assert(tg_theory_sd(&no_aperture, 1) > 0);
    tg_image_free(&image), tg_image_free(&other), tg_image_free(&blank), tg_image_free(&wide);
    tg_sinogram_free(&s);
}
END_TEST

/* ---- against reconstructions ---- */

static void white_noise(tg_sinogram *s, uint64_t seed)
{
    const size_t rows = s->scan.rows * s->scan.views, channels = s->scan.channels;
    for (size_t row = 0; row < rows; row++) {
        tg_random r = tg_random_stream(seed, 0, row);
        for (size_t i = 0; i < channels; i++)
            s->v[row * channels + i] = (float)tg_random_normal(&r);
    }
}

static const struct {
    tg_geometry geometry;
    const char *kernel;
} noisy[] = {{TG_PARALLEL, "ramp"},        {TG_PARALLEL, "shepp-logan"},   {TG_PARALLEL, "hann"},
             {TG_PARALLEL, "hamming@0.7"}, {TG_FAN_EQUIANGULAR, "cosine"}, {TG_FAN_EQUISPACED, "hann"}};

/* Variance of white noise within 3 % between 10 and 40 channels from the axis. A fan's magnification varies the noise
 * there by (40 / 1000)^2. Pixels of a pitch and a half are nearly independent: 20 slices of 2090 leave 0.7 to 1.5 %. */
START_TEST(variance)
{
    enum { SIDE = 55, SLICES = 20 };
    tg_sinogram s = make_scan(noisy[_i].geometry, 96, 200, SLICES);
    white_noise(&s, 1);
    tg_image image = reconstruct(&s, noisy[_i].kernel, SIDE, 1.5 * SIDE, 0, 0);
    const tg_theory theory = learned(&image);
    double sum = 0;
    size_t n = 0;
    for (size_t i = 0; i < tg_grid_samples(&image.grid); i++) {
        const double x = tg_grid_mm(&image.grid, 0, (double)(i % SIDE)),
                     y = tg_grid_mm(&image.grid, 1, (double)(i / SIDE % SIDE)), r = hypot(x, y);
        if (r < 10 || r > 40) continue;
        sum += (double)image.v[i] * (double)image.v[i];
        n++;
    }
    CK_NEAR(sqrt(sum / (double)n), tg_theory_sd(&theory, 1), 0.015, 0, noisy[_i].kernel);
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

/* NPS of white noise within 5 % in every band that holds more than 5 % of the peak, up to 1 / pitch. Pixels of half a
 * pitch; a sine taper against leakage. The lowest band averages some 4000 independent cells: 1.6 %. */
START_TEST(bands)
{
    enum { SIDE = 256, SLICES = 16, BANDS = 6 };
    static const double edge[BANDS + 1] = {0, .15, .25, .35, .45, .6, .95};
    tg_error e = {0};
    tg_sinogram s = make_scan(TG_PARALLEL, 192, 300, SLICES);
    white_noise(&s, 2);
    tg_image image = reconstruct(&s, noisy[_i].kernel, SIDE, 0.5 * SIDE, 0, 0);
    const tg_theory theory = learned(&image);
    tg_fft fft;
    CK_OK(tg_fft_create(SIDE, SIDE, &fft, &e));
    double got[BANDS] = {0}, want[BANDS] = {0}, cells[BANDS] = {0}, peak = 0;
    for (size_t z = 0; z < SLICES; z++) {
        const float *slice = image.v + z * SIDE * SIDE;
        for (size_t y = 0; y < SIDE; y++)
            for (size_t x = 0; x < SIDE; x++)
                fft.real[y * SIDE + x] = (double)slice[y * SIDE + x] * sin(M_PI * ((double)x + 0.5) / SIDE) *
                                         sin(M_PI * ((double)y + 0.5) / SIDE);
        tg_fft_forward(&fft);
        for (size_t j = 0; j < SIDE; j++)
            for (size_t k = 0; k <= SIDE / 2; k++) {
                const double row = j <= SIDE / 2 ? (double)j : (double)j - SIDE;
                const double f = hypot(row, (double)k) / (0.5 * SIDE);
                int band = 0;
                while (band < BANDS && f >= edge[band + 1])
                    band++;
                if (band == BANDS || f == 0) continue;
                /* |X|^2 pixel^2 / (n mean of the squared taper), mean 1/4 */
                const double complex c = fft.half[j * (SIDE / 2 + 1) + k];
                got[band] += (creal(c) * creal(c) + cimag(c) * cimag(c)) * 0.25 / (SIDE * SIDE * 0.25);
                if (z == 0) want[band] += tg_theory_nps(&theory, 1, f), cells[band]++;
            }
    }
    for (int band = 0; band < BANDS; band++) {
        got[band] /= cells[band] * SLICES;
        want[band] /= cells[band];
        peak = fmax(peak, want[band]);
    }
    for (int band = 0; band < BANDS; band++)
        if (want[band] > 0.05 * peak) CK_NEAR(got[band], want[band], 0.05, 0, noisy[_i].kernel);
    tg_fft_free(&fft);
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

/* Integral of a disc's chord from the axis to s. */
static double chords(double s, double radius)
{
    if (s >= radius) return M_PI_2 * radius * radius;
    if (s <= -radius) return -M_PI_2 * radius * radius;
    return s * sqrt(radius * radius - s * s) + radius * radius * asin(s / radius);
}

/* MTF of an image of a point at (x, y): mean over directions of the transform of a 60 mm wide field around it. */
static double point_mtf(const tg_image *image, double x_mm, double y_mm, double f)
{
    enum { DIRECTIONS = 12 };
    const tg_grid *g = &image->grid;
    double sum = 0;
    for (int d = 0; d < DIRECTIONS; d++) {
        const double u = 2 * M_PI * f * cos(M_PI * (d + 0.25) / DIRECTIONS),
                     v = 2 * M_PI * f * sin(M_PI * (d + 0.25) / DIRECTIONS);
        double complex total = 0;
        for (size_t y = 0; y < g->n[1]; y++)
            for (size_t x = 0; x < g->n[0]; x++) {
                const double phase =
                    u * (tg_grid_mm(g, 0, (double)x) - x_mm) + v * (tg_grid_mm(g, 1, (double)y) - y_mm);
                total += (double)image->v[y * g->n[0] + x] * (cos(phase) - (double complex)I * sin(phase));
            }
        sum += cabs(total) * g->step_mm[0] * g->step_mm[1] / DIRECTIONS;
    }
    return sum;
}

static const char *const sharp[] = {"hann", "cosine", "hamming", "parzen", "shepp-logan", "hann@0.7"};

/* MTF of a reconstructed wire 24 channels off the axis: 50 and 10 % within 2 %, where they exist. */
START_TEST(point)
{
    const double x_mm = 20.3, y_mm = -13.4, radius_mm = 0.02;
    tg_sinogram s = make_scan(TG_PARALLEL, 128, 500, 1);
    s.facts.aperture_mm = (tg_number){1, 1};
    for (size_t view = 0; view < s.scan.views; view++)
        for (size_t i = 0; i < s.scan.channels; i++) {
            const double at = tg_scan_coordinate(&s.scan, (double)i) - x_mm * cos(s.scan.angle_rad[view]) -
                              y_mm * sin(s.scan.angle_rad[view]);
            s.v[view * s.scan.channels + i] = (float)(chords(at + 0.5, radius_mm) - chords(at - 0.5, radius_mm));
        }
    tg_image image = reconstruct(&s, sharp[_i], 80, 30, x_mm, y_mm);
    const tg_theory theory = learned(&image);
    const double mass = M_PI * radius_mm * radius_mm; /* what the wire's MTF starts from */
    for (int i = 0; i < 2; i++) {
        const double level = i ? 0.1 : 0.5, want = tg_theory_mtf_frequency(&theory, level);
        if (isnan(want)) continue;
        double low = 0.7 * want, high = 1.3 * want;
        ck_assert(point_mtf(&image, x_mm, y_mm, low) > level * mass);
        for (int k = 0; k < 12; k++) {
            const double middle = 0.5 * (low + high);
            *(point_mtf(&image, x_mm, y_mm, middle) > level * mass ? &low : &high) = middle;
        }
        CK_NEAR(high, want, 0.02, 0, sharp[_i]);
    }
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

Suite *suite_theory(void);
Suite *suite_theory(void)
{
    SUITE_BEGIN("theory", 120);
    tcase_add_loop_test(tcase, closed_form, 0, sizeof forms / sizeof *forms);
    tcase_add_test(tcase, parseval);
    tcase_add_test(tcase, example_in_hu);
    tcase_add_test(tcase, apertures);
    tcase_add_test(tcase, unknown);
    tcase_add_loop_test(tcase, variance, 0, sizeof noisy / sizeof *noisy);
    tcase_add_loop_test(tcase, bands, 0, 3);
    tcase_add_loop_test(tcase, point, 0, sizeof sharp / sizeof *sharp);
    return suite;
}
