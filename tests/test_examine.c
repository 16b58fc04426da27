/* Checks laid at the figures of a synthetic target: order, limits, units of frequency, what cannot be judged. */
#include "metrics/examine.h"
#include "metrics/measure.h"
#include "tests/near.h"
#include "tests/synthetic.h"

#include <stdio.h>

static const Synthetic_solid solid[] = {{"body", 0, 0, 50, 0}, {"rod", 20, 0, 10, 300}};
static const Synthetic scene = {.pixels = 160,
                                .step_mm = 0.8,
                                .fwhm_mm = 1.6,
                                .slices = 4,
                                .sd = 5,
                                .power = synthetic_hann,
                                .cutoff_per_mm = 0.6,
                                .solid = solid,
                                .solids = 2,
                                .seed = 1};
static Synthetic_case scanned;

static void set_up(void)
{
    tg_error e = {0};
    CK_OK(synthetic_make(&scene, &scanned, &e));
    CK_OK(synthetic_draw(&scene, 0, &scanned, &e));
}

static void tear_down(void)
{
    synthetic_free(&scanned);
}

static char body[] = "body", rod[] = "rod", ct_number[] = "ct-number", mtf50[] = "mtf50", mtf10[] = "mtf10",
            noise[] = "noise", uniformity[] = "uniformity", nps_mean[] = "nps-mean", path[] = "s.yaml";

static tg_number given(double v)
{
    return (tg_number){v, 1};
}

static tg_results examine(tg_check *check, size_t n, const tg_examine_options *o, tg_verdict *verdict)
{
    tg_error e = {0};
    tg_results out;
    tg_verdict worst;
    const tg_specification s = {.path = path, .checks = {check, n, 1}};
    CK_OK(tg_examine(&scanned.target, check ? &s : NULL, o, &out, verdict ? verdict : &worst, &e));
    return out;
}

static const tg_result *find(const tg_results *r, const char *measure, const char *where)
{
    const tg_result *found = NULL;
    for (size_t i = 0; i < r->n_results; i++)
        if (!strcmp(r->result[i].measure, measure) && !strcmp(r->result[i].where, where)) {
            ck_assert_msg(!found, "%s of %s stands there twice", measure, where);
            found = &r->result[i];
        }
    ck_assert_msg(found, "%s of %s is missing", measure, where);
    return found;
}

static const tg_examine_options plain = {0};

START_TEST(measures_everything_without_a_specification)
{
    tg_verdict verdict;
    tg_results r = examine(NULL, 0, &plain, &verdict);
    ck_assert_int_eq(verdict, TG_NO_LIMITS);
    for (const tg_measure *m = tg_measures; m->name; m++)
        find(&r, m->name, strcmp(m->name, "position") ? "body" : "rod");
    for (size_t i = 0; i < r.n_results; i++) {
        ck_assert_int_eq(r.result[i].verdict, TG_NO_LIMITS);
        ck_assert(isnan(r.result[i].low) && isnan(r.result[i].high) && isnan(r.result[i].nominal));
    }
    tg_results_free(&r);
}
END_TEST

START_TEST(puts_the_checks_first)
{
    tg_check check[] = {{.measure = {mtf10, 1}, .at = {rod, 1}, .low = given(0)},
                        {.measure = {noise, 1}, .in = {body, 1}, .high = given(100)},
                        {.measure = {ct_number, 1}, .in = {rod, 1}, .nominal = given(300), .tolerance = given(10)}};
    tg_verdict verdict;
    tg_results r = examine(check, 3, &plain, &verdict);
    ck_assert_int_eq(verdict, TG_PASS);
    for (size_t c = 0; c < 3; c++) {
        ck_assert_str_eq(r.result[c].measure, check[c].measure.v);
        ck_assert_str_eq(r.result[c].where, tg_check_solid(&check[c]));
        ck_assert_int_eq(r.result[c].verdict, TG_PASS);
    }
    size_t row = 0; /* the others stand in the order of the table */
    for (size_t i = 3; i < r.n_results; i++) {
        const size_t here = (size_t)(tg_measure_find(r.result[i].measure) - tg_measures);
        ck_assert_uint_ge(here, row);
        row = here;
    }
    ck_assert_int_eq(find(&r, "ct-number", "body")->verdict, TG_NO_LIMITS); /* measured, not judged */
    tg_results_free(&r);
}
END_TEST

