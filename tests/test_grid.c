/* Grids, scans, sinograms, images, regions, memory and messages. */
#include "io/grid.h"
#include "io/image.h"
#include "io/memory.h"
#include "io/region.h"
#include "io/sinogram.h"
#include "tests/near.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define EXACT 1e-15

/* A field of 512 pixels over 250 mm: pixels of 250/512 mm whose outer edges are the field's. */
START_TEST(square)
{
    static const double centre[2] = {10, -20};
    const tg_grid g = tg_grid_square(512, 250, centre);
    for (int a = 0; a < 2; a++) {
        const double edge = tg_grid_mm(&g, a, -0.5), other = tg_grid_mm(&g, a, 511.5);
        CK_NEAR(edge, centre[a] - 125, EXACT, 0, "lower edge of the field");
        CK_NEAR(other, centre[a] + 125, EXACT, 0, "upper edge of the field");
        CK_NEAR(tg_grid_mm(&g, a, 255.5), centre[a], EXACT, 0, "middle of the field");
        CK_NEAR(tg_grid_index(&g, a, tg_grid_mm(&g, a, 3.25)), 3.25, 1e-13, 0, "there and back");
    }
    ck_assert_uint_eq(tg_grid_slice(&g), 512 * 512);
    ck_assert_uint_eq(tg_grid_samples(&g), 512 * 512);
}
END_TEST

static tg_scan scan_of(tg_geometry geometry)
{
    const bool fan = geometry != TG_PARALLEL;
    return (tg_scan){.geometry = geometry,
                     .source_axis_mm = fan ? 500 : 0,
                     .source_detector_mm = fan ? 900 : 0,
                     .channels = 101,
                     .views = 1,
                     .rows = 1,
                     .channel_step = geometry == TG_FAN_EQUIANGULAR ? 0.002 : 1.5,
                     .channel_zero = 40.25};
}

/* The drawing of scan.h, twice: the ray of a channel, and the channel under which its points are seen. */
START_TEST(rays)
{
    const tg_scan scan = scan_of((tg_geometry)_i);
    for (int k = 0; k < 60; k++) {
        const double beta = 0.7 * k - 11, channel = 1.7 * k;
        const double coordinate = (channel - 40.25) * scan.channel_step;
        double p[2], d[2];
        tg_scan_ray(&scan, beta, channel, p, d);
        CK_NEAR(hypot(d[0], d[1]), 1, EXACT, 0, "a unit direction");
        for (int along = -1; along <= 3; along++) {
            const double x = p[0] + 300 * along * d[0], y = p[1] + 300 * along * d[1];
            const double t = x * cos(beta) + y * sin(beta), l = -x * sin(beta) + y * cos(beta);
            if (scan.geometry == TG_PARALLEL) {
                CK_NEAR(t, coordinate, 1e-13, 1e-12, "x cos(theta) + y sin(theta) = s");
                continue;
            }
            if (!along) { /* the source */
                CK_NEAR(t, 0, 0, 1e-12, "source above the axis");
                CK_NEAR(l, 500, 1e-14, 0, "source at R");
                continue;
            }
            const double gamma = atan(t / (500 - l)); /* atan2(t, R - l) in front of the source */
            const double want = scan.geometry == TG_FAN_EQUIANGULAR ? coordinate : atan(coordinate / 900);
            CK_NEAR(gamma, want, 1e-12, 1e-12, "gamma = atan2(t, R - l)");
            /* the same ray as a parallel one */
            CK_NEAR(x * cos(beta + gamma) + y * sin(beta + gamma), 500 * sin(gamma), 1e-12, 1e-10, "s = R sin(gamma)");
        }
        CK_NEAR(-sin(beta) * d[0] + cos(beta) * d[1] < 0, 1, 0, 0, "away from the source");
    }
}
END_TEST

START_TEST(pitch)
{
    static const double want[] = {1.5, 0.002 * 500, 1.5 * 500 / 900};
    const tg_scan scan = scan_of((tg_geometry)_i);
    CK_NEAR(tg_scan_pitch_mm(&scan), want[_i], EXACT, 0, "distance of rays at the axis");
    /* the field is what the shorter side sees: 40.25 channels */
    const double reach = 40.25 * scan.channel_step;
    const double radius[] = {reach, 500 * sin(reach), 500 * reach / hypot(reach, 900)};
    CK_NEAR(tg_scan_field_radius_mm(&scan), radius[_i], 1e-14, 0, "R sin(gamma) of the shorter side");
    tg_scan off = scan;
    off.channel_zero = -1;
    ck_assert_double_eq(tg_scan_field_radius_mm(&off), 0); /* the axis is off the detector */
    off.channel_zero = 101;
    ck_assert_double_eq(tg_scan_field_radius_mm(&off), 0);
}
END_TEST

