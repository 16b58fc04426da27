/* Images that are not what the description says: what is said of them, and that images that are as described are not
 * suspected. */
#include "metrics/presence.h"

#include "metrics/measure.h"
#include "near.h"
#include "synthetic.h"

#include <stdio.h>

enum { SOLIDS = 6, FAINT = 5, PIXELS = 128 };
static const Synthetic_solid described[SOLIDS] = {{"body", 0, 0, 60, 0},  {"a", 27, 12, 10, 300},
                                                  {"b", -25, 10, 8, 126}, {"c", 2, -30, 9, -700},
                                                  {"d", 3, 36, 8, 126},   {"faint", -30, -24, 8, 4}};
static const Synthetic noisy = {.pixels = PIXELS,
                                .step_mm = 1,
                                .fwhm_mm = 1.6,
                                .slices = 1,
                                .sd = 8,
                                .power = synthetic_hann,
                                .cutoff_per_mm = 0.5,
                                .solid = described,
                                .solids = SOLIDS,
                                .seed = 77};

/** A target of the description whose image shows other solids. */
static void draw(const Synthetic_solid *shown, Synthetic_case *c)
{
    Synthetic s = noisy;
    Synthetic_case other;
    tg_error e = {0};
    s.solid = shown;
    CK_OK(synthetic_make(&noisy, c, &e));
    CK_OK(synthetic_make(&s, &other, &e));
    memcpy(c->truth, other.truth, (size_t)PIXELS * PIXELS * sizeof *c->truth);
    CK_OK(synthetic_draw(&noisy, 1, c, &e));
    synthetic_free(&other);
}

static tg_result ct_number(const tg_target *t, int solid)
{
    tg_results all = {0};
    tg_error e = {0};
    CK_OK(tg_measure_find("ct-number")->run(t, solid, TG_BY_ANY, &all, &e));
    const tg_result r = all.result[0];
    tg_results_free(&all);
    return r;
}

static const struct {
    int solid; /* that is moved or of another value; 0: none */
    double x_mm, y_mm, value;
    tg_presence presence;
    const char *note, *why; /* of its CT number; NULL: none */
} rows[] = {
    {0, 0, 0, 0, TG_STANDS, NULL, NULL},
    {1, 27, 12, 450, TG_STANDS, NULL, NULL},           /* another material keeps its figure */
    {2, -25, 10, -90, TG_STANDS, NULL, NULL},          /* the same, on the other side of the body */
    {2, -40, -5, 126, TG_MISSING, "no outline", NULL}, /* elsewhere */
    {4, 3, 36, 0, TG_MISSING, "no outline", NULL},     /* not there */
    {2, -33, 10, 126, TG_UNTOLD, NULL, "not uniform"}, /* its edge runs through the region */
    {1, 35, 6, 300, TG_UNTOLD, NULL, "not uniform"},
};

START_TEST(of_one_solid)
{
    Synthetic_solid shown[SOLIDS];
    Synthetic_case c;
    tg_error e = {0};
    char lost[200] = "";
    memcpy(shown, described, sizeof shown);
    if (rows[_i].solid)
        shown[rows[_i].solid] = (Synthetic_solid){"other", rows[_i].x_mm, rows[_i].y_mm,
                                                  described[rows[_i].solid].radius_mm, rows[_i].value};
    draw(shown, &c);
    for (int i = 1; i < SOLIDS; i++) {
        const bool changed = i == rows[_i].solid;
        const char *const note = changed ? rows[_i].note : NULL, *const why = changed ? rows[_i].why : NULL;
        const tg_presence want = changed ? rows[_i].presence : i == FAINT ? TG_UNTOLD : TG_STANDS;
        tg_presence presence;
        CK_OK(tg_presence_find(&c.target, i, &presence, &e));
        const tg_result r = ct_number(&c.target, i);
        ck_assert_msg(why || presence == want, "row %d: solid %d: %d, wanted %d", _i, i, (int)presence, (int)want);
        ck_assert_msg(note ? strstr(r.note, note) != NULL : why || !r.note[0], "row %d, solid %d: note '%s'", _i, i,
                      r.note);
        ck_assert_msg(why ? strstr(r.why, why) != NULL : !r.why[0], "row %d, solid %d: why '%s'", _i, i, r.why);
        if (!why && !note) CK_NEAR(r.value, shown[i].value, 0, 2 * r.uncertainty, "drawn so");
    }
    CK_OK(tg_presence_doubt(&c.target, lost, &e));
    ck_assert_str_eq(lost, "");
    synthetic_free(&c);
}
END_TEST

