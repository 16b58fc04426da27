/* Finding phantoms in drawn slices: the truth is the pose that they were drawn with. */
#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/target.h"
#include "phantoms/random.h"
#include "tests/near.h"

#include <stdio.h>
#include <string.h>

/* Phantoms of plain values; water is CT number 0. */
#define MATERIALS \
    "materials:\n" \
    "  - {name: water, hu: 0}\n  - {name: acrylic, hu: 120}\n  - {name: ptfe, hu: 940}\n  - {name: ldpe, hu: -90}\n" \
    "  - {name: metal, hu: 1600}\n  - {name: faint, hu: 8}\n  - {name: hole, mu: 0}\n  - {name: bone, hu: 2600}\n"
#define BODY "solids:\n  - {name: body, shape: cylinder, material: water, centre: [0, 0, 0], radius: 80, length: 60}\n"
#define ROD(name, material, x, y, r) \
    "  - {name: " name ", shape: cylinder, material: " material ", centre: [" x ", " y ", 0], radius: " r \
    ", length: 60}\n"

static const char rods[] = "phantom: rods\n" MATERIALS BODY ROD("a", "ptfe", "50", "0", "8")
    ROD("b", "ldpe", "0", "50", "8") ROD("c", "acrylic", "-50", "0", "8") ROD("d", "bone", "0", "-50", "8");
static const char uneven[] = "phantom: uneven\n" MATERIALS BODY ROD("a", "ptfe", "50", "0", "8")
    ROD("b", "ldpe", "10", "48", "8") ROD("c", "acrylic", "-40", "30", "8") ROD("d", "bone", "-20", "-45", "8");
static const char mirrored[] = "phantom: mirrored\n" MATERIALS BODY ROD("a", "ptfe", "-50", "0", "8")
    ROD("b", "ldpe", "-10", "48", "8") ROD("c", "acrylic", "40", "30", "8") ROD("d", "bone", "20", "-45", "8");
static const char wire[] = "phantom: wire\n" MATERIALS BODY ROD("wire", "metal", "-35", "20", "0.5");
static const char faint[] = "phantom: faint\n" MATERIALS BODY ROD("a", "faint", "45", "0", "12")
    ROD("b", "faint", "-20", "40", "9") ROD("c", "faint", "-25", "-42", "6");
static const char plain[] = "phantom: plain\n" MATERIALS BODY;
static const char twins[] =
    "phantom: twins\n" MATERIALS BODY ROD("a", "ptfe", "45", "0", "8") ROD("b", "ptfe", "-45", "0", "8");
static const char off_axis[] =
    "phantom: off-axis\n" MATERIALS
    "solids:\n  - {name: body, shape: cylinder, material: water, centre: [7, -12, 0], radius: 60, length: 60}\n" ROD(
        "a", "ptfe", "30", "-12", "6") ROD("hole", "hole", "0", "15", "5");
static const char ellipse[] =
    "phantom: ellipse\n" MATERIALS "solids:\n  - {name: body, shape: elliptic-cylinder, material: water, centre: [0, "
    "0, 0], size: [120, 170, 60]}\n" ROD("a", "acrylic", "20", "30", "8") ROD("b", "faint", "-20", "-40", "10");
static const char box[] =
    "phantom: box\n" MATERIALS
    "solids:\n  - {name: body, shape: box, material: water, centre: [0, 0, 0], size: [110, 80, 60]}\n" ROD(
        "a", "ptfe", "30", "20", "8");

typedef struct {
    size_t pixels;
    double step_mm, fwhm_px, sd, noise_fwhm_px; /* noise_fwhm_px 0: white */
    double shift_mm[2], turn_rad;
    double magnify;
    uint64_t seed;
} Picture;

/** Blur both axes by a Gaussian. */
static void blur(double *v, size_t n, double fwhm_px)
{
    const double s = fwhm_px / 2.354820045;
    const int half = (int)ceil(5 * s);
    double kernel[128], line[1024], sum = 0;
    for (int k = -half; k <= half; k++)
        sum += kernel[k + half] = exp(-0.5 * k * k / (s * s));
    for (int axis = 0; axis < 2; axis++) {
        for (size_t a = 0; a < n; a++) {
            const size_t start = axis ? a : a * n, stride = axis ? n : 1;
            for (size_t i = 0; i < n; i++)
                line[i] = v[start + i * stride];
            for (size_t i = 0; i < n; i++) {
                double mean = 0;
                for (int k = -half; k <= half; k++) {
                    const long at = (long)i + k;
                    mean += kernel[k + half] * line[at < 0 ? 0 : at >= (long)n ? (long)n - 1 : at];
                }
                v[start + i * stride] = mean / sum;
            }
        }
    }
}

