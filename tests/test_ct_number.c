/* CT number and noise of solids of known truth, and what is said where there is nothing to be had. */
#include "metrics/measure.h"
#include "metrics/place.h"
#include "near.h"
#include "synthetic.h"

#include <gsl/gsl_cdf.h>
#include <stdio.h>

static const Synthetic_solid rods[] = {
    {"body", 0, 0, 60, 20}, {"rod", 25, 10, 10, 300}, {"thin", -25, 10, 4, 900}, {"hole", 0, -30, 9, -700}};
static const Synthetic still = {
    .pixels = 128, .step_mm = 1, .fwhm_mm = 1.6, .slices = 1, .solid = rods, .solids = 4, .seed = 9};

static tg_result ask(const tg_target *t, const char *measure, int solid)
{
    tg_results all = {0};
    tg_error e = {0};
    CK_OK(tg_measure_find(measure)->run(t, solid, TG_BY_ANY, &all, &e));
    ck_assert_uint_eq(all.n_results, 1);
    const tg_result r = all.result[0];
    ck_assert(isnan(r.value) == (r.why[0] != 0));
    ck_assert_uint_eq(all.n_regions, isnan(r.value) ? 0U : 1U);
    tg_results_free(&all);
    return r;
}

/* without noise: three spread widths from an edge a Gaussian leaves exp(-(3 2.355)^2 / 2) = 1.5e-11 of it; float pixels
 * keep 1 part in 2^24 of 1000 HU. Solids without a middle of their own answer null. */
START_TEST(without_noise)
{
    Synthetic_case c;
    tg_error e = {0};
    CK_OK(synthetic_make(&still, &c, &e));
    CK_OK(synthetic_draw(&still, 0, &c, &e));
    for (int i = 0; i < 4; i++) {
        const tg_result r = ask(&c.target, "ct-number", i);
        CK_NEAR(r.predicted, rods[i].value, 0, 0, "CT number of the description");
        if (i == 2) {
            ck_assert_msg(strstr(r.why, "spread widths"), "why: %s", r.why);
            continue;
        }
        CK_NEAR(r.value, rods[i].value, 0, 1e-4, "CT number that was put in");
        ck_assert_double_lt(r.uncertainty, 1e-3);
    }
    synthetic_free(&c);
}
END_TEST

/* a slope of the image and an uncertain place make an uncertain mean: u = slope u(shift); a turn moves a rod across */
START_TEST(place)
{
    Synthetic_case c;
    tg_error e = {0};
    CK_OK(synthetic_make(&still, &c, &e));
    for (size_t i = 0; i < 128 * 128; i++)
        c.truth[i] += 0.5 * (double)(i % 128);
    CK_OK(synthetic_draw(&still, 0, &c, &e));
    c.target.shift_u_mm = 0.1;
    c.target.turn_u_rad = 0.01;
    const tg_result r = ask(&c.target, "ct-number", 1);
    const double turned = 0.01 * 0.5 * 10; /* along x, the rod stands 10 mm above the middle */
    CK_NEAR(r.uncertainty, 1.96 * hypot(0.05, turned), 1e-3, 1e-3, "slope times displacement");
    CK_NEAR(r.uncertainty_noise, 0, 0, 1e-2, "no noise");
    synthetic_free(&c);
}
END_TEST

/* an insert in the middle: the nearest clear place is taken, and said */
START_TEST(insert_in_the_middle)
{
    static const Synthetic_solid solid[] = {{"body", 0, 0, 60, 0}, {"insert", 2, 0, 10, 500}};
    Synthetic s = still;
    Synthetic_case c;
    tg_error e = {0};
    s.solid = solid;
    s.solids = 2;
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 0, &c, &e));
    const tg_result r = ask(&c.target, "ct-number", 0);
    CK_NEAR(r.value, 0, 0, 1e-3, "body that was put in");
    ck_assert_msg(strstr(r.note, "mm from the middle"), "note: %s", r.note);
    synthetic_free(&c);
}
END_TEST

