#include "recon/backproject.h"

#include "io/memory.h"
#include "tests/near.h"

enum { CHANNELS = 40, VIEWS = 7, STRIDE = 96 };

static const struct {
    const char *what;
    tg_geometry geometry;
    double zero, pitch_mm, radius_mm; /* pitch at the axis, source to axis */
    size_t nx, ny;
    double field_mm, x_mm, y_mm;
} cases[] = {
    {"parallel, partly off the detector", TG_PARALLEL, 17.3, 1, 0, 31, 31, 60, 3, -2},
    {"parallel, a long row", TG_PARALLEL, 17.3, 1, 0, 600, 3, 50, 0, 0},
    {"equiangular", TG_FAN_EQUIANGULAR, 22.1, 1, 60, 31, 31, 40, 3, -2},
    {"equiangular, the source inside the field", TG_FAN_EQUIANGULAR, 22.1, 2, 25, 31, 31, 90, 1, 2},
    {"equispaced", TG_FAN_EQUISPACED, 18.8, 1, 60, 31, 31, 40, 3, -2},
    {"equispaced, the source inside the field", TG_FAN_EQUISPACED, 18.8, 2, 25, 31, 31, 90, 1, 2},
    {"one pixel", TG_FAN_EQUISPACED, 18.8, 1, 60, 1, 1, 1, 3, -2},
};

/* The definition, pixel by pixel with the library's own atan2. @return false: too near a rim to tell which side it is
 */
static bool definition(const tg_scan *scan, const float *filtered, double x, double y, double *sum)
{
    *sum = 0;
    for (size_t view = 0; view < VIEWS; view++) {
        const double c = cos(scan->angle_rad[view]), s = sin(scan->angle_rad[view]), r = scan->source_axis_mm;
        const double t = x * c + y * s, d = r + x * s - y * c;
        double channel = t / tg_scan_pitch_mm(scan), weight = 1;
        if (scan->geometry == TG_FAN_EQUIANGULAR) {
            channel = atan2(t, d) / scan->channel_step;
            weight = r * r / (t * t + d * d);
        } else if (scan->geometry == TG_FAN_EQUISPACED) {
            channel *= r / d;
            weight = r * r / (d * d);
        }
        if (scan->geometry != TG_PARALLEL && fabs(d) < 1e-3) return false;
        if (scan->geometry != TG_PARALLEL && d < 0) continue;
        channel += scan->channel_zero;
        if (fabs(channel) < 1e-5 || fabs(channel - (CHANNELS - 1)) < 1e-5) return false;
        if (channel < 0 || channel > CHANNELS - 1) continue;
        const double below = floor(channel);
        const float *row = filtered + view * STRIDE + (size_t)below;
        *sum += weight * ((double)row[0] + (channel - below) * ((double)row[1] - (double)row[0]));
    }
    return true;
}

/* Every pixel against its definition: float sums of 7 views, values up to 1 and weights up to (R / d)^2. */
START_TEST(against_definition)
{
    tg_error e = {0};
    tg_scan scan = {.geometry = cases[_i].geometry,
                    .channels = CHANNELS,
                    .views = VIEWS,
                    .rows = 1,
                    .channel_zero = cases[_i].zero,
                    .channel_step = cases[_i].pitch_mm,
                    .source_axis_mm = cases[_i].radius_mm,
                    .source_detector_mm = 2 * cases[_i].radius_mm};
    if (scan.geometry == TG_FAN_EQUIANGULAR) scan.channel_step /= scan.source_axis_mm;
    if (scan.geometry == TG_FAN_EQUISPACED) scan.channel_step *= 2;
    double angle[VIEWS] = {0, M_PI_2, M_PI, -1, 2.5, 7, -20};
    scan.angle_rad = angle;
    float *filtered, *slice;
    const double centre[2] = {cases[_i].x_mm, cases[_i].y_mm};
    tg_grid grid = tg_grid_square(cases[_i].nx, cases[_i].field_mm, centre);
    grid.n[1] = cases[_i].ny;
    CK_OK(TG_NEW(filtered, VIEWS * STRIDE, &e));
    CK_OK(TG_NEW(slice, tg_grid_slice(&grid), &e));
    for (size_t i = 0; i < VIEWS * STRIDE; i++)
        filtered[i] = (float)sin(1 + 0.9 * (double)i);
    tg_backprojector *b;
    CK_OK(tg_backprojector_create(&scan, &grid, STRIDE, &b, &e));
    const size_t half = grid.n[1] / 2;
    tg_backproject_rows(b, filtered, 0, half, slice); /* in two parts */
    tg_backproject_rows(b, filtered, half, grid.n[1] - half, slice);
    size_t told = 0;
    for (size_t y = 0; y < grid.n[1]; y++)
        for (size_t x = 0; x < grid.n[0]; x++) {
            double want;
            if (!definition(&scan, filtered, tg_grid_mm(&grid, 0, (double)x), tg_grid_mm(&grid, 1, (double)y), &want))
                continue;
            CK_NEAR(slice[y * grid.n[0] + x], want, 3e-6, 3e-6, cases[_i].what);
            told++;
        }
    ck_assert_uint_ge(10 * told, 9 * tg_grid_slice(&grid));
    tg_backprojector_free(b);
    tg_free(filtered);
    tg_free(slice);
}
END_TEST

/* A ray through the very middle of an outermost channel counts. */
START_TEST(outermost)
{
    tg_error e = {0};
    double angle[1] = {M_PI_2}; /* t = y, up to rounding */
    const tg_scan scan = {.geometry = TG_PARALLEL,
                          .channels = 3,
                          .views = 1,
                          .rows = 1,
                          .channel_zero = 1,
                          .channel_step = 0.1,
                          .angle_rad = angle};
    const tg_grid grid = {{1, 5, 1}, {1, 0.1, 1}, {0.7, -0.2, 0}};
    const float row[] = {2, 3, 4, 5};
    float slice[5];
    tg_backprojector *b;
    CK_OK(tg_backprojector_create(&scan, &grid, 4, &b, &e));
    tg_backproject_rows(b, row, 0, 5, slice);
    for (int i = 0; i < 5; i++)
        CK_NEAR(slice[i], i == 0 || i == 4 ? 0 : i + 1, 0, 1e-6, "the channel itself");
    tg_backprojector_free(b);
}
END_TEST

Suite *suite_backproject(void);
Suite *suite_backproject(void)
{
    SUITE_BEGIN("backproject", 10);
    tcase_add_loop_test(tcase, against_definition, 0, sizeof cases / sizeof *cases);
    tcase_add_test(tcase, outermost);
    return suite;
}