enum { FINE = 5 }; /* a slice is drawn and blurred on pixels this much finer, then sampled in their middles */

/** Add a contrast times the part of each fine pixel that a solid covers in the plane z = 0. */
static void cover(const tg_solid *solid, double contrast, const Picture *p, double *v)
{
    enum { LINES = 8 };
    const size_t n = FINE * p->pixels;
    const double c = cos(p->turn_rad), s = sin(p->turn_rad), step = p->step_mm / FINE, first = -0.5 * step * (double)n;
    for (size_t line = 0; line < LINES * n; line++) {
        const double y = (first + ((double)line + 0.5) / LINES * step - p->shift_mm[1]) / p->magnify;
        const double x = (first - p->shift_mm[0]) / p->magnify;
        const double point[3] = {c * x + s * y, c * y - s * x, 0}, along[3] = {c, -s, 0};
        double t[2];
        if (!tg_solid_interval(solid, point, along, t)) continue;
        const double a = fmax(t[0] * p->magnify / step, 0), b = fmin(t[1] * p->magnify / step, (double)n);
        for (size_t i = (size_t)a; (double)i < b; i++)
            v[line / LINES * n + i] += contrast / LINES * (fmin(b, (double)i + 1) - fmax(a, (double)i));
    }
}

static void add_noise(const Picture *p, double *v)
{
    const size_t n = p->pixels * p->pixels;
    double *noise = tg_alloc(n, sizeof *noise), square = 0;
    tg_random r = tg_random_stream(p->seed, 1, 0);
    for (size_t i = 0; i < n; i++)
        noise[i] = tg_random_normal(&r);
    if (p->noise_fwhm_px > 0) blur(noise, p->pixels, p->noise_fwhm_px);
    for (size_t i = 0; i < n; i++)
        square += noise[i] * noise[i];
    for (size_t i = 0; i < n; i++)
        v[i] += p->sd * noise[i] / sqrt(square / (double)n);
    tg_free(noise);
}

/** A slice of a phantom in HU; every solid but the body lies in the body alone. */
static void picture(const tg_phantom *phantom, const Picture *p, tg_image *image)
{
    tg_error e = {0};
    const double origin[2] = {0, 0};
    const size_t n = p->pixels, fine = FINE * n;
    const tg_grid grid = tg_grid_square(n, p->step_mm * (double)n, origin);
    double *mu = tg_alloc(phantom->n_materials, sizeof *mu), water;
    double *v = tg_alloc(fine * fine, sizeof *v);
    CK_OK(tg_image_create(&grid, TG_HU, image, &e));
    CK_OK(tg_phantom_mu(phantom, 70, mu, &e));
    CK_OK(tg_water_mu(70, &water, &e));
    for (size_t i = 0; i < phantom->n_solids; i++) {
        const double other = i ? mu[phantom->solid[0].material] : 0;
        cover(&phantom->solid[i], 1000 * (mu[phantom->solid[i].material] - other) / water, p, v);
    }
    if (p->fwhm_px > 0) blur(v, fine, FINE * p->fwhm_px);
    for (size_t y = 0; y < n; y++)
        for (size_t x = 0; x < n; x++)
            v[y * n + x] = v[(FINE * y + FINE / 2) * fine + FINE * x + FINE / 2] - 1000;
    if (p->sd > 0) add_noise(p, v);
    for (size_t i = 0; i < n * n; i++)
        image->v[i] = (float)v[i];
    tg_free(mu);
    tg_free(v);
}

static tg_phantom parse(const char *text)
{
    tg_error e = {0};
    tg_phantom phantom;
    CK_OK(tg_phantom_parse(text, strlen(text), "test", &phantom, &e));
    return phantom;
}

static const struct {
    const char *name, *phantom;
    double fwhm_px, sd, noise_fwhm_px;
    int order;        /* turns are equal modulo 360 degrees / order; 0: no turn */
    double limit_deg; /* 0: what noise allows */
} rows[] = {
    {"rods, sharp", rods, 1.2, 0, 0, 1, 0.1}, {"rods", rods, 2, 10, 0, 1, 0.1},
    {"rods, noisy", rods, 2, 100, 2, 1, 0},   {"rods, soft", rods, 3, 20, 3, 1, 0.1},
    {"wire", wire, 2, 1, 2, 1, 0.1},          {"wire, noisy", wire, 2, 8, 2, 1, 0},
    {"faint", faint, 2, 3, 2, 1, 0},          {"plain", plain, 2, 20, 2, 0, 0.1},
    {"twins", twins, 2, 10, 2, 2, 0.1},       {"off axis", off_axis, 2, 10, 2, 1, 0.1},
    {"ellipse", ellipse, 2, 5, 2, 1, 0.1},    {"box", box, 2, 20, 2, 1, 0.1},
    {"uneven", uneven, 2, 20, 2, 1, 0.1},
};

