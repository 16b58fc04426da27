/* Paths through solids that displace each other, and what phantom descriptions may say. */
#include "io/embedded.h"
#include "phantoms/phantom.h"
#include "phantoms/random.h"
#include "phantoms/scanner.h"
#include "tests/near.h"

#include <stdlib.h>
#include <string.h>

static tg_phantom parse(const char *text)
{
    tg_error e = {0};
    tg_phantom p = {0};
    CK_OK(tg_phantom_parse(text, strlen(text), "p.yaml", &p, &e));
    return p;
}

#define MATERIALS "phantom: p\nmaterials: [{name: a, mu: 0.1}, {name: b, mu: 0.2}, {name: c, mu: 0.3}]\nsolids:\n"
static const double x_axis[3] = {1, 0, 0};

/** Path lengths of the ray along x at y and z in three materials. */
#define PATHS(p, y, z, a, b, c, what) \
    do { \
        double mm_[3]; \
        tg_phantom_paths(&(p), (const double[3]){-500, (y), (z)}, x_axis, mm_); \
        CK_NEAR(mm_[0], (a), 0, 1e-11, what " (closed form), material a"); \
        CK_NEAR(mm_[1], (b), 0, 1e-11, what " (closed form), material b"); \
        CK_NEAR(mm_[2], (c), 0, 1e-11, what " (closed form), material c"); \
    } while (0)

START_TEST(later_displaces_earlier)
{
    tg_phantom p =
        parse(MATERIALS "  - {name: body, shape: sphere, material: a, radius: 50}\n"
                        "  - {name: left, shape: cylinder, material: b, centre: [-10, 0, 0], radius: 12, length: 200}\n"
                        "  - {name: right, shape: cylinder, material: c, centre: [10, 0, 0], radius: 12, length: 200}\n"
                        "  - {name: plug, shape: box, material: a, centre: [-10, 0, 0], size: [4, 4, 4]}\n");
    PATHS(p, 0, 0, 100 - 44 + 4, 20 - 4, 24, "overlapping rods with a plug");
    PATHS(p, 0, 60, 0, 20, 24, "rods alone, above the body");
    PATHS(p, 20, 0, 2 * sqrt(2100), 0, 0, "beside the rods");
    PATHS(p, 55, 0, 0, 0, 0, "past everything");
    /* at y = 8 the rods' half chords are sqrt(80); a gap of 2.1 mm is left between them */
    const double h = sqrt(80);
    PATHS(p, 8, 0, 2 * sqrt(2500 - 64) - 4 * h, 2 * h, 2 * h, "off the middle");
    ck_assert_int_eq(tg_phantom_solid_at(&p, (const double[3]){0, 0, 0}), 2);
    ck_assert_int_eq(tg_phantom_solid_at(&p, (const double[3]){-10, 1, 1}), 3);
    ck_assert_int_eq(tg_phantom_solid_at(&p, (const double[3]){-10, 3, 1}), 1);
    ck_assert_int_eq(tg_phantom_solid_at(&p, (const double[3]){0, 40, 0}), 0);
    ck_assert_int_eq(tg_phantom_solid_at(&p, (const double[3]){0, 51, 0}), TG_NO_SOLID);
    ck_assert_int_eq(tg_phantom_find(&p, "right"), 2);
    ck_assert_int_eq(tg_phantom_find(&p, "wrong"), TG_NO_SOLID);
    tg_phantom_free(&p);
}
END_TEST

START_TEST(whole_and_hidden)
{
    tg_phantom p = parse(MATERIALS "  - {name: core, shape: sphere, material: b, radius: 5}\n"
                                   "  - {name: half, shape: box, material: c, centre: [-5, 0, 0], size: [10, 8, 8]}\n"
                                   "  - {name: other, shape: box, material: c, centre: [5, 0, 0], size: [10, 8, 8]}\n");
    PATHS(p, 0, 0, 0, 0, 20, "two halves hide the core"); /* nothing is left between faces that touch */
    tg_phantom_free(&p);
}
END_TEST