/* three of four that should be seen are elsewhere */
START_TEST(of_most)
{
    static const Synthetic_solid shown[SOLIDS] = {{"body", 0, 0, 60, 0},  {"a", 27, 12, 10, 300},
                                                  {"b", -42, -5, 8, 126}, {"c", 27, -30, 9, -700},
                                                  {"d", -15, 40, 8, 126}, {"faint", -30, -24, 8, 4}};
    Synthetic_case c;
    tg_error e = {0};
    char lost[200] = "";
    draw(shown, &c);
    CK_OK(tg_presence_doubt(&c.target, lost, &e));
    ck_assert_msg(strstr(lost, "does not fit the description: 3 of 4"), "'%s'", lost);
    synthetic_free(&c);
}
END_TEST

static const struct {
    double low, high, step; /* limits of the values, and what they are rounded to; step 0: not at all */
    int solid;
    double end; /* that is named; NaN: the solid is measured */
} exports[] = {
    {-INFINITY, INFINITY, 0, 1, NAN}, {-INFINITY, INFINITY, 1, 1, NAN},
    {-INFINITY, 250, 0, 1, 250},      {-INFINITY, 250, 1, 1, 250}, /* all of it */
    {-INFINITY, 303, 0, 1, 303},      {-INFINITY, 303, 1, 1, 303}, /* a third of it */
    {-INFINITY, 303, 1, 2, NAN},                                   /* others are not touched */
    {-600, INFINITY, 0, 3, -600},     {-703, INFINITY, 1, 3, -703},
    {-INFINITY, INFINITY, 8, 1, NAN}, /* steps as coarse as the noise: many equal values, nothing is cut off */
};

START_TEST(of_values)
{
    Synthetic_case c;
    tg_error e = {0};
    draw(described, &c);
    for (size_t i = 0; i < (size_t)PIXELS * PIXELS; i++) {
        const double step = exports[_i].step, v = (double)c.image.v[i];
        c.image.v[i] = (float)fmin(fmax(step > 0 ? step * round(v / step) : v, exports[_i].low), exports[_i].high);
    }
    tg_noise_free(&c.target.noise);
    CK_OK(tg_noise_learn(&c.target, &c.target.noise, &e));
    const tg_result r = ct_number(&c.target, exports[_i].solid);
    if (isnan(exports[_i].end)) {
        ck_assert_str_eq(r.why, "");
        CK_NEAR(r.value, described[exports[_i].solid].value, 0, 2 * r.uncertainty, "drawn so");
    } else {
        char end[32];
        snprintf(end, sizeof end, "exactly %g HU", exports[_i].end);
        static const char *const others[] = {"diameter", "mtf50"};
        for (int k = 0; k < 2; k++) {
            tg_results all = {0};
            CK_OK(tg_measure_find(others[k])->run(&c.target, exports[_i].solid, TG_BY_EDGE, &all, &e));
            ck_assert_msg(strstr(all.result[0].why, "clipped"), "row %d: '%s'", _i, all.result[0].why);
            tg_results_free(&all);
        }
        ck_assert_msg(strstr(r.why, "clipped") && strstr(r.why, end), "row %d: '%s', wanted '%s'", _i, r.why, end);
    }
    synthetic_free(&c);
}
END_TEST

Suite *suite_presence(void);
Suite *suite_presence(void)
{
    SUITE_BEGIN("presence", 60);
    tcase_add_loop_test(tcase, of_one_solid, 0, sizeof rows / sizeof *rows);
    tcase_add_test(tcase, of_most);
    tcase_add_loop_test(tcase, of_values, 0, sizeof exports / sizeof *exports);
    return suite;
}
