/* Diameter and position against discs drawn in closed form: a disc under a Gaussian spread, along its radius. */
#include "io/memory.h"
#include "metrics/measure.h"
#include "tests/near.h"
#include "tests/synthetic.h"

#include <stdio.h>

static const Synthetic_solid solids[] = {{"body", 0, 0, 60, 0},         {"rod", 30, 5, 9, 300},
                                         {"hole", -28, 10, 7.5, -1000}, {"small", 0, -30, 3, 300},
                                         {"close", -5, 33, 8, 200},     {"neighbour", 12.5, 33, 8, 200},
                                         {"faint", -20, -25, 9, 6}};

static const Synthetic scene = {.pixels = 256,
                                .step_mm = 0.6,
                                .fwhm_mm = 1.2,
                                .slices = 1,
                                .sd = 6,
                                .power = synthetic_hann,
                                .cutoff_per_mm = 0.8,
                                .solid = solids,
                                .solids = sizeof solids / sizeof *solids,
                                .seed = 3};

enum { BODY, ROD, HOLE, SMALL, CLOSE, NEIGHBOUR, FAINT };

static tg_result measure(tg_code (*run)(const tg_target *, int, tg_by, tg_results *, tg_error *), const tg_target *t,
                         int solid)
{
    tg_error e = {0};
    tg_results all = {0};
    CK_OK(run(t, solid, TG_BY_ANY, &all, &e));
    ck_assert_uint_eq(all.n_results, 1);
    const tg_result r = all.result[0];
    ck_assert_str_eq(r.where, t->phantom->solid[solid].name.v);
    ck_assert_str_eq(r.unit, "mm");
    tg_results_free(&all);
    return r;
}

/** Over draws of the noise the stated uncertainty covers the truth: of 20 intervals of 95 %, fewer than 16 cover in
 * 0.26 % of cases (binomial). */
START_TEST(measures_diameters)
{
    enum { DRAWS = 20 };
    static const int round[] = {BODY, ROD, HOLE};
    const int solid = round[_i];
    tg_error e = {0};
    Synthetic_case c;
    CK_OK(synthetic_make(&scene, &c, &e));
    int covered = 0;
    for (uint64_t draw = 0; draw < DRAWS; draw++) {
        CK_OK(synthetic_draw(&scene, draw, &c, &e));
        const tg_result r = measure(tg_measure_diameter, &c.target, solid);
        ck_assert_msg(!*r.why, "%s: %s", r.where, r.why);
        const double truth = 2 * solids[solid].radius_mm;
        CK_NEAR(r.predicted, truth, 1e-9, 0, "as described");
        CK_NEAR(r.value, truth, 0, 0.1 * scene.step_mm, "drawn so: within a tenth of a pixel");
        ck_assert(r.uncertainty > 0 && r.uncertainty < 0.1);
        ck_assert(r.uncertainty_noise > 0 && r.uncertainty_noise <= r.uncertainty);
        covered += fabs(r.value - truth) <= r.uncertainty;
    }
    printf("diameter of the %s: %d of %d intervals cover it\n", solids[solid].name, covered, DRAWS);
    ck_assert_msg(covered >= 16, "%s: %d of %d intervals cover the diameter", solids[solid].name, covered, DRAWS);
    synthetic_free(&c);
}
END_TEST

START_TEST(measures_positions)
{
    tg_error e = {0};
    Synthetic_case c;
    CK_OK(synthetic_make(&scene, &c, &e));
    CK_OK(synthetic_draw(&scene, 1, &c, &e));
    tg_result r = measure(tg_measure_position, &c.target, ROD);
    CK_NEAR(r.value, 0, 0, fmax(r.uncertainty, 0.02), "drawn in its place");
    ck_assert(r.uncertainty > 0 && r.uncertainty < 0.1);
    /* a target that is wrong about its pose by 0.3 and 0.4 mm sees every solid half a millimetre off its place */
    c.target.shift_mm[0] += 0.3;
    c.target.shift_mm[1] -= 0.4;
    r = measure(tg_measure_position, &c.target, HOLE);
    CK_NEAR(r.value, 0.5, 0, 0.03, "3-4-5 triangle; a twentieth of a pixel");
    r = measure(tg_measure_position, &c.target, BODY);
    CK_NEAR(r.value, 0.5, 0, 1e-12, "the body's shift");
    synthetic_free(&c);
}
END_TEST