static int rising(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* The slow twin: all ends of all solids in order, and who fills the middle of each piece. */
static void slow_paths(const tg_phantom *p, const double point[3], const double direction[3], double *mm)
{
    double end[2 * TG_MOST_SOLIDS];
    size_t n = 0;
    for (size_t m = 0; m < p->n_materials; m++)
        mm[m] = 0;
    for (size_t i = 0; i < p->n_solids; i++)
        if (tg_solid_interval(&p->solid[i], point, direction, &end[n])) n += 2;
    qsort(end, n, sizeof *end, rising);
    for (size_t k = 1; k < n; k++) {
        double middle[3];
        for (int i = 0; i < 3; i++)
            middle[i] = point[i] + (end[k - 1] + end[k]) / 2 * direction[i];
        const int at = tg_phantom_solid_at(p, middle);
        if (at != TG_NO_SOLID) mm[p->solid[at].material] += end[k] - end[k - 1];
    }
}

START_TEST(paths_as_the_slow_twin)
{
    enum { SOLIDS = 40, MATERIALS_ = 3, RAYS = 3000 };
    tg_solid solid[SOLIDS] = {{.line = 0}};
    tg_material material[MATERIALS_] = {{.n = 0}};
    const tg_phantom p = {.solid = solid, .material = material, .n_solids = SOLIDS, .n_materials = MATERIALS_};
    tg_random r = tg_random_stream(11, 0, 0);
    for (int i = 0; i < SOLIDS; i++) {
        tg_solid *s = &solid[i];
        double axis[3];
        s->shape = (tg_shape)(i % 7);
        s->material = (size_t)i % MATERIALS_;
        for (int k = 0; k < 3; k++) {
            axis[k] = tg_random_normal(&r);
            s->centre_mm[k] = 20 * tg_random_normal(&r);
            s->half_mm[k] = 5 + 20 * tg_random_uniform(&r);
        }
        if (s->shape == TG_SPHERE) s->half_mm[0] = s->half_mm[1] = s->half_mm[2];
        if (s->shape == TG_CYLINDER || s->shape == TG_CONE) s->half_mm[1] = s->half_mm[0];
        s->taper = 2 * tg_random_uniform(&r);
        tg_solid_turn(s, axis, 6 * tg_random_uniform(&r));
    }
    double longest = 0;
    for (int ray = 0; ray < RAYS; ray++) {
        double point[3], direction[3], got[MATERIALS_], want[MATERIALS_];
        for (int k = 0; k < 3; k++) {
            point[k] = 25 * tg_random_normal(&r);
            direction[k] = tg_random_normal(&r);
        }
        const double n = sqrt(direction[0] * direction[0] + direction[1] * direction[1] + direction[2] * direction[2]);
        for (int k = 0; k < 3; k++)
            direction[k] /= n;
        tg_phantom_paths(&p, point, direction, got);
        slow_paths(&p, point, direction, want);
        for (int m = 0; m < MATERIALS_; m++) {
            CK_NEAR(got[m], want[m], 0, 1e-10, "sweep piece by piece"); /* 80 ends of 1e-13 mm each at most */
            longest = fmax(longest, got[m]);
        }
    }
    ck_assert(longest > 50); /* the rays do meet something */
}
END_TEST

START_TEST(description)
{
    tg_phantom p =
        parse("phantom: test piece\n"
              "materials:\n"
              "  - {name: water, compound: \"Water, Liquid\"}\n"
              "  - {name: ptfe, formula: C2F4, density: 2.16}\n"
              "  - {name: plain, mu: 0.02}\n"
              "  - {name: bone, hu: 900}\n"
              "solids:\n"
              "  - {name: body, shape: cylinder, material: water, radius: 100, length: 60}\n"
              "  - {name: cone, shape: cone, material: bone, centre: [1, 2, 3], radius: 4, top-radius: 1, length: 8}\n"
              "  - {name: box, shape: box, material: plain, size: [2, 4, 6], axis: [1, 0, 0], turn: 90}\n"
              "  - {name: egg, shape: ellipsoid, material: ptfe, size: [20, 40, 60]}\n");
    ck_assert_str_eq(p.name.v, "test piece");
    ck_assert_str_eq(p.path, "p.yaml");
    ck_assert_uint_eq(p.n_solids, 4);
    ck_assert_uint_eq(p.n_materials, 4);
    const tg_solid *s = p.solid;
    CK_NEAR(s[0].half_mm[0], 100, 0, 0, "radius");
    CK_NEAR(s[0].half_mm[1], 100, 0, 0, "radius");
    CK_NEAR(s[0].half_mm[2], 30, 0, 0, "half of the full length");
    CK_NEAR(s[1].centre_mm[2], 3, 0, 0, "centre");
    CK_NEAR(s[1].taper, 0.25, 0, 0, "top radius over radius");
    CK_NEAR(s[2].half_mm[1], 2, 0, 0, "half of the full size");
    CK_NEAR(s[2].turn[2][0], 1, 0, 1e-15, "own z along the world x");
    CK_NEAR(s[3].half_mm[2], 30, 0, 0, "half of the full size");
    ck_assert_uint_eq(s[3].material, 1);
    ck_assert_int_eq(s[3].line, 11);
    double mu[4], water;
    tg_error e = {0};
    CK_OK(tg_phantom_mu(&p, 70, mu, &e));
    CK_OK(tg_water_mu(70, &water, &e));
    CK_NEAR(mu[0], water, 0, 0, "water is water");
    CK_NEAR(mu[2], 0.02, 0, 0, "plain mu");
    CK_NEAR(mu[3], 1.9 * water, 1e-15, 0, "definition of CT numbers");
    tg_phantom_free(&p);
    tg_phantom_free(&p); /* harmless */
}
END_TEST

#define BODY "phantom: p\nmaterials:\n  - {name: water, mu: 0.02}\nsolids:\n  - "

START_TEST(refusals)
{
    static const struct {
        const char *text;
        int line; /* of the message that says `what` */
        const char *what;
    } bad[] = {
        {BODY "{name: s, shape: sphere, material: water, radius: 5, length: 3}", 5,
         "length: means nothing for shape sphere"},
        {BODY "{name: s, shape: box, material: water, radius: 5}", 5, "size is missing: shape box takes size"},
        {BODY "{name: s, shape: cone, material: water, radius: 5}", 5, "takes radius, top-radius and length"},
        {BODY "{name: s, shape: sphere, material: watr, radius: 5}", 5, "did you mean 'water'"},
        {BODY "{name: s, shape: sphere, material: brass-like, radius: 5}", 5, "describe it there"},
        {BODY "{name: s, shape: sphere, material: water, radius: 5, axis: [0, 0, 0]}", 5, "has no direction"},
        {BODY "{name: s, shape: sphere, material: water, radius: 5}\n  - {name: s, shape: sphere, material: water, "
              "radius: 4}",
         6, "taken by another solid"},
        {BODY "{name: s, shape: sphere, material: water, radius: 0}", 5, "radius"},
        {BODY "{name: s, shape: ball, material: water, radius: 1}", 5, "shape"},
        {"phantom: p\nmaterials: [{name: a, mu: 1, hu: 3}]\nsolids: [{name: s, shape: sphere, material: a, radius: 1}]",
         2, "exactly one of"},
        {"phantom: p\nmaterials: [{name: a}]\nsolids: [{name: s, shape: sphere, material: a, radius: 1}]", 2,
         "exactly one of"},
        {"phantom: p\nmaterials: [{name: a, formula: C}]\nsolids: [{name: s, shape: sphere, material: a, radius: 1}]",
         2, "density is missing"},
        {"phantom: p\nmaterials: [{name: a, hu: 4, density: 1}]\nsolids: [{name: s, shape: sphere, material: a, "
         "radius: 1}]",
         2, "leave it out"},
        {"phantom: p\nmaterials: [{name: a, formula: C2Q, density: 1}]\nsolids: [{name: s, shape: sphere, material: a, "
         "radius: 1}]",
         2, "cannot be read from Q"},
        {"phantom: p\nmaterials: [{name: a, hu: 4}, {name: a, hu: 5}]\nsolids: [{name: s, shape: sphere, material: a, "
         "radius: 1}]",
         2, "taken by another material"},
        {"phantom: p\nmaterials: []\nsolids: []", 2, "materials"},
    };
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        tg_error e = {0};
        tg_phantom p = {0};
        ck_assert_msg(tg_phantom_parse(bad[i].text, strlen(bad[i].text), "p.yaml", &p, &e) == TG_INPUT, "taken: %s",
                      bad[i].text);
        bool said = false;
        for (size_t k = 0; k < e.count && k < TG_MESSAGES; k++)
            said |= e.message[k].line == bad[i].line && strstr(e.message[k].what, bad[i].what);
        ck_assert_msg(said, "wanted '%s' on line %d, got '%s' on line %d", bad[i].what, bad[i].line, e.message[0].what,
                      e.message[0].line);
        ck_assert_ptr_null(p.solid);
    }
    /* all errors of a description are told, not the first */
    tg_error e = {0};
    tg_phantom p = {0};
    const char *text = BODY
        "{name: s, shape: sphere, material: lead, length: 5}\n  - {name: s, shape: box, material: water, radius: 1}";
    ck_assert_int_eq(tg_phantom_parse(text, strlen(text), "p.yaml", &p, &e), TG_INPUT);
    ck_assert_uint_eq(e.count, 6); /* material, length, radius; name, radius, size */
}
END_TEST