enum { DRAWS = 4 };

/** Shift within a tenth of a pixel, turn within a tenth of a degree, as the users are promised; where noise forbids
 * that, within four standard uncertainties. The errors over the stated uncertainties have a mean square of 1: with four
 * draws (eight components) chi-square stays below 4 on average but for one case in 10^4. */
START_TEST(finds)
{
    tg_error e = {0};
    tg_phantom phantom = parse(rows[_i].phantom);
    double worst_shift = 0, worst_turn = 0, shift_square = 0, turn_square = 0;
    tg_random r = tg_random_stream(7, 2, (uint64_t)_i);
    for (uint64_t draw = 0; draw < DRAWS; draw++) {
        const double far = 30 * sqrt(tg_random_uniform(&r)), way = 2 * M_PI * tg_random_uniform(&r);
        const double turned = 2 * M_PI * tg_random_uniform(&r), period = 2 * M_PI / fmax(rows[_i].order, 1);
        const Picture p = {.pixels = 160,
                           .step_mm = 1.5,
                           .fwhm_px = rows[_i].fwhm_px,
                           .sd = rows[_i].sd,
                           .noise_fwhm_px = rows[_i].noise_fwhm_px,
                           .shift_mm = {far * cos(way), far * sin(way)},
                           .turn_rad = rows[_i].order ? turned : 0,
                           .magnify = 1,
                           .seed = 100 * draw + (uint64_t)_i};
        tg_image image;
        tg_target t;
        picture(&phantom, &p, &image);
        CK_OK(tg_target_create(&image, 1, &phantom, NULL, &t, &e));
        ck_assert_msg(!*t.lost, "%s: lost at %g, %g mm, %g degrees: %s", rows[_i].name, p.shift_mm[0], p.shift_mm[1],
                      p.turn_rad * 180 / M_PI, t.lost);
        ck_assert(t.turn_known == (rows[_i].order != 0));
        const double turn = fabs(remainder(t.turn_rad - p.turn_rad, period));
        const double shift_mm = hypot(t.shift_mm[0] - p.shift_mm[0], t.shift_mm[1] - p.shift_mm[1]);
        worst_shift = fmax(worst_shift, shift_mm / p.step_mm);
        worst_turn = fmax(worst_turn, turn * 180 / M_PI);
        shift_square += 0.5 * pow(shift_mm / t.shift_u_mm, 2) / DRAWS;
        if (t.turn_known) turn_square += pow(turn / t.turn_u_rad, 2) / DRAWS;
        const double limit = rows[_i].limit_deg > 0 ? rows[_i].limit_deg : 4 * t.turn_u_rad * 180 / M_PI;
        const double most = rows[_i].limit_deg > 0 ? 0.1 : fmax(0.1, 4 * t.shift_u_mm / p.step_mm);
        ck_assert_msg(shift_mm / p.step_mm < most, "%s: shift off by %g pixels", rows[_i].name, shift_mm / p.step_mm);
        ck_assert_msg(turn * 180 / M_PI < limit, "%s: turn off by %g degrees, allowed %g", rows[_i].name,
                      turn * 180 / M_PI, limit);
        /* the spread: half maximum of the Gaussian, within a tenth and noise; not below 1.2 pixels */
        CK_NEAR(t.spread_mm, fmax(rows[_i].fwhm_px, 1.2) * p.step_mm, 0.25, 0, "the Gaussian that it was drawn with");
        tg_target_free(&t);
        tg_image_free(&image);
    }
    printf("%-12s shift %.4f px, turn %.4f degrees at worst; %.2f and %.2f times their uncertainty (rms)\n",
           rows[_i].name, worst_shift, worst_turn, sqrt(shift_square), sqrt(turn_square));
    ck_assert_msg(shift_square < 4 && turn_square < 6, "%s: errors are %g and %g times the stated uncertainty",
                  rows[_i].name, sqrt(shift_square), sqrt(turn_square));
    tg_phantom_free(&phantom);
}
END_TEST