START_TEST(sinograms)
{
    tg_error e = {0};
    double angles[3] = {1, 2, 3};
    tg_scan scan = scan_of(TG_PARALLEL), copy;
    tg_sinogram s;
    scan.views = 3;
    scan.angle_rad = angles;
    CK_OK(tg_sinogram_create(&scan, &s, &e));
    ck_assert_ptr_ne(s.scan.angle_rad, angles);
    ck_assert_mem_eq(s.scan.angle_rad, angles, sizeof angles);
    ck_assert(isnan(s.facts.tube_kv.v) && !s.facts.phantom.v); /* nothing is known */
    for (size_t i = 0; i < 303; i++)
        ck_assert(s.v[i] == 0);
    tg_sinogram_free(&s);
    tg_sinogram_free(&s);
    scan.angle_rad = NULL; /* not known yet */
    CK_OK(tg_scan_copy(&scan, &copy, &e));
    ck_assert_ptr_null(copy.angle_rad);
    scan.rows = SIZE_MAX / 4;
    ck_assert_int_eq(tg_sinogram_create(&scan, &s, &e), TG_MACHINE);
    ck_assert_ptr_null(s.v);
    ck_assert_uint_eq(e.count, 1);
    tg_grid g = {{SIZE_MAX / 2, 3, 1}, {1, 1, 1}, {0, 0, 0}};
    tg_image image;
    ck_assert_int_eq(tg_image_create(&g, TG_HU, &image, &e), TG_MACHINE);
    ck_assert_ptr_null(image.v);
    ck_assert_str_eq(tg_unit_text(TG_HU), "HU");
    ck_assert_str_eq(tg_unit_text(TG_PER_MM), "1/mm");
}
END_TEST

START_TEST(facts)
{
    tg_error e = {0};
    tg_facts a = {0}, b;
    CK_OK(tg_fields_default(tg_fact_fields, &a, &e));
    a.tube_kv = (tg_number){120, 1};
    a.phantom.v = tg_copy_text("discs");
    CK_OK(tg_facts_copy(&a, &b, &e));
    ck_assert(b.tube_kv.v == 120 && b.phantom.v != a.phantom.v && !b.scanner.v);
    ck_assert_str_eq(b.phantom.v, "discs");
    tg_fields_free(tg_fact_fields, &a);
    tg_fields_free(tg_fact_fields, &b);
}
END_TEST

static const tg_region regions[] = {
    {.outline = TG_DISC, .centre_mm = {3, -2}, .outer_mm = 6},
    {.outline = TG_RING, .centre_mm = {-3, 2}, .inner_mm = 5, .outer_mm = 9},
    {.outline = TG_BOX, .centre_mm = {1, 1}, .half_mm = {7, 2}, .turn_rad = 0.5},
    {.outline = TG_BOX, .centre_mm = {1, 1}, .half_mm = {2, 7}, .turn_rad = -1.2},
    {.outline = TG_DISC, .centre_mm = {18, 0}, .outer_mm = 5},  /* partly off the grid */
    {.outline = TG_DISC, .centre_mm = {0, 500}, .outer_mm = 5}, /* wholly */
    {.outline = TG_BOX, .centre_mm = {-19, -19}, .half_mm = {3, 1}, .turn_rad = 0.7},
};

/* The area of pixels is that of the shape, and no pixel of the region lies outside its bounds. */
START_TEST(region)
{
    static const double areas[] = {36 * M_PI, 56 * M_PI, 56, 56};
    static const double rims[] = {12 * M_PI, 28 * M_PI, 36, 36};
    static const double centre[2] = {0, 0};
    const tg_region *r = &regions[_i];
    const tg_grid g = tg_grid_square(400, 40, centre);
    size_t x0, x1, y0, y1, n = 0;
    const bool inside = tg_region_bounds(r, &g, &x0, &x1, &y0, &y1);
    ck_assert_int_eq(inside, _i < 4);
    ck_assert(x0 <= x1 && x1 <= 400 && y0 <= y1 && y1 <= 400);
    for (size_t i = 0; i < tg_grid_samples(&g); i++) {
        const size_t x = i % 400, y = i / 400;
        if (!tg_region_holds(r, tg_grid_mm(&g, 0, (double)x), tg_grid_mm(&g, 1, (double)y))) continue;
        n++;
        ck_assert_msg(x >= x0 && x < x1 && y >= y0 && y < y1, "pixel %zu %zu outside the bounds", x, y);
    }
    /* each of the L / step pixels on a rim errs by up to half, evenly: SD sqrt(1 / 12); allowed are 2, seven SD */
    if (inside) CK_NEAR((double)n * 0.01, areas[_i], 0, 2 * sqrt(rims[_i] / 0.1) * 0.01, "area of the shape");
}
END_TEST