static tg_scanner scanner(const char *text)
{
    tg_error e = {0};
    tg_scanner s = {0};
    CK_OK(tg_scanner_parse(text, strlen(text), "s.yaml", &s, &e));
    return s;
}

START_TEST(scanner_description)
{
    const double radian = acos(-1) / 180;
    tg_scanner s = scanner("scanner: plain\ngeometry: parallel\nchannels: 101\npitch: 0.5\nviews: 360\n");
    ck_assert_int_eq(s.scan.geometry, TG_PARALLEL);
    CK_NEAR(s.scan.channel_zero, 50, 0, 0, "the middle of the array");
    CK_NEAR(s.scan.channel_step, 0.5, 0, 0, "pitch");
    CK_NEAR(s.scan.angle_rad[90], 90 * radian, 1e-15, 0, "full turn, counter-clockwise");
    ck_assert_uint_eq(s.scan.rows, 1);
    CK_NEAR(s.scan.row_zero, 0, 0, 0, "one slice at z = 0");
    CK_NEAR(s.aperture, 1, 0, 0, "default");
    ck_assert_int_eq(s.subrays, 5);
    ck_assert(!s.average_lines && isnan(s.photons_per_ray));
    CK_NEAR(s.energy_kev, 70, 0, 0, "default");
    tg_scanner_free(&s);

    s = scanner(
        "scanner: fan\ngeometry: fan-equiangular\nsource-axis: 500\nsource-detector: 900\nchannels: 100\npitch: 0.1\n"
        "axis-channel: 50.25\nviews: 100\narc: 200\nstart: 17\ndirection: clockwise\naverage: line-integrals\n"
        "photons: 1e5\nseed: 12\nslices: 4\nslice-pitch: 2.5\naperture: 0\n");
    ck_assert_int_eq(s.scan.geometry, TG_FAN_EQUIANGULAR);
    CK_NEAR(s.scan.channel_step, 0.1 * radian, 1e-15, 0, "pitch in degrees");
    CK_NEAR(s.scan.channel_zero, 49.25, 0, 0, "1-based in the file");
    CK_NEAR(s.scan.angle_rad[10], (17 - 20) * radian, 1e-14, 0, "clockwise");
    CK_NEAR(s.scan.row_zero, 1.5, 0, 0, "the middle of the stack at z = 0");
    CK_NEAR(s.scan.source_detector_mm, 900, 0, 0, "distance");
    ck_assert(s.average_lines);
    CK_NEAR(s.photons_per_ray, 1e5, 0, 0, "photons");
    tg_scanner_free(&s);
}
END_TEST