/* the rod holds 300 HU, its mean over about 400 pixels of 5 HU is known to well below 2 HU */
static const struct {
    double nominal, tolerance, low, high; /* NaN: not given */
    tg_verdict verdict;
    double want_low, want_high;
} limits[] = {
    {300, 10, NAN, NAN, TG_PASS, 290, 310},         {320, 10, NAN, NAN, TG_FAIL, 310, 330},
    {310, 10, NAN, NAN, TG_INCONCLUSIVE, 300, 320}, /* on the limit */
    {NAN, NAN, 280, NAN, TG_PASS, 280, NAN},        {NAN, NAN, 320, NAN, TG_FAIL, 320, NAN},
    {NAN, NAN, NAN, 320, TG_PASS, NAN, 320},        {NAN, NAN, NAN, 280, TG_FAIL, NAN, 280},
    {300, NAN, 280, 320, TG_PASS, 280, 320},
};

START_TEST(limits_and_verdicts)
{
    tg_check check = {.measure = {ct_number, 1}, .in = {rod, 1}, .source = {body, 1}};
    tg_number *const to[] = {&check.nominal, &check.tolerance, &check.low, &check.high};
    const double from[] = {limits[_i].nominal, limits[_i].tolerance, limits[_i].low, limits[_i].high};
    for (int i = 0; i < 4; i++)
        if (!isnan(from[i])) *to[i] = given(from[i]);
    tg_verdict verdict;
    tg_results r = examine(&check, 1, &plain, &verdict);
    const tg_result *found = find(&r, "ct-number", "rod");
    ck_assert_int_eq(found->verdict, limits[_i].verdict);
    ck_assert_int_eq(verdict, limits[_i].verdict);
    ck_assert(found->low == limits[_i].want_low || (isnan(found->low) && isnan(limits[_i].want_low)));
    ck_assert(found->high == limits[_i].want_high || (isnan(found->high) && isnan(limits[_i].want_high)));
    ck_assert_str_eq(found->source, "body");
    ck_assert_str_eq(found->note, "");
    tg_results_free(&r);
}
END_TEST

START_TEST(an_ideal_of_zero_needs_no_nominal_value)
{
    tg_check check = {.measure = {uniformity, 1}, .in = {body, 1}, .tolerance = given(20)};
    tg_results r = examine(&check, 1, &plain, NULL);
    const tg_result *found = find(&r, "uniformity", "body");
    ck_assert(found->nominal == 0 && found->low == -20 && found->high == 20);
    ck_assert_int_eq(found->verdict, TG_PASS);
    tg_results_free(&r);
}
END_TEST

START_TEST(computed_values)
{
    tg_check check[] = {{.measure = {ct_number, 1}, .in = {rod, 1}, .nominal = given(NAN), .tolerance = given(10)},
                        {.measure = {mtf50, 1}, .at = {rod, 1}, .nominal = given(NAN), .tolerance = given(1)}};
    tg_verdict verdict;
    tg_results r = examine(check, 2, &plain, &verdict);
    const tg_result *known = find(&r, "ct-number", "rod"), *unknown = find(&r, "mtf50", "rod");
    if (!isnan(known->predicted)) { /* a nominal HU is a prediction of its own */
        ck_assert(known->low == known->predicted - 10 && known->high == known->predicted + 10);
        ck_assert_int_eq(known->verdict, TG_PASS);
    }
    ck_assert(isnan(unknown->predicted)); /* the image has no scan to predict from */
    ck_assert_int_eq(unknown->verdict, TG_INCONCLUSIVE);
    ck_assert_ptr_nonnull(strstr(unknown->note, "cannot be computed"));
    ck_assert_int_eq(verdict, TG_INCONCLUSIVE);
    tg_results_free(&r);
}
END_TEST

