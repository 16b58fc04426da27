#include "recon/reconstruct.h"

#include "io/memory.h"
#include "tests/near.h"

#include <omp.h>
#include <string.h>

/* ---- a scan of a disc in closed form ---- */

typedef struct {
    double x_mm, y_mm, radius_mm, mu_per_mm;
} disc;

static double chord_mm(const disc *d, const double point_mm[2], const double direction[2])
{
    const double off = (d->x_mm - point_mm[0]) * direction[1] - (d->y_mm - point_mm[1]) * direction[0];
    return off * off < d->radius_mm * d->radius_mm ? 2 * sqrt(d->radius_mm * d->radius_mm - off * off) : 0;
}

/* Line integrals averaged over the width of a channel. */
static void scan_disc(const disc *d, tg_sinogram *s)
{
    enum { SUBRAYS = 16 };
    const tg_scan *scan = &s->scan;
    for (size_t view = 0; view < scan->views; view++)
        for (size_t channel = 0; channel < scan->channels; channel++) {
            double sum = 0, point[2], direction[2];
            for (int i = 0; i < SUBRAYS; i++) {
                tg_scan_ray(scan, scan->angle_rad[view], (double)channel + (i + 0.5) / SUBRAYS - 0.5, point, direction);
                sum += chord_mm(d, point, direction);
            }
            s->v[view * scan->channels + channel] = (float)(d->mu_per_mm * sum / SUBRAYS);
        }
}

/* A pitch of half a millimetre at the axis; angles from `start` by `turn` / views. */
static void make_scan(tg_geometry geometry, size_t channels, double channel_zero, size_t views, double start_rad,
                      double turn_rad, tg_sinogram *s)
{
    tg_error e = {0};
    tg_scan scan = {.geometry = geometry,
                    .channels = channels,
                    .views = views,
                    .rows = 1,
                    .channel_zero = channel_zero,
                    .channel_step = 0.5};
    if (geometry != TG_PARALLEL) {
        scan.source_axis_mm = 500;
        scan.source_detector_mm = 900;
        scan.channel_step *= geometry == TG_FAN_EQUIANGULAR ? 1 / 500.0 : 900 / 500.0;
    }
    CK_OK(TG_NEW(scan.angle_rad, views, &e));
    for (size_t i = 0; i < views; i++)
        scan.angle_rad[i] = start_rad + turn_rad * (double)i / (double)views;
    CK_OK(tg_sinogram_create(&scan, s, &e));
    tg_scan_free(&scan);
}

static void set(tg_recipe *r, const char *key, const char *value)
{
    tg_error e = {0};
    CK_OK(tg_field_set(tg_fields_find(tg_recipe_fields, key), r, value, NULL, 0, &e));
}

static tg_recipe make_recipe(void)
{
    tg_error e = {0};
    tg_recipe r = {0};
    CK_OK(tg_fields_default(tg_recipe_fields, &r, &e));
    return r;
}

/* ---- discs ---- */

static const struct {
    const char *what;
    tg_geometry geometry;
    double axis, start_deg, turn_deg;
} discs[] = {
    {"parallel, 180 degrees", TG_PARALLEL, 299.5, 0, 180},
    {"parallel, 360 degrees, odd start, axis off the middle", TG_PARALLEL, 311.3, 17.3, 360},
    {"parallel, reversed", TG_PARALLEL, 288.75, -200.1, -180},
    {"equiangular", TG_FAN_EQUIANGULAR, 299.5, 0, 360},
    {"equiangular, reversed, odd start, axis off the middle", TG_FAN_EQUIANGULAR, 310.25, 33.3, -360},
    {"equispaced", TG_FAN_EQUISPACED, 299.75, 0, 360},
    {"equispaced, reversed, odd start, axis off the middle", TG_FAN_EQUISPACED, 290.6, -71.9, -360},
};