START_TEST(scanner_refusals)
{
#define COMMON "scanner: s\nchannels: 100\nviews: 10\n"
    static const struct {
        const char *text, *what;
        int line;
    } bad[] = {
        {COMMON "pitch: 1\ngeometry: fan-equispaced\nsource-axis: 500\n", "source-detector is missing", 5},
        {COMMON "pitch: 1\ngeometry: parallel\nsource-axis: 500\n", "means nothing for parallel", 6},
        {COMMON "pitch: 1\ngeometry: fan-equispaced\nsource-axis: 500\nsource-detector: 400\n", "before the axis", 7},
        {COMMON "pitch: 2\ngeometry: fan-equiangular\nsource-axis: 500\nsource-detector: 900\n",
         "fan opens to 100 degrees", 4},
        {COMMON "pitch: 1\ngeometry: cone\n", "geometry", 5},
        {COMMON "pitch: -1\ngeometry: parallel\n", "pitch", 4},
        {COMMON "pitch: 1\ngeometry: parallel\nsubray: 4\n", "subray", 6},
        {COMMON "geometry: parallel\n", "pitch is missing", 1},
    };
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        tg_error e = {0};
        tg_scanner s = {0};
        ck_assert_int_eq(tg_scanner_parse(bad[i].text, strlen(bad[i].text), "s.yaml", &s, &e), TG_INPUT);
        ck_assert_msg(strstr(e.message[0].what, bad[i].what) && e.message[0].line == bad[i].line,
                      "wanted '%s' on line %d, got '%s' on line %d", bad[i].what, bad[i].line, e.message[0].what,
                      e.message[0].line);
    }
}
END_TEST

