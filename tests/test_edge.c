#include "metrics/measure.h"
#include "metrics/mtf.h"
#include "near.h"
#include "spread.h"

static tg_error e;

static void take(const tg_target *t, int solid, tg_result r[2])
{
    tg_results out = {0};
    CK_OK(tg_measure_mtf(t, solid, TG_BY_EDGE, &out, &e));
    ck_assert_uint_eq(out.n_results, 2);
    ck_assert_uint_le(out.n_curves, 1);
    for (int i = 0; i < 2; i++)
        r[i] = out.result[i];
    tg_results_free(&out);
}

static void check_levels(const tg_result r[2], Modulation *m, double scale_mm, double share, const char *what)
{
    for (int i = 0; i < 2; i++) {
        const double truth = spread_level(m, scale_mm, tg_mtf_level_of[i]);
        ck_assert_msg(!*r[i].why, "%s: %s", what, r[i].why);
        CK_NEAR(r[i].value, truth, share, 0, what);
        CK_NEAR(r[i].value, truth, 0, r[i].uncertainty, what);
    }
}

/* A rod of several radii, bright and dark, off centre, and the body itself, against closed forms of the spread. Without
 * noise: the curvature of the edge, the taper and the pixels are all that is left, and the uncertainty stated for the
 * method covers them. */
START_TEST(closed_forms)
{
    static const struct {
        Modulation *m;
        double scale_mm, fwhm_mm;
        const char *what;
    } row[] = {{spread_gauss, 1.6, 1.6, "Gaussian"},
               {spread_hann, 0.8, 1.68, "Hann (Kak and Slaney 1988, ch. 3)"},
               {spread_cosine, 0.8, 1.38, "cosine (same)"},
               {spread_shepp_logan, 0.8, 1.11, "Shepp-Logan (same)"}};
    static const Synthetic_solid rod[] = {
        {"rod", 5.13, -3.41, 7, 300}, {"rod", 4.9, 6.3, 10, -300}, {"rod", 0.03, 0.17, 18, 300}};
    for (size_t i = 0; i < sizeof row / sizeof *row; i++)
        for (size_t k = 0; k < 3; k++) {
            const Synthetic_solid solid[] = {{"body", 0, 0, 38, 0}, rod[k]};
            const Synthetic s = {
                .pixels = 192, .step_mm = 0.5, .fwhm_mm = row[i].fwhm_mm, .slices = 1, .solid = solid, .solids = 2};
            Synthetic_case c;
            tg_result r[2];
            CK_OK(synthetic_make(&s, &c, &e));
            CK_OK(spread_paint(&s, row[i].m, row[i].scale_mm, &c, &e));
            CK_OK(tg_noise_learn(&c.target, &c.target.noise, &e));
            take(&c.target, 1, r);
            check_levels(r, row[i].m, row[i].scale_mm, 0.015, row[i].what);
            if (k == 0) {
                take(&c.target, 0, r);
                check_levels(r, row[i].m, row[i].scale_mm, 0.015, row[i].what);
            }
            synthetic_free(&c);
        }
}
END_TEST

/* Gaussian relations (closed form); the place is a third of a pixel wrong, the radius too, the first guess of the
 * spread a third; a cup of 10 HU over the rod and a neighbour that covers a part of the edge do not matter. */
START_TEST(disturbed)
{
    static const Synthetic_solid solid[] = {{"body", 0, 0, 38, 0}, {"rod", -5, 3.2, 9, 300}, {"by", 9.5, 3.2, 3, 200}};
    const Synthetic s = {.pixels = 192, .step_mm = 0.5, .fwhm_mm = 1.5, .slices = 1, .solid = solid, .solids = 3};
    Synthetic_case c;
    tg_result r[2];
    CK_OK(synthetic_make(&s, &c, &e));
    for (size_t i = 0; i < 192 * 192; i++) {
        const double x = tg_grid_mm(&c.image.grid, 0, (double)(i % 192)),
                     y = tg_grid_mm(&c.image.grid, 1, (double)(i / 192));
        c.target.mean[i] = c.image.v[i] += (float)(10 * (x * x + y * y) / (14 * 14));
    }
    CK_OK(tg_noise_learn(&c.target, &c.target.noise, &e));
    c.phantom.solid[1].centre_mm[0] += 0.17;
    c.phantom.solid[1].half_mm[0] = c.phantom.solid[1].half_mm[1] = 8.85;
    c.target.spread_mm = 2;
    take(&c.target, 1, r);
    ck_assert_msg(!*r[0].why, "%s", r[0].why);
    CK_NEAR(r[0].value * 1.5, 0.441271, 4e-3, 0, "closed form, two standard uncertainties of the method");
    CK_NEAR(r[1].value * 1.5, 0.804268, 4e-3, 0, "closed form, two standard uncertainties of the method");
    synthetic_free(&c);
}
END_TEST