/* 0.1 HU is 1e-4 of water: inside a disc of water, more than ten channels from its rim, every pixel comes out so. */
START_TEST(disc_value)
{
    const disc d = {18.3, -12.1, 100, 0.02};
    tg_error e = {0};
    tg_sinogram s;
    tg_image image = {0};
    tg_recipe r = make_recipe();
    make_scan(discs[_i].geometry, 600, discs[_i].axis, 984, discs[_i].start_deg * M_PI / 180,
              discs[_i].turn_deg * M_PI / 180, &s);
    scan_disc(&d, &s);
    set(&r, "pixels", "61");
    set(&r, "field", "240");
    CK_OK(tg_reconstruct(&s, &r, NULL, &image, &e));
    for (size_t y = 0; y < 61; y++)
        for (size_t x = 0; x < 61; x++) {
            const double x_mm = tg_grid_mm(&image.grid, 0, (double)x), y_mm = tg_grid_mm(&image.grid, 1, (double)y);
            if (hypot(x_mm - d.x_mm, y_mm - d.y_mm) < d.radius_mm - 5)
                CK_NEAR(image.v[y * 61 + x], d.mu_per_mm, 1e-4, 0, discs[_i].what);
        }
    tg_image_free(&image);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

/* ---- what holds for any image ---- */

/* A small scan with a little of everything in it. */
static void scan_blobs(tg_geometry geometry, size_t rows, tg_sinogram *s)
{
    tg_error e = {0};
    make_scan(geometry, 80, 38.2, 60, 0.3, 2 * M_PI, s);
    tg_scan stack;
    CK_OK(tg_scan_copy(&s->scan, &stack, &e));
    tg_sinogram_free(s);
    stack.rows = rows;
    stack.row_step_mm = 2;
    stack.row_zero = 0.5;
    CK_OK(tg_sinogram_create(&stack, s, &e));
    tg_scan_free(&stack);
    for (size_t i = 0; i < rows * 60 * 80; i++)
        s->v[i] = (float)(1 + sin(0.37 * (double)i) + (double)(i % 7));
}

static tg_image reconstruct(const tg_sinogram *s, const tg_recipe *r)
{
    tg_error e = {0};
    tg_image image;
    CK_OK(tg_reconstruct(s, r, NULL, &image, &e));
    return image;
}

START_TEST(same_bits)
{
    tg_sinogram s;
    tg_recipe r = make_recipe();
    scan_blobs((tg_geometry)_i, 2, &s);
    set(&r, "pixels", "70");
    const int threads = omp_get_max_threads();
    tg_image image[3];
    for (int n = 1; n <= 3; n++) {
        omp_set_num_threads(n);
        image[n - 1] = reconstruct(&s, &r);
    }
    omp_set_num_threads(threads);
    const size_t bytes = tg_grid_samples(&image[0].grid) * sizeof *image[0].v;
    ck_assert_uint_eq(image[0].grid.n[2], 2);
    for (int n = 1; n < 3; n++)
        ck_assert_msg(!memcmp(image[0].v, image[n].v, bytes), "%d threads give other bits", n + 1);
    for (int n = 0; n < 3; n++)
        tg_image_free(&image[n]);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

/* A slice of a stack is what its row alone gives, and stands at its height. */
START_TEST(stack)
{
    tg_sinogram s;
    tg_recipe r = make_recipe();
    scan_blobs(TG_FAN_EQUISPACED, 3, &s);
    set(&r, "pixels", "20");
    tg_image all = reconstruct(&s, &r);
    CK_NEAR(tg_grid_mm(&all.grid, 2, 2), 3, 1e-12, 0, "row 0.5 is z = 0, rows 2 mm apart");
    tg_sinogram last = s;
    last.scan.rows = 1;
    last.v = s.v + 2 * 60 * 80;
    tg_image one = reconstruct(&last, &r);
    ck_assert(!memcmp(all.v + 2 * 20 * 20, one.v, 20 * 20 * sizeof *one.v));
    tg_image_free(&one), tg_image_free(&all);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

/* What a recipe says of the axis and of water stands in the image, too. */
START_TEST(recipe_in_image)
{
    tg_sinogram s;
    tg_recipe r = make_recipe();
    scan_blobs(TG_PARALLEL, 1, &s);
    set(&r, "pixels", "16");
    set(&r, "field", "30");
    s.facts.seed = (tg_number){7, 1};
    tg_image plain = reconstruct(&s, &r);
    ck_assert(plain.unit == TG_PER_MM && plain.scan.channel_zero == 38.2 && plain.facts.seed.v == 7);
    ck_assert_str_eq(plain.kernel, "hann");
    ck_assert_str_eq(plain.method, "fbp");
    s.facts.mu_water_per_mm = (tg_number){0.05, 1};
    tg_image scan_water = reconstruct(&s, &r);
    set(&r, "mu-water", "0.02");
    tg_image water = reconstruct(&s, &r);
    for (size_t i = 0; i < 16 * 16; i++) {
        const double mu = plain.v[i];
        CK_NEAR(scan_water.v[i], 1000 * (mu - 0.05) / 0.05, 1e-6, 0, "definition of HU, the scan's water");
        CK_NEAR(water.v[i], 1000 * (mu - 0.02) / 0.02, 1e-6, 0, "definition of HU, the recipe's water");
    }
    ck_assert(water.unit == TG_HU && water.facts.mu_water_per_mm.v == 0.02);
    set(&r, "axis-channel", "39.2");
    tg_image same = reconstruct(&s, &r);
    ck_assert(!memcmp(water.v, same.v, 16 * 16 * sizeof *same.v)); /* channel 39.2 from 1 is 38.2 from 0 */
    set(&r, "axis-channel", "41");
    tg_image moved = reconstruct(&s, &r);
    ck_assert(moved.scan.channel_zero == 40 && memcmp(water.v, moved.v, 16 * 16 * sizeof *same.v));
    tg_image_free(&plain), tg_image_free(&scan_water), tg_image_free(&water), tg_image_free(&same);
    tg_image_free(&moved);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

/* Without a field the image shows what every view sees: twice the way to the nearer end of the detector. */
START_TEST(own_grid)
{
    tg_error e = {0};
    tg_sinogram s;
    tg_grid grid;
    tg_recipe r = make_recipe();
    scan_blobs(TG_PARALLEL, 1, &s);
    set(&r, "pixels", "100");
    set(&r, "centre", "3,-4");
    CK_OK(tg_recipe_grid(&r, &s.scan, &grid, &e));
    CK_NEAR(grid.step_mm[0] * 100, 2 * 38.2 * 0.5, 1e-12, 0, "channels 0 to 38.2 on the shorter side");
    CK_NEAR(tg_grid_mm(&grid, 0, 49.5), 3, 1e-12, 0, "centre");
    CK_NEAR(tg_grid_mm(&grid, 1, 49.5), -4, 1e-12, 0, "centre");
    set(&r, "axis-channel", "1");
    ck_assert_int_eq(tg_recipe_grid(&r, &s.scan, &grid, &e), TG_INPUT);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

static const struct {
    const char *key, *value, *says;
} wrong[] = {
    {"kernel", "han", "hann"},
    {NULL, NULL, "channel 6 of view 3, row 2 holds nan"},
};

START_TEST(refused)
{
    tg_error e = {0};
    tg_sinogram s;
    tg_image image = {0};
    tg_recipe r = make_recipe();
    scan_blobs(TG_PARALLEL, 2, &s);
    if (wrong[_i].key)
        set(&r, wrong[_i].key, wrong[_i].value);
    else
        s.v[(60 + 2) * 80 + 5] = NAN;
    ck_assert_int_eq(tg_reconstruct(&s, &r, NULL, &image, &e), TG_INPUT);
    ck_assert_msg(strstr(e.message[0].what, wrong[_i].says), "%s", e.message[0].what);
    ck_assert_ptr_null(image.v);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

static bool stop_halfway(void *context, const char *what, double done)
{
    double *last = context;
    ck_assert_str_eq(what, "back-projection");
    ck_assert(*last < 0.5 && done > *last && done <= 1); /* not called again after it said stop */
    *last = done;
    return done < 0.5;
}

START_TEST(stopped)
{
    tg_error e = {0};
    tg_sinogram s;
    tg_image image = {0};
    tg_recipe r = make_recipe();
    double last = 0;
    const tg_progress progress = {stop_halfway, &last};
    scan_blobs(TG_PARALLEL, 1, &s);
    ck_assert_int_eq(tg_reconstruct(&s, &r, &progress, &image, &e), TG_STOPPED);
    ck_assert(last >= 0.5 && !image.v);
    tg_sinogram_free(&s);
    tg_fields_free(tg_recipe_fields, &r);
}
END_TEST

Suite *suite_reconstruct(void);
Suite *suite_reconstruct(void)
{
    SUITE_BEGIN("reconstruct", 60);
    tcase_add_loop_test(tcase, disc_value, 0, sizeof discs / sizeof *discs);
    tcase_add_loop_test(tcase, same_bits, TG_PARALLEL, TG_FAN_EQUISPACED + 1);
    tcase_add_test(tcase, stack);
    tcase_add_test(tcase, recipe_in_image);
    tcase_add_test(tcase, own_grid);
    tcase_add_loop_test(tcase, refused, 0, sizeof wrong / sizeof *wrong);
    tcase_add_test(tcase, stopped);
    return suite;
}
