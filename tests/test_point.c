#include "metrics/measure.h"
#include "metrics/mtf.h"
#include "near.h"
#include "spread.h"

static tg_error e;

/** A case with both measures taken at one of its solids. */
typedef struct {
    Synthetic_case c;
    tg_results out;
    const tg_result *half, *tenth;
} Taken;

static void take(const Synthetic *s, Taken *t, int solid)
{
    t->out = (tg_results){0};
    CK_OK(tg_measure_mtf(&t->c.target, solid, TG_BY_WIRE, &t->out, &e));
    ck_assert_uint_eq(t->out.n_results, 2);
    t->half = &t->out.result[0];
    t->tenth = &t->out.result[1];
    ck_assert_str_eq(t->half->where, s->solid[solid].name);
}

static void make(const Synthetic *s, Modulation *m, double scale_mm, Taken *t)
{
    CK_OK(synthetic_make(s, &t->c, &e));
    if (m) CK_OK(spread_paint(s, m, scale_mm, &t->c, &e));
    CK_OK(tg_noise_learn(&t->c.target, &t->c.target.noise, &e));
}

static void drop(Taken *t)
{
    tg_results_free(&t->out);
    synthetic_free(&t->c);
}

/** Both levels of a spread: within 1 %, and within two of the standard uncertainties that are stated for them. */
static void check_levels(const Taken *t, Modulation *m, double scale_mm, const char *what)
{
    const tg_result *const r[2] = {t->half, t->tenth};
    for (int i = 0; i < 2; i++) {
        const double truth = spread_level(m, scale_mm, tg_mtf_level_of[i]);
        ck_assert_msg(!*r[i]->why, "%s: %s", what, r[i]->why);
        CK_NEAR(r[i]->value, truth, 0.01, 0, what);
        CK_NEAR(r[i]->value, truth, 0, r[i]->uncertainty, what);
    }
}

/* Closed forms of the spread: Gaussian, and back-projection with three windows. */
START_TEST(closed_forms)
{
    static const struct {
        Modulation *m;
        double scale_mm, fwhm_mm;
        const char *what;
    } row[] = {{spread_gauss, 1.6, 1.6, "Gaussian, product of the transform"},
               {spread_hann, 0.8, 1.68, "Hann (Kak and Slaney 1988, ch. 3)"},
               {spread_cosine, 0.8, 1.38, "cosine (same)"},
               {spread_shepp_logan, 0.8, 1.11, "Shepp-Logan (same)"}};
    static const double place[][2] = {{0, 0}, {5.13, -3.41}, {4.9, 6.3}};
    for (size_t i = 0; i < sizeof row / sizeof *row; i++)
        for (size_t k = 0; k < 3; k++) {
            const Synthetic_solid solid[] = {{"body", 0, 0, 30, 20}, {"wire", place[k][0], place[k][1], 0.05, 50000}};
            const Synthetic s = {
                .pixels = 128, .step_mm = 0.5, .fwhm_mm = row[i].fwhm_mm, .slices = 1, .solid = solid, .solids = 2};
            Taken t;
            make(&s, row[i].m, row[i].scale_mm, &t);
            take(&s, &t, 1);
            check_levels(&t, row[i].m, row[i].scale_mm, row[i].what);
            drop(&t);
        }
}
END_TEST

/* Gaussian relations: MTF50 FWHM = 2 ln 2 / pi = 0.441271, MTF10 FWHM = 2 sqrt(ln 2 ln 10) / pi = 0.804268; the curve
 * is the closed form everywhere. Noise-free: what is left is the taper on tails below 1e-4. */
START_TEST(gaussian)
{
    static const Synthetic_solid solid[] = {{"body", 0, 0, 30, 0}, {"wire", -6.2, 3.3, 0.05, 50000}};
    const Synthetic s = {.pixels = 128, .step_mm = 0.5, .fwhm_mm = 1.5, .slices = 1, .solid = solid, .solids = 2};
    Taken t;
    make(&s, NULL, 0, &t);
    t.c.target.spread_mm = 2.1; /* a wrong first guess */
    take(&s, &t, 1);
    CK_NEAR(t.half->value * 1.5, 0.441271, 1e-3, 0, "closed form");
    CK_NEAR(t.tenth->value * 1.5, 0.804268, 1e-3, 0, "closed form");
    ck_assert_uint_eq(t.out.n_curves, 1);
    ck_assert_uint_eq(t.out.n_regions, 1);
    const tg_curve *c = &t.out.curve[0];
    ck_assert_str_eq(c->measure, "mtf");
    ck_assert_str_eq(c->x_unit, "1/mm");
    ck_assert_uint_ge(c->n, 40);
    ck_assert(c->y[c->n - 1] <= 0.021);
    for (size_t i = 0; i < c->n; i++)
        CK_NEAR(c->y[i], spread_gauss(c->x[i], 1.5), 0, 1e-3, "closed form of the curve");
    drop(&t);
}
END_TEST