START_TEST(memory)
{
    size_t n;
    ck_assert(tg_multiply(3, 4, &n) && n == 12);
    ck_assert(tg_multiply(SIZE_MAX, 1, &n) && tg_multiply(0, SIZE_MAX, &n) && n == 0);
    ck_assert(!tg_multiply(SIZE_MAX / 2 + 1, 2, &n));
    ck_assert_ptr_null(tg_alloc(SIZE_MAX, 2));
    ck_assert_ptr_null(tg_alloc(SIZE_MAX - 70, 1));
    ck_assert_ptr_null(tg_alloc(PTRDIFF_MAX, 1));
    for (size_t bytes = 0; bytes < 200; bytes++) {
        unsigned char *p = tg_alloc(bytes, 1);
        ck_assert_ptr_nonnull(p);
        ck_assert_uint_eq((uintptr_t)p % TG_ALIGN, 0);
        for (size_t i = 0; i < bytes; i++)
            ck_assert_uint_eq(p[i], 0);
        tg_free(p);
    }
    tg_free(NULL);
    ck_assert_ptr_null(tg_copy_text(NULL));
    char *copy = tg_copy_text("text");
    ck_assert_str_eq(copy, "text");
    tg_free(copy);
    size_t *items = NULL;
    n = 0;
    for (size_t i = 0; i < 100; i++) {
        size_t *item = tg_append(&items, &n, sizeof *item);
        ck_assert(item && item == &items[i] && *item == 0 && n == i + 1);
        *item = i * i;
    }
    for (size_t i = 0; i < 100; i++)
        ck_assert_uint_eq(items[i], i * i);
    tg_free(items);
}
END_TEST

START_TEST(messages)
{
    tg_error e = {0};
    ck_assert_int_eq(tg_fail(NULL, TG_INPUT, "a", 1, "nobody listens"), TG_INPUT);
    tg_warn(NULL, "a", 1, "nobody listens");
    tg_warn(&e, "a.yaml", 3, "%d %s", 7, "rods");
    ck_assert(e.code == TG_OK && e.count == 1 && e.message[0].warning && e.message[0].line == 3);
    ck_assert_str_eq(e.message[0].what, "7 rods");
    ck_assert_int_eq(tg_fail(&e, TG_MACHINE, NULL, 0, "first"), TG_MACHINE);
    ck_assert_int_eq(tg_fail(&e, TG_INPUT, NULL, 0, "second"), TG_INPUT);
    ck_assert_int_eq(e.code, TG_MACHINE); /* the first failure's */
    ck_assert_str_eq(e.message[1].file, "");
    char text[2000];
    memset(text, 'x', sizeof text - 1);
    text[sizeof text - 1] = '\0';
    for (int i = 0; i < 2 * TG_MESSAGES; i++)
        tg_fail(&e, TG_INPUT, text, 0, "%s", text);
    ck_assert_uint_eq(e.count, 3 + 2 * TG_MESSAGES); /* counted, not kept */
    ck_assert_uint_eq(strlen(e.message[TG_MESSAGES - 1].what), sizeof e.message[0].what - 1);
    ck_assert_int_eq(tg_no_memory(&e, 2, 3), TG_MACHINE);
}
END_TEST

Suite *suite_grid(void);
Suite *suite_grid(void)
{
    SUITE_BEGIN("grid", 10);
    tcase_add_test(tcase, square);
    tcase_add_loop_test(tcase, rays, 0, 3);
    tcase_add_loop_test(tcase, pitch, 0, 3);
    tcase_add_test(tcase, sinograms);
    tcase_add_test(tcase, facts);
    tcase_add_loop_test(tcase, region, 0, sizeof regions / sizeof *regions);
    tcase_add_test(tcase, memory);
    tcase_add_test(tcase, messages);
    return suite;
}