START_TEST(warns_where_nothing_can_pass)
{
    tg_check check = {.measure = {ct_number, 1}, .in = {rod, 1}, .nominal = given(300), .tolerance = given(0.01)};
    tg_results r = examine(&check, 1, &plain, NULL);
    const tg_result *found = find(&r, "ct-number", "rod");
    ck_assert(found->uncertainty > 0.01);
    ck_assert_ptr_nonnull(strstr(found->note, "uncertainty too large"));
    ck_assert_int_ne(found->verdict, TG_PASS);
    tg_results_free(&r);
}
END_TEST

START_TEST(limits_of_another_unit_decide_nothing)
{
    tg_error e = {0};
    tg_check check[] = {{.measure = {ct_number, 1}, .in = {rod, 1}, .low = given(0)},
                        {.measure = {mtf50, 1}, .at = {rod, 1}, .low = given(0)}};
    const tg_specification s = {.path = path, .unit = given(1), .checks = {check, 2, 1}}; /* 1/mm; the image is in HU */
    tg_results r;
    tg_verdict verdict;
    CK_OK(tg_examine(&scanned.target, &s, &plain, &r, &verdict, &e));
    ck_assert_int_eq(find(&r, "ct-number", "rod")->verdict, TG_INCONCLUSIVE);
    ck_assert(isnan(find(&r, "ct-number", "rod")->low));
    ck_assert_int_eq(find(&r, "mtf50", "rod")->verdict, TG_PASS); /* a frequency is in neither */
    tg_results_free(&r);
}
END_TEST

START_TEST(frequencies_in_both_units)
{
    const tg_examine_options per_mm = {.lp_per_mm = true};
    tg_results cm = examine(NULL, 0, &plain, NULL), mm = examine(NULL, 0, &per_mm, NULL);
    ck_assert_uint_eq(cm.n_results, mm.n_results);
    size_t frequencies = 0;
    for (size_t i = 0; i < cm.n_results; i++) {
        const tg_result *a = &cm.result[i], *b = &mm.result[i];
        const bool frequency = !strcmp(b->unit, "lp/mm");
        ck_assert_str_eq(a->unit, frequency ? "lp/cm" : b->unit);
        if (isnan(a->value)) continue;
        const double factor = frequency ? 10 : 1; /* 1 cm = 10 mm */
        frequencies += frequency;
        CK_NEAR(a->value, factor * b->value, 1e-14, 0, "10 lp/cm are 1 lp/mm");
        CK_NEAR(a->uncertainty, factor * b->uncertainty, 1e-14, 0, "10 lp/cm are 1 lp/mm");
        for (size_t k = 0; k < a->n_budget; k++)
            CK_NEAR(a->budget[k].u, factor * b->budget[k].u, 1e-14, 0, "10 lp/cm are 1 lp/mm");
    }
    ck_assert_uint_ge(frequencies, 4); /* nps-peak, nps-mean, mtf50, mtf10 */
    ck_assert_uint_gt(cm.n_curves, 0);
    for (size_t i = 0; i < cm.n_curves; i++)
        if (!strcmp(cm.curve[i].x_unit, "lp/cm")) {
            const size_t last = cm.curve[i].n - 1;
            CK_NEAR(cm.curve[i].x[last], 10 * mm.curve[i].x[last], 1e-14, 0, "10 lp/cm are 1 lp/mm");
        }
    /* exp(-(pi f w)^2 / (4 ln 2)) = 1/2 at f = 2 ln 2 / (pi w): w = 1.6 mm gives 2.758 lp/cm */
    const tg_result *half = find(&cm, "mtf50", "rod");
    CK_NEAR(half->value, 10 * 2 * log(2) / (M_PI * scene.fwhm_mm), 0, half->uncertainty, "a Gaussian's MTF");
    tg_results_free(&cm);
    tg_results_free(&mm);
}
END_TEST