/* The finite wire is taken out: 0.5 mm lower MTF10 by 3 %, and 1 mm is refused there but not at MTF50. */
START_TEST(thickness)
{
    static const Synthetic_solid solid[] = {
        {"body", 0, 0, 40, 0}, {"wire", -15.3, 3.3, 0.25, 2000}, {"thick", 15.4, 0.2, 0.5, 500}};
    const Synthetic s = {.pixels = 192, .step_mm = 0.5, .fwhm_mm = 1.6, .slices = 1, .solid = solid, .solids = 3};
    Taken t;
    make(&s, NULL, 0, &t);
    take(&s, &t, 1);
    check_levels(&t, spread_gauss, 1.6, "Gaussian");
    CK_NEAR(t.tenth->value, 0.804268 / 1.6, 2e-3, 0, "closed form");
    tg_results_free(&t.out);
    take(&s, &t, 2);
    CK_NEAR(t.half->value, 0.441271 / 1.6, 2e-3, 0, "closed form");
    ck_assert(isnan(t.tenth->value));
    ck_assert_msg(strstr(t.tenth->why, "too thick") != NULL, "%s", t.tenth->why);
    drop(&t);
}
END_TEST

/** What is done to a good case before it is measured, and the word that the reason must hold. */
typedef struct {
    const char *what, *word;
    double step_mm, wire_x_mm;
} Refusal;

static const Refusal refusals[] = {
    {"lost", "nowhere", 0.5, 4},  {"number", "no number", 0.5, 4},        {"clipped", "clipped", 0.5, 4},
    {"coarse", "coarse", 1.1, 4}, {"field", "end of the image", 0.5, 29}, {"rod", "too near to rod", 0.5, 11},
    {"faint", "noise", 0.5, 4},   {"shape", "no circle", 0.5, 4},         {"thick", "too thick for a wire", 0.5, 4},
};

static void spoil(const char *what, Taken *t)
{
    tg_target *g = &t->c.target;
    const size_t nx = g->grid.n[0], at = (size_t)lround(tg_grid_index(&g->grid, 1, 0)) * nx + nx / 2;
    float *v = t->c.image.v;
    if (!strcmp(what, "lost")) strcpy(g->lost, "nowhere to be seen");
    if (!strcmp(what, "number")) v[at] = NAN;
    if (!strcmp(what, "clipped")) v[at] = (float)(t->c.image.most = 3071);
    if (!strcmp(what, "thick")) t->c.phantom.solid[1].half_mm[0] = t->c.phantom.solid[1].half_mm[1] = 0.8;
    if (!strcmp(what, "shape")) t->c.phantom.solid[1].shape = TG_SOLID_BOX;
}

START_TEST(refused)
{
    const Refusal *f = &refusals[_i];
    const Synthetic_solid solid[] = {{"body", 0, 0, 60, 0},
                                     {"wire", f->wire_x_mm, 0, 0.05, strcmp(f->what, "faint") ? 50000 : 1000},
                                     {"rod", 22, 0, 4, 100}};
    const Synthetic s = {.pixels = 128,
                         .step_mm = f->step_mm,
                         .fwhm_mm = 1.5,
                         .slices = 1,
                         .sd = strcmp(f->what, "faint") ? 0 : 5,
                         .solid = solid,
                         .solids = 3};
    Taken t;
    CK_OK(synthetic_make(&s, &t.c, &e));
    CK_OK(synthetic_draw(&s, 0, &t.c, &e));
    spoil(f->what, &t);
    take(&s, &t, 1);
    ck_assert_msg(isnan(t.tenth->value), "%s: %g", f->what, t.tenth->value);
    ck_assert_msg(strstr(t.tenth->why, f->word) != NULL, "%s: %s", f->what, t.tenth->why);
    drop(&t);
}
END_TEST

Suite *suite_point(void);
Suite *suite_point(void)
{
    SUITE_BEGIN("point", 120);
    tcase_add_test(tcase, closed_forms);
    tcase_add_test(tcase, gaussian);
    tcase_add_test(tcase, thickness);
    tcase_add_loop_test(tcase, refused, 0, sizeof refusals / sizeof *refusals);
    return suite;
}
