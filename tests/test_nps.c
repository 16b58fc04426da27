/* The noise power spectrum of noise whose spectrum is known. */
#include "metrics/measure.h"
#include "near.h"
#include "synthetic.h"

static const Synthetic_solid body[] = {{"body", 0, 0, 60, 0}, {"rod", 30, 18, 6, 300}};
static const Synthetic plain = {.pixels = 160,
                                .step_mm = 0.8,
                                .fwhm_mm = 1.6,
                                .slices = 1,
                                .sd = 10,
                                .cutoff_per_mm = 0.6,
                                .solid = body,
                                .solids = 2,
                                .seed = 5};

/** Mean frequency and peak of a spectrum up to the pixels' Nyquist frequency, on a fine grid. */
static void known(const Synthetic *s, double *mean, double *peak)
{
    enum { FINE = 20000 };
    double above = 0, below = 0, best = 0;
    for (int i = 0; i < FINE; i++) {
        const double f = (i + 0.5) / FINE * 0.5 / s->step_mm, power = s->power ? s->power(f, s->cutoff_per_mm) : 1;
        above += f * power;
        below += power;
        if (power > best) {
            best = power;
            *peak = f;
        }
    }
    *mean = above / below;
}

/* nps-mean within 2 % of the truth over the draws of one slice and of four, white and as a Hann window leaves it; each
 * inside its own 95 % as often as that lets expect (of 24: 95 % less four standard deviations of a share is 77 %); and
 * the integral over the plane is the variance (Parseval) for noise that ends below Nyquist */
START_TEST(mean_frequency)
{
    enum { DRAWS = 24 };
    Synthetic s = plain;
    Synthetic_case c;
    tg_error e = {0};
    double truth, peak = NAN, mean = 0, power = 0;
    int covered = 0, peaks = 0, near = 0;
    s.slices = _i % 2 ? 4 : 1;
    s.power = _i / 2 ? synthetic_hann : NULL;
    known(&s, &truth, &peak);
    CK_OK(synthetic_make(&s, &c, &e));
    for (uint64_t draw = 0; draw < DRAWS; draw++) {
        tg_results all = {0};
        CK_OK(synthetic_draw(&s, draw, &c, &e));
        CK_OK(tg_measure_nps(&c.target, 0, TG_BY_ANY, &all, &e));
        ck_assert_uint_eq(all.n_results, 2);
        ck_assert_uint_eq(all.n_curves, 1);
        const tg_result *top = &all.result[0], *average = &all.result[1];
        ck_assert_str_eq(top->measure, "nps-peak");
        ck_assert_str_eq(average->measure, "nps-mean");
        mean += average->value / DRAWS;
        covered += fabs(average->value - truth) <= average->uncertainty;
        ck_assert(isnan(average->predicted)); /* nothing is known of how this image was made */
        if (!isnan(top->value)) {
            peaks++;
            near += fabs(top->value - peak) <= top->uncertainty;
        }
        const tg_curve *p = &all.curve[0];
        for (size_t k = 0; k < p->n; k++) {
            const double low = k ? p->x[k - 1] : 0, high = k + 1 < p->n ? p->x[k + 1] : 1 / s.step_mm - p->x[k];
            power += M_PI * p->x[k] * (high - low) * p->y[k] / DRAWS;
        }
        tg_results_free(&all);
    }
    CK_NEAR(mean, truth, 0.02, 0, "mean frequency of the spectrum that was put in");
    ck_assert_int_ge(covered, (int)(0.77 * DRAWS));
    if (s.power) {
        ck_assert_int_ge(peaks, DRAWS - 4);
        ck_assert_int_ge(near, (int)(0.77 * peaks));
        CK_NEAR(power, 100, 0.03, 0, "variance");
    } else {
        ck_assert_int_le(peaks, 2); /* white noise has none */
    }
    synthetic_free(&c);
}
END_TEST

/** What a Hann taper leaves of S at a sample of a square's spectrum: in power, 1/6, 2/3 and 1/6 of three neighbours
 * along each axis. */