START_TEST(the_water_solid_is_no_check)
{
    tg_check check[] = {{.measure = {ct_number, 1}, .in = {body, 1}, .nominal = given(500), .tolerance = given(1)},
                        {.measure = {ct_number, 1}, .in = {rod, 1}, .nominal = given(300), .tolerance = given(50)}};
    const tg_examine_options o = {.water = "body", .water_u = 0.002};
    tg_verdict verdict;
    tg_results with = examine(check, 2, &o, &verdict), without = examine(check, 2, &plain, NULL);
    const tg_result *water = find(&with, "ct-number", "body");
    ck_assert_int_eq(water->verdict, TG_NO_LIMITS);
    ck_assert_str_eq(water->note, "defines CT number 0");
    ck_assert_int_eq(verdict, TG_PASS);
    /* HU = 1000 (mu / mu_w - 1): u(HU) = (1000 + HU) u(mu_w) / mu_w, here 1300 x 0.002 = 2.6 HU, k = 1.96 to 2 */
    const tg_result *a = find(&with, "ct-number", "rod"), *b = find(&without, "ct-number", "rod");
    const double extra = sqrt(a->uncertainty * a->uncertainty - b->uncertainty * b->uncertainty);
    CK_NEAR(extra, 1.96 * (1000 + b->value) * 0.002, 0.05, 0, "propagation of uncertainty, JCGM 100:2008, 5.1.2");
    tg_results_free(&with);
    tg_results_free(&without);
}
END_TEST

START_TEST(a_lost_phantom_is_inconclusive)
{
    tg_check check[] = {{.measure = {ct_number, 1}, .in = {rod, 1}, .low = given(0)},
                        {.measure = {nps_mean, 1}, .in = {body, 1}, .low = given(0)}};
    tg_verdict verdict;
    snprintf(scanned.target.lost, sizeof scanned.target.lost, "nothing round is in the image");
    tg_results r = examine(check, 2, &plain, &verdict);
    *scanned.target.lost = '\0';
    ck_assert_int_eq(verdict, TG_INCONCLUSIVE);
    ck_assert_uint_eq(r.n_results, 3); /* nps-peak comes with nps-mean */
    for (size_t i = 0; i < 3; i++) {
        ck_assert(isnan(r.result[i].value));
        ck_assert_ptr_nonnull(strstr(r.result[i].why, "nothing round"));
        ck_assert_int_eq(r.result[i].verdict, i < 2 ? TG_INCONCLUSIVE : TG_NO_LIMITS);
    }
    tg_results_free(&r);
}
END_TEST

START_TEST(a_solid_that_is_not_there_is_an_input_error)
{
    tg_error e = {0};
    tg_results r;
    tg_verdict verdict;
    tg_check check = {.measure = {ct_number, 1}, .in = {path, 1}, .low = given(0), .line = 7};
    const tg_specification s = {.path = path, .checks = {&check, 1, 1}};
    ck_assert_int_eq(tg_examine(&scanned.target, &s, &plain, &r, &verdict, &e), TG_INPUT);
    ck_assert_int_eq(e.message[0].line, 7);
}
END_TEST

Suite *suite_examine(void);
Suite *suite_examine(void)
{
    SUITE_BEGIN("examine", 60);
    tcase_add_unchecked_fixture(tcase, set_up, tear_down);
    tcase_add_test(tcase, measures_everything_without_a_specification);
    tcase_add_test(tcase, puts_the_checks_first);
    tcase_add_loop_test(tcase, limits_and_verdicts, 0, sizeof limits / sizeof *limits);
    tcase_add_test(tcase, an_ideal_of_zero_needs_no_nominal_value);
    tcase_add_test(tcase, computed_values);
    tcase_add_test(tcase, warns_where_nothing_can_pass);
    tcase_add_test(tcase, limits_of_another_unit_decide_nothing);
    tcase_add_test(tcase, frequencies_in_both_units);
    tcase_add_test(tcase, the_water_solid_is_no_check);
    tcase_add_test(tcase, a_lost_phantom_is_inconclusive);
    tcase_add_test(tcase, a_solid_that_is_not_there_is_an_input_error);
    return suite;
}