/** Draw, look for another phantom (or the same), and tell why it was lost. */
static void lose(const char *drawn, const char *sought, const Picture *p, char why[200])
{
    tg_error e = {0};
    tg_phantom a = parse(drawn), b = parse(sought);
    tg_image image;
    tg_target t;
    picture(&a, p, &image);
    CK_OK(tg_target_create(&image, 1, &b, NULL, &t, &e));
    snprintf(why, 200, "%s", t.lost);
    tg_target_free(&t);
    tg_image_free(&image);
    tg_phantom_free(&a);
    tg_phantom_free(&b);
}

static const struct {
    const char *drawn, *sought;
    double x_mm, magnify, sd;
    const char *why; /* a part of the sentence */
} losses[] = {
    {rods, rods, 120, 1, 5, "on end are not in the image"}, /* half of the body is off the field */
    {rods, rods, 150, 1, 5, "of the body"},                 /* most of it */
    {rods, rods, 0, 1.08, 5, "another phantom, or wrong pixels"},
    {twins, rods, 0, 1, 5, "the pattern"},
    {plain, rods, 0, 1, 5, "the pattern"},
    {plain, faint, 0, 1, 20, "the pattern"},
    {ellipse, rods, 0, 1, 5, "the body"},
    {mirrored, uneven, 0, 1, 5, "mirror image"},
    {uneven, mirrored, 4, 1, 50, "mirror image"},
    {rods, rods, 1e4, 1, 5, ""}, /* noise alone */
};

START_TEST(is_lost)
{
    const Picture p = {.pixels = 160,
                       .step_mm = 1.5,
                       .fwhm_px = 2,
                       .sd = losses[_i].sd,
                       .noise_fwhm_px = 2,
                       .shift_mm = {losses[_i].x_mm, 3},
                       .magnify = losses[_i].magnify,
                       .seed = 5};
    char why[200];
    lose(losses[_i].drawn, losses[_i].sought, &p, why);
    ck_assert_msg(*why && strstr(why, losses[_i].why), "case %d: '%s', expected '%s'", _i, why, losses[_i].why);
}
END_TEST

START_TEST(is_lost_in_nothing)
{
    const Picture p = {.pixels = 64, .step_mm = 4, .shift_mm = {1e4, 0}, .magnify = 1};
    char why[200];
    lose(rods, rods, &p, why);
    ck_assert_str_eq(why, "the image is empty: no part of it stands out");
}
END_TEST

START_TEST(finds_a_body_larger_than_the_field)
{
    /* four corners of the field see the outline */
    tg_error e = {0};
    tg_phantom phantom = parse(rods);
    const Picture p = {.pixels = 152,
                       .step_mm = 1,
                       .fwhm_px = 2,
                       .sd = 5,
                       .noise_fwhm_px = 2,
                       .shift_mm = {1.3, -0.7},
                       .turn_rad = 1,
                       .magnify = 1,
                       .seed = 3};
    tg_image image;
    tg_target t;
    picture(&phantom, &p, &image);
    CK_OK(tg_target_create(&image, 1, &phantom, NULL, &t, &e));
    ck_assert_str_eq(t.lost, "");
    CK_NEAR(t.shift_mm[0], 1.3, 0, 0.1, "drawn so");
    CK_NEAR(t.shift_mm[1], -0.7, 0, 0.1, "drawn so");
    CK_NEAR(t.turn_rad, 1, 0, 0.1 * M_PI / 180, "drawn so");
    tg_target_free(&t);
    tg_image_free(&image);
    tg_phantom_free(&phantom);
}
END_TEST

