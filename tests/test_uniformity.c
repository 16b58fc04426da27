/* Uniformity and cupping of bodies whose shape is known. */
#include "metrics/measure.h"
#include "near.h"
#include "synthetic.h"

#include <stdio.h>

static const Synthetic_solid plain_body[] = {{"body", 0, 0, 60, 0}};
static const Synthetic_solid rod_in_the_way[] = {{"body", 0, 0, 60, 0}, {"rod", 44, 0, 6, 300}};
static const Synthetic still = {
    .pixels = 128, .step_mm = 1, .fwhm_mm = 1.2, .slices = 1, .solid = plain_body, .solids = 1, .seed = 9};

/** Slices of a description with something added at every pixel. */
static void make(const Synthetic *s, double (*add)(double x_mm, double y_mm), Synthetic_case *c)
{
    tg_error e = {0};
    CK_OK(synthetic_make(s, c, &e));
    for (size_t i = 0; add && i < 128 * 128; i++)
        c->truth[i] += add((double)(i % 128) - 63.5, (double)(i / 128) - 63.5);
    CK_OK(synthetic_draw(s, 0, c, &e));
}

static double slope(double x, double y)
{
    return 0.1 * x - 0.03 * y;
}
static double cup(double x, double y)
{
    return 0.01 * (x * x + y * y);
}

/* a tilted image: edge regions of radius 6 whose rim is 10 mm inside that of the body stand 44 mm from the middle. Both
 * lie symmetrically between pixels, so their means are those of their middles, up to float pixels. */
START_TEST(tilted)
{
    static const char *const where[] = {"body right", "body top", "body left", "body bottom", "body"};
    const double want[] = {4.4, -1.32, -4.4, 1.32, 4.4};
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    make(&still, slope, &c);
    CK_OK(tg_measure_uniformity(&c.target, 0, TG_BY_ANY, &all, &e));
    ck_assert_uint_eq(all.n_results, 5);
    ck_assert_uint_eq(all.n_regions, 5);
    for (size_t i = 0; i < 5; i++) {
        ck_assert_str_eq(all.result[i].where, where[i]);
        ck_assert_str_eq(all.result[i].note, "");
        CK_NEAR(i < 4 ? all.result[i].value : fabs(all.result[i].value), want[i], 0, 1e-4, "slope times distance");
    }
    tg_results_free(&all);
    synthetic_free(&c);
}
END_TEST

/* the largest of four is judged against an uncertainty for all four: t at 0.95^(1/4), 2.49 for normal (Sidak 1967) */
START_TEST(largest_of_four)
{
    Synthetic s = still;
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    s.sd = 5;
    make(&s, slope, &c);
    CK_OK(tg_measure_uniformity(&c.target, 0, TG_BY_ANY, &all, &e));
    const tg_result *worst = &all.result[4], *one = &all.result[worst->value > 0 ? 0 : 2];
    CK_NEAR(worst->value, one->value, 0, 0, "the largest");
    ck_assert_double_gt(worst->uncertainty / one->uncertainty, 2.491 / 1.960);
    ck_assert_double_lt(worst->uncertainty / one->uncertainty, 1.05 * 2.491 / 1.960);
    tg_results_free(&all);
    synthetic_free(&c);
}
END_TEST

/* a rod where an edge region belongs: it moves along the ring, and says so */
START_TEST(moved_aside)
{
    Synthetic s = still;
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    s.solid = rod_in_the_way;
    s.solids = 2;
    make(&s, NULL, &c);
    CK_OK(tg_measure_uniformity(&c.target, 0, TG_BY_ANY, &all, &e));
    for (size_t i = 0; i < 4; i++) {
        CK_NEAR(all.result[i].value, 0, 0, 1e-3, "a uniform body");
        ck_assert_msg(!strstr(all.result[i].note, "degrees") == (i != 0), "note: %s", all.result[i].note);
    }
    /* clear by 6 + 3 1.2 mm of a rod of 6 mm: 15.6 mm along a circle of 44 mm, 2 asin(15.6 / 88) = 20.4 degrees; to the
     * nearest pixel, 0.7 mm or 0.9 degrees */
    int degrees = 0;
    ck_assert_int_eq(sscanf(all.result[0].note, "measured %d degrees", &degrees), 1);
    ck_assert(degrees >= 20 && degrees <= 22);
    tg_results_free(&all);
    synthetic_free(&c);
}
END_TEST

/* a body too small for edges 1 cm inside its rim: null, and so is the worst */
START_TEST(too_small)
{
    static const Synthetic_solid small[] = {{"body", 0, 0, 16, 0}};
    Synthetic s = still;
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    s.solid = small;
    make(&s, NULL, &c);
    CK_OK(tg_measure_uniformity(&c.target, 0, TG_BY_ANY, &all, &e));
    CK_OK(tg_measure_cupping(&c.target, 0, TG_BY_ANY, &all, &e));
    ck_assert_uint_eq(all.n_results, 6);
    for (size_t i = 0; i < 6; i++)
        ck_assert_msg(isnan(all.result[i].value) && strstr(all.result[i].why, "too small"), "why: %s",
                      all.result[i].why);
    tg_results_free(&all);
    synthetic_free(&c);
}
END_TEST

/* a cup 0.01 r^2: mean over a disc of 6 mm is 0.01 6^2 / 2, over the ring from 48.5 to 51.5 mm 0.01 (48.5^2 + 51.5^2) /
 * 2; the ring's 942 pixels scatter as an even distribution over its width does, 0.01 2 50 3 / sqrt(12) = 0.87, so that
 * their mean is off by about 0.87 / sqrt(942); four times that is allowed */
START_TEST(cupped)
{
    Synthetic_case c;
    tg_results all = {0};
    tg_error e = {0};
    make(&still, cup, &c);
    CK_OK(tg_measure_cupping(&c.target, 0, TG_BY_ANY, &all, &e));
    CK_NEAR(all.result[0].value, 0.18 - 0.005 * (48.5 * 48.5 + 51.5 * 51.5), 0, 4 * 0.87 / sqrt(942), "a paraboloid");
    ck_assert_double_lt(all.result[0].value, 0); /* negative: the middle is depressed */
    ck_assert_uint_eq(all.n_curves, 1);
    const tg_curve *p = &all.curve[0];
    ck_assert_str_eq(p->measure, "radial-profile");
    ck_assert_uint_ge(p->n, 50);
    for (size_t i = 0; i < p->n; i++) /* a ring a pixel wide: mean of r^2 is that of r squared, and at most 1 / 12 */
        CK_NEAR(p->y[i], 0.01 * p->x[i] * p->x[i], 0, 0.01 / 12 + 1e-3, "a paraboloid");
    tg_results_free(&all);
    synthetic_free(&c);
}
END_TEST

Suite *suite_uniformity(void);
Suite *suite_uniformity(void)
{
    SUITE_BEGIN("uniformity", 60);
    tcase_add_test(tcase, tilted);
    tcase_add_test(tcase, largest_of_four);
    tcase_add_test(tcase, moved_aside);
    tcase_add_test(tcase, too_small);
    tcase_add_test(tcase, cupped);
    return suite;
}