static void lose(Synthetic_case *c)
{
    snprintf(c->target.lost, sizeof c->target.lost, "nowhere to be seen");
}
static void clip(Synthetic_case *c)
{
    c->image.most = 299;
}
static void punch(Synthetic_case *c)
{
    c->image.v[74 * 128 + 88] = NAN;
}
static void narrow(Synthetic_case *c) /* the field ends in the rod */
{
    c->target.grid.first_mm[0] = -102;
}
static void forget(Synthetic_case *c)
{
    c->target.noise.sd = NAN;
}

/* outside its domain a figure is null with a why */
START_TEST(nothing_to_be_had)
{
    static const struct {
        void (*spoil)(Synthetic_case *);
        const char *why;
    } table[] = {
        {lose, "nowhere to be seen"}, {clip, "limit"}, {punch, "have none"}, {narrow, "field"}, {forget, "uniform"}};
    Synthetic_case c;
    tg_error e = {0};
    CK_OK(synthetic_make(&still, &c, &e));
    CK_OK(synthetic_draw(&still, 0, &c, &e));
    ck_assert(!isnan(ask(&c.target, "ct-number", 1).value));
    table[_i].spoil(&c);
    const tg_result r = ask(&c.target, "ct-number", 1);
    ck_assert(isnan(r.value) && isnan(r.uncertainty));
    ck_assert_msg(strstr(r.why, table[_i].why), "why: %s", r.why);
    synthetic_free(&c);
}
END_TEST

/* the interval of an SD covers by chi-square what it says, for few and for many degrees of freedom */
START_TEST(interval_of_an_sd)
{
    static const double dof[] = {1.5, 3, 10, 100, 1e4};
    for (size_t i = 0; i < 5; i++) {
        const double c = tg_place_sd_expanded(dof[i]), n = dof[i];
        const double below = gsl_cdf_chisq_P(n / ((1 + c) * (1 + c)), n);
        const double above = c < 1 ? gsl_cdf_chisq_Q(n / ((1 - c) * (1 - c)), n) : 0;
        CK_NEAR(1 - below - above, 0.95, 0, 1e-9, "chi-square");
    }
    /* 1.96 / sqrt(2 dof) in the limit; the next term of the chi-square quantile is of the order of its square */
    CK_NEAR(tg_place_sd_expanded(1e4), 1.96 / sqrt(2e4), 1e-3, 0, "large sample");
}
END_TEST

/* an offset that differs between slices is no noise; structure common to all is none either, but is said */
START_TEST(noise_of_slices)
{
    Synthetic s = still;
    Synthetic_case c;
    tg_error e = {0};
    s.slices = 5;
    s.sd = 10;
    CK_OK(synthetic_make(&s, &c, &e));
    for (size_t i = 0; i < 128 * 128; i++)
        c.truth[i] += i % 2 ? 12 : -12;
    CK_OK(synthetic_draw(&s, 1, &c, &e));
    const tg_result r = ask(&c.target, "noise", 0);
    CK_NEAR(r.value, 10, 0, 2 * r.uncertainty, "noise that was put in");
    ck_assert_msg(strstr(r.note, "structure"), "note: %s", r.note);
    ck_assert(isnan(r.predicted));
    synthetic_free(&c);
}
END_TEST

Suite *suite_ct_number(void);
Suite *suite_ct_number(void)
{
    SUITE_BEGIN("ct_number", 60);
    tcase_add_test(tcase, without_noise);
    tcase_add_test(tcase, place);
    tcase_add_test(tcase, insert_in_the_middle);
    tcase_add_loop_test(tcase, nothing_to_be_had, 0, 5);
    tcase_add_test(tcase, interval_of_an_sd);
    tcase_add_test(tcase, noise_of_slices);
    return suite;
}
