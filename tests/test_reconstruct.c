#include "recon/reconstruct.h"

#include "io/memory.h"
#include "tests/near.h"

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

Suite *suite_reconstruct(void);
Suite *suite_reconstruct(void)
{
    SUITE_BEGIN("reconstruct", 60);
    tcase_add_loop_test(tcase, disc_value, 0, sizeof discs / sizeof *discs);
    return suite;
}