static bool starts(const char *text, const char *with)
{
    return !strncmp(text, with, strlen(with));
}

START_TEST(our_own_descriptions)
{
    int phantoms = 0, scanners = 0;
    for (const tg_embedded *f = tg_embedded_files; f->name; f++) {
        tg_error e = {0};
        if (!strstr(f->name, ".yaml") || starts(f->name, "spec-") || starts(f->name, "demo-")) continue;
        if (starts(f->name, "scanner-")) {
            tg_scanner s;
            CK_OK(tg_scanner_parse((const char *)f->bytes, f->n, f->name, &s, &e));
            ck_assert(tg_scan_field_radius_mm(&s.scan) > 110); /* every phantom fits, with air around it */
            tg_scanner_free(&s);
            scanners++;
        } else {
            tg_phantom p;
            CK_OK(tg_phantom_parse((const char *)f->bytes, f->n, f->name, &p, &e));
            tg_phantom_free(&p);
            phantoms++;
        }
        ck_assert_uint_eq(e.count, 0);
    }
    ck_assert_int_ge(phantoms, 7);
    ck_assert_int_ge(scanners, 3);
}
END_TEST

START_TEST(rods_keep_apart)
{
    tg_phantom p = parse(tg_embedded_text("rods-disc.yaml"));
    /* regions of the body by IEC 61223-3-5: a tenth of its width, in the middle and 10 mm inside the rim; spreads are
     * below 1.5 mm wide, and three of them is the distance asked */
    const double region[5][3] = {{0, 0, 10}, {80, 0, 10}, {0, 80, 10}, {-80, 0, 10}, {0, -80, 10}}, apart = 3 * 1.5;
    ck_assert_uint_eq(p.n_solids, 9);
    for (size_t i = 1; i < p.n_solids; i++) {
        const tg_solid *a = &p.solid[i];
        ck_assert(a->half_mm[0] >= 8);
        for (size_t j = 1; j < i; j++) {
            const tg_solid *b = &p.solid[j];
            const double d = hypot(a->centre_mm[0] - b->centre_mm[0], a->centre_mm[1] - b->centre_mm[1]);
            ck_assert_msg(d - a->half_mm[0] - b->half_mm[0] > apart, "%s and %s", a->name.v, b->name.v);
        }
        for (int k = 0; k < 5; k++) {
            const double d = hypot(a->centre_mm[0] - region[k][0], a->centre_mm[1] - region[k][1]);
            ck_assert_msg(d - a->half_mm[0] - region[k][2] > apart, "%s and region %d", a->name.v, k);
        }
    }
    tg_phantom_free(&p);
}
END_TEST

START_TEST(files)
{
    tg_error e = {0};
    tg_phantom p = {0};
    tg_scanner s = {0};
    ck_assert_int_eq(tg_phantom_read("no/such.yaml", &p, &e), TG_INPUT);
    ck_assert_int_eq(tg_scanner_read("no/such.yaml", &s, &e), TG_INPUT);
    ck_assert_uint_eq(e.count, 2);
    e = (tg_error){0};
    CK_OK(tg_phantom_read("phantoms/water-disc.yaml", &p, &e));
    CK_OK(tg_scanner_read("phantoms/scanner-parallel.yaml", &s, &e));
    ck_assert_str_eq(p.path, "phantoms/water-disc.yaml");
    tg_phantom_free(&p);
    tg_scanner_free(&s);
}
END_TEST

Suite *suite_phantom(void);
Suite *suite_phantom(void)
{
    SUITE_BEGIN("phantom", 20);
    tcase_add_test(tcase, later_displaces_earlier);
    tcase_add_test(tcase, whole_and_hidden);
    tcase_add_test(tcase, paths_as_the_slow_twin);
    tcase_add_test(tcase, description);
    tcase_add_test(tcase, refusals);
    tcase_add_test(tcase, scanner_description);
    tcase_add_test(tcase, scanner_refusals);
    tcase_add_test(tcase, our_own_descriptions);
    tcase_add_test(tcase, rods_keep_apart);
    tcase_add_test(tcase, files);
    return suite;
}