START_TEST(labels)
{
    tg_error e = {0};
    tg_phantom phantom = parse(wire);
    const Picture p = {.pixels = 160,
                       .step_mm = 1.5,
                       .fwhm_px = 2,
                       .sd = 3,
                       .noise_fwhm_px = 2,
                       .shift_mm = {4, 9},
                       .turn_rad = 2,
                       .magnify = 1,
                       .seed = 3};
    tg_image image;
    tg_target t;
    picture(&phantom, &p, &image);
    CK_OK(tg_target_create(&image, 1, &phantom, NULL, &t, &e));
    ck_assert_str_eq(t.lost, "");
    size_t wires = 0;
    const size_t n = p.pixels;
    for (size_t i = 0; i < n * n; i++)
        wires += t.label[i] == 1;
    ck_assert_msg(wires >= 1 && wires <= 4, "a wire of two thirds of a pixel marks %zu", wires);
    /* every 37th pixel against a search of all others */
    for (size_t i = 0; i < n * n; i += 37) {
        double least = INFINITY;
        for (size_t k = 0; k < n * n; k++) {
            if (t.label[k] == t.label[i]) continue;
            const double dx = (double)(k % n) - (double)(i % n), dy = (double)(k / n) - (double)(i / n);
            least = fmin(least, p.step_mm * hypot(dx, dy));
        }
        CK_NEAR(t.clear_mm[i], least, 1e-6, 0, "exhaustive search");
    }
    double centre[2], radius;
    ck_assert(tg_target_circle(&t, 1, centre, &radius));
    const double c = cos(2), s = sin(2);
    CK_NEAR(centre[0], -35 * c - 20 * s + 4, 0, 0.1, "turned and shifted");
    CK_NEAR(centre[1], -35 * s + 20 * c + 9, 0, 0.1, "turned and shifted");
    CK_NEAR(radius, 0.5, 1e-6, 0, "as described");
    double back[2];
    tg_target_to_phantom(&t, centre, back);
    CK_NEAR(back[0], -35, 0, 1e-9, "there and back");
    CK_NEAR(back[1], 20, 0, 1e-9, "there and back");
    const tg_region disc = {.outline = TG_DISC, .centre_mm = {centre[0], centre[1]}, .outer_mm = 12};
    size_t *index, found;
    CK_OK(tg_target_pixels(&t, &disc, 0, 6, &index, &found, &e));
    ck_assert(found > 0);
    for (size_t i = 0; i < found; i++) {
        ck_assert(t.label[index[i]] == 0 && t.clear_mm[index[i]] >= 6);
        ck_assert(tg_region_holds(&disc, tg_grid_mm(&t.grid, 0, (double)(index[i] % n)),
                                  tg_grid_mm(&t.grid, 1, (double)(index[i] / n))));
    }
    tg_free(index);
    tg_target_free(&t);
    tg_image_free(&image);
    tg_phantom_free(&phantom);
}
END_TEST

START_TEST(pools_slices)
{
    /* five slices 20 mm apart: the body of 60 mm holds the middle three, the two beyond are left out with a warning */
    tg_error e = {0};
    tg_phantom phantom = parse(plain);
    const Picture p = {.pixels = 96, .step_mm = 2, .fwhm_px = 2, .sd = 0, .magnify = 1};
    tg_image one, other, stack = {0};
    tg_target t;
    picture(&phantom, &p, &one);
    tg_grid grid = one.grid;
    grid.n[2] = 5;
    grid.step_mm[2] = 20;
    grid.first_mm[2] = -40;
    CK_OK(tg_image_create(&grid, TG_HU, &stack, &e));
    for (size_t k = 0; k < 5; k++)
        for (size_t i = 0; i < 96 * 96; i++)
            stack.v[k * 96 * 96 + i] = one.v[i] + (float)k;
    CK_OK(tg_target_create(&stack, 1, &phantom, NULL, &t, &e));
    ck_assert_str_eq(t.lost, "");
    ck_assert_uint_eq(t.n, 3);
    ck_assert_uint_eq(e.count, 1);
    ck_assert(e.message[0].warning);
    CK_NEAR(t.mean[48 * 96 + 48], one.v[48 * 96 + 48] + 2, 0, 1e-4, "the mean of 1, 2, 3");
    tg_target_free(&t);

    /* images of other grids, units or kernels are not pooled */
    tg_image both[2] = {one, stack};
    both[1].grid.step_mm[0] = 3;
    ck_assert_int_eq(tg_target_create(both, 2, &phantom, NULL, &t, &e), TG_INPUT);
    both[1] = one;
    both[1].unit = TG_PER_MM;
    ck_assert_int_eq(tg_target_create(both, 2, &phantom, NULL, &t, &e), TG_INPUT);
    both[1] = one;
    both[1].kernel = (char[]){"ramp"};
    ck_assert_int_eq(tg_target_create(both, 2, &phantom, NULL, &t, &e), TG_INPUT);
    ck_assert_int_eq(tg_target_create(both, 0, &phantom, NULL, &t, &e), TG_INPUT);

    /* a slice beside the body */
    other = one;
    other.grid.first_mm[2] = 31;
    CK_OK(tg_target_create(&other, 1, &phantom, NULL, &t, &e));
    ck_assert_msg(strstr(t.lost, "no slice lies inside the body"), "'%s'", t.lost);
    tg_target_free(&t);
    tg_image_free(&one);
    tg_image_free(&stack);
    tg_phantom_free(&phantom);
}
END_TEST