/* 300 HU, the mean of 16 slices of 3 HU noise with the texture of back-projection: 1.5 %. */
START_TEST(noisy)
{
    static const Synthetic_solid solid[] = {{"body", 0, 0, 28, 0}, {"rod", 3.1, -2.2, 10, 300}};
    const Synthetic s = {.pixels = 128,
                         .step_mm = 0.5,
                         .fwhm_mm = 1.6,
                         .slices = 16,
                         .sd = 3,
                         .power = synthetic_hann,
                         .cutoff_per_mm = 0.8,
                         .solid = solid,
                         .solids = 2,
                         .seed = 11};
    Synthetic_case c;
    CK_OK(synthetic_make(&s, &c, &e));
    for (uint64_t draw = 0; draw < 5; draw++) {
        tg_result r[2];
        CK_OK(synthetic_draw(&s, draw, &c, &e));
        take(&c.target, 1, r);
        CK_NEAR(r[0].value * 1.6, 0.441271, 0.015, 0, "closed form");
        CK_NEAR(r[1].value * 1.6, 0.804268, 0.015, 0, "closed form");
    }
    synthetic_free(&c);
}
END_TEST

static const struct {
    const char *what, *word;
    double radius_mm, contrast;
} refusals[] = {
    {"lost", "nowhere", 8, 300},
    {"number", "no number", 8, 300},
    {"clipped", "clipped", 8, 300},
    {"small", "no edge of its own", 5, 300},
    {"covered", "clear of blanket", 8, 300},
    {"faint", "noise", 8, 3},
    {"elsewhere", "not found", 8, 300},
};

START_TEST(refused)
{
    const char *what = refusals[_i].what;
    const Synthetic_solid solid[] = {
        {"body", 0, 0, 28, 0}, {"rod", 0, 0, refusals[_i].radius_mm, refusals[_i].contrast}, {"blanket", 0, 14, 14, 0}};
    const Synthetic s = {.pixels = 128,
                         .step_mm = 0.5,
                         .fwhm_mm = 1.5,
                         .slices = 1,
                         .sd = !strcmp(what, "faint") ? 3 : 0,
                         .solid = solid,
                         .solids = !strcmp(what, "covered") ? 3 : 2};
    Synthetic_case c;
    tg_result r[2];
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    float *v = c.image.v + 64 * 128 + 80;
    if (!strcmp(what, "lost")) strcpy(c.target.lost, "nowhere to be seen");
    if (!strcmp(what, "number")) *v = NAN;
    if (!strcmp(what, "clipped")) c.image.most = *v = 200;
    if (!strcmp(what, "elsewhere"))
        for (size_t i = 0; i < 128 * 128; i++)
            c.target.mean[i] = c.image.v[i] = (float)c.truth[i < 12 ? i : i - 12];
    take(&c.target, 1, r);
    for (int i = 0; i < 2; i++) {
        ck_assert_msg(isnan(r[i].value), "%s: %g", what, r[i].value);
        ck_assert_msg(strstr(r[i].why, refusals[_i].word) != NULL, "%s: %s", what, r[i].why);
    }
    synthetic_free(&c);
}
END_TEST

Suite *suite_edge(void);
Suite *suite_edge(void)
{
    SUITE_BEGIN("edge", 120);
    tcase_add_test(tcase, closed_forms);
    tcase_add_test(tcase, disturbed);
    tcase_add_test(tcase, noisy);
    tcase_add_loop_test(tcase, refused, 0, sizeof refusals / sizeof *refusals);
    return suite;
}