static double tapered(const Synthetic *s, size_t side, double kx, double ky)
{
    double sum = 0;
    for (int dy = -1; dy <= 1; dy++)
        for (int dx = -1; dx <= 1; dx++) {
            const double f = hypot(kx + dx, ky + dy) / ((double)side * s->step_mm);
            sum += (dx ? 1.0 : 4.0) / 6 * (dy ? 1.0 : 4.0) / 6 * s->power(f, s->cutoff_per_mm);
        }
    return sum;
}

/* the spectrum is the one that was put in, as a taper sees it: four slices, mean over draws, in every ring above a
 * twentieth of the peak. Ring k holds pi k independent samples, half of that behind a taper, in at least 7 independent
 * squares and 3 slices of 20 draws: four times the scatter of their mean is allowed */
START_TEST(shape)
{
    enum { DRAWS = 20, MOST = 64 };
    Synthetic s = plain;
    Synthetic_case c;
    tg_error e = {0};
    double got[MOST] = {0}, want[MOST] = {0}, count[MOST] = {0}, variance = 0, best = 0;
    size_t n = 0;
    s.slices = 4;
    s.power = synthetic_hann;
    CK_OK(synthetic_make(&s, &c, &e));
    for (uint64_t draw = 0; draw < DRAWS; draw++) {
        tg_results all = {0};
        CK_OK(synthetic_draw(&s, draw, &c, &e));
        CK_OK(tg_measure_nps(&c.target, 0, TG_BY_ANY, &all, &e));
        n = all.curve[0].n;
        ck_assert_uint_le(n, MOST);
        for (size_t k = 0; k < n; k++)
            got[k] += all.curve[0].y[k] / DRAWS;
        tg_results_free(&all);
    }
    synthetic_free(&c);
    const long half = (long)n;
    for (long y = -half; y < half; y++)
        for (long x = -half; x < half; x++) {
            const size_t ring = (size_t)lround(hypot((double)x, (double)y));
            if (!ring || hypot((double)x, (double)y) > (double)n) continue;
            want[ring - 1] += tapered(&s, 2 * n, (double)x, (double)y);
            count[ring - 1]++;
        }
    for (int i = 0; i < 6000; i++) { /* f A^2 up to the cut-off, over the plane; the slices have the variance 100 */
        const double f = (i + 0.5) * 1e-4;
        variance += 2 * M_PI * f * synthetic_hann(f, s.cutoff_per_mm) * 1e-4;
    }
    for (size_t k = 0; k < n; k++) {
        want[k] *= 100 / (variance * count[k]);
        best = fmax(best, want[k]);
    }
    for (size_t k = 0; k < n; k++)
        if (want[k] > 0.05 * best)
            CK_NEAR(got[k], want[k], 4 / sqrt(0.5 * M_PI * (double)(k + 1) * 7 * 3 * DRAWS), 0,
                    "spectrum that was put in");
}
END_TEST

/* a body too small for the squares, and a solid that is no body: null with a why */
START_TEST(nothing_to_be_had)
{
    static const Synthetic_solid small[] = {{"body", 0, 0, 25, 0}};
    Synthetic s = plain;
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    CK_OK(tg_measure_nps(&c.target, 1, TG_BY_ANY, &all, &e));
    ck_assert_msg(strstr(all.result[0].why, "body"), "why: %s", all.result[0].why);
    synthetic_free(&c);
    s.solid = small;
    s.solids = 1;
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    CK_OK(tg_measure_nps(&c.target, 0, TG_BY_ANY, &all, &e));
    ck_assert_uint_eq(all.n_results, 4);
    for (size_t i = 2; i < 4; i++) {
        ck_assert(isnan(all.result[i].value));
        ck_assert_msg(strstr(all.result[i].why, "squares"), "why: %s", all.result[i].why);
    }
    ck_assert_uint_eq(all.n_curves + all.n_regions, 0);
    synthetic_free(&c);
    tg_results_free(&all);
}
END_TEST

Suite *suite_nps(void);
Suite *suite_nps(void)
{
    SUITE_BEGIN("nps", 60);
    tcase_add_loop_test(tcase, mean_frequency, 0, 4);
    tcase_add_test(tcase, shape);
    tcase_add_test(tcase, nothing_to_be_had);
    return suite;
}