static void as_it_is(float *v, size_t n)
{
    (void)v;
    (void)n;
}
static void offset(float *v, size_t n)
{
    for (size_t i = 0; i < n; i++)
        v[i] += 100;
}
static void contrast(float *v, size_t n) /* about the body, at 0: its noise is doubled */
{
    for (size_t i = 0; i < n; i++)
        v[i] *= fabsf(v[i]) < 60 ? 2.F : 1.F;
}
static void dead(float *v, size_t n)
{
    for (size_t i = 0; i < n; i++)
        v[i] = 0;
}
static void without_a_value(float *v, size_t n)
{
    for (size_t i = 0; i < n; i++)
        v[i] = NAN;
}

static const struct {
    void (*spoil)(float *v, size_t n);
    size_t pooled;
    const char *warning; /* NULL: none */
} stacks[] = {
    {as_it_is, 4, NULL},
    {offset, 4, "slice 3 of image 1 does not agree with the others: the mean of its body is +"},
    {contrast, 4, "slice 3 of image 1 does not agree with the others: its noise is "},
    {dead, 3, "slice 3 of image 1 left out: it is empty"},
    {without_a_value, 3, "slice 3 of image 1 left out: it is empty"},
};

/* one slice of four that is unlike the others is named, and every interval of a pooled mean holds the truth */
START_TEST(slices_that_do_not_agree)
{
    tg_error e = {0};
    tg_phantom phantom = parse(rods);
    tg_image stack = {0};
    tg_target t;
    tg_results all = {0};
    const size_t n = 160 * 160;
    for (size_t k = 0; k < 4; k++) {
        const Picture p = {
            .pixels = 160, .step_mm = 1.5, .fwhm_px = 2, .sd = 10, .noise_fwhm_px = 2, .magnify = 1, .seed = 40 + k};
        tg_image one;
        picture(&phantom, &p, &one);
        tg_grid grid = one.grid;
        grid.n[2] = 4;
        grid.first_mm[2] = -1.5;
        grid.step_mm[2] = 1;
        if (!k) CK_OK(tg_image_create(&grid, TG_HU, &stack, &e));
        memcpy(stack.v + k * n, one.v, n * sizeof *one.v);
        tg_image_free(&one);
    }
    stacks[_i].spoil(stack.v + 2 * n, n);
    CK_OK(tg_target_create(&stack, 1, &phantom, NULL, &t, &e));
    ck_assert_str_eq(t.lost, "");
    ck_assert_uint_eq(t.n, stacks[_i].pooled);
    ck_assert_uint_eq(e.count, stacks[_i].warning ? 1U : 0U);
    if (stacks[_i].warning) ck_assert_msg(strstr(e.message[0].what, stacks[_i].warning), "'%s'", e.message[0].what);
    CK_OK(tg_measure_find("ct-number")->run(&t, 0, TG_BY_ANY, &all, &e));
    CK_OK(tg_measure_find("uniformity")->run(&t, 0, TG_BY_ANY, &all, &e));
    CK_NEAR(all.result[0].value, 0, 0, 1.5 * all.result[0].uncertainty, "water");
    /* without an offset of a slice nothing widens the interval: 10 HU, 16 independent pixels at least, four slices */
    if (stacks[_i].spoil != offset) ck_assert_double_lt(all.result[0].uncertainty, 2.5 * 10 / sqrt(16 * 3));
    /* an offset of a whole slice leaves no trace in a difference */
    ck_assert_double_lt(all.result[1].uncertainty, 2.5 * 10 * sqrt(2. / (16 * 3)));
    tg_results_free(&all);
    tg_target_free(&t);
    tg_image_free(&stack);
    tg_phantom_free(&phantom);
}
END_TEST

Suite *suite_target(void);
Suite *suite_target(void)
{
    SUITE_BEGIN("target", 120);
    tcase_add_loop_test(tcase, finds, 0, sizeof rows / sizeof *rows);
    tcase_add_loop_test(tcase, is_lost, 0, sizeof losses / sizeof *losses);
    tcase_add_test(tcase, is_lost_in_nothing);
    tcase_add_test(tcase, finds_a_body_larger_than_the_field);
    tcase_add_test(tcase, labels);
    tcase_add_test(tcase, pools_slices);
    tcase_add_loop_test(tcase, slices_that_do_not_agree, 0, sizeof stacks / sizeof *stacks);
    return suite;
}