/* A wire and a solid that is neither wire nor outline, between pixels, against where they were drawn. Without noise the
 * pixels leave a few micrometres at two pixels to the spread; moved by 0.3 and 0.4 mm they stand half a millimetre off.
 * How often the uncertainty covers the place under noise is counted in test_truth.c. */
START_TEST(finds_wires)
{
    static const Synthetic_solid thin[] = {
        {"body", 0, 0, 60, 0}, {"wire", 20.13, -7.41, 0.1, 20000}, {"bead", -20.37, 11.2, 1, 900}};
    Synthetic s = scene;
    tg_error e = {0};
    Synthetic_case c;
    s.solid = thin;
    s.solids = 3;
    s.sd = 0.1;
    CK_OK(synthetic_make(&s, &c, &e));
    CK_OK(synthetic_draw(&s, 1, &c, &e));
    for (int solid = 1; solid < 3; solid++) {
        tg_result r = measure(tg_measure_position, &c.target, solid);
        ck_assert_msg(!*r.why, "%s: %s", r.where, r.why);
        CK_NEAR(r.value, 0, 0, 0.01 * s.step_mm, "drawn in its place: a hundredth of a pixel");
        ck_assert(r.uncertainty > 0 && r.uncertainty < 0.02);
        c.phantom.solid[solid].centre_mm[0] += 0.3;
        c.phantom.solid[solid].centre_mm[1] -= 0.4;
        r = measure(tg_measure_position, &c.target, solid);
        CK_NEAR(r.value, 0.5, 0, 0.01 * s.step_mm, "3-4-5 triangle");
    }
    synthetic_free(&c);
}
END_TEST

START_TEST(says_why_not)
{
    tg_error e = {0};
    Synthetic_case c;
    CK_OK(synthetic_make(&scene, &c, &e));
    CK_OK(synthetic_draw(&scene, 1, &c, &e));
    static const struct {
        int solid;
        const char *why;
    } refused[] = {{SMALL, "spread widths"}, {NEIGHBOUR, "another solid"}, {FAINT, "outline"}};
    for (size_t i = 0; i < sizeof refused / sizeof *refused; i++) {
        const tg_result r = measure(tg_measure_diameter, &c.target, refused[i].solid);
        ck_assert_msg(isnan(r.value) && strstr(r.why, refused[i].why), "%s: '%s'", r.where, r.why);
    }
    tg_result r = measure(tg_measure_position, &c.target, SMALL);
    ck_assert_msg(isnan(r.value) && strstr(r.why, "too near"), "%s: '%s'", r.where, r.why); /* 20 mm to the next */
    c.image.most = 290; /* clipped below the rod's own value */
    r = measure(tg_measure_diameter, &c.target, ROD);
    ck_assert_str_eq(r.why, "the values beside its outline are clipped");
    c.image.most = INFINITY;
    snprintf(c.target.lost, sizeof c.target.lost, "gone");
    r = measure(tg_measure_position, &c.target, ROD);
    ck_assert(isnan(r.value));
    ck_assert_str_eq(r.why, "gone");
    synthetic_free(&c);
}
END_TEST

Suite *suite_shape(void);
Suite *suite_shape(void)
{
    SUITE_BEGIN("shape", 60);
    tcase_add_loop_test(tcase, measures_diameters, 0, 3);
    tcase_add_test(tcase, measures_positions);
    tcase_add_test(tcase, finds_wires);
    tcase_add_test(tcase, says_why_not);
    return suite;
}
