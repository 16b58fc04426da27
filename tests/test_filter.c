#include "recon/filter.h"

#include "io/memory.h"
#include "tests/near.h"

static tg_scan make_scan(tg_geometry geometry, size_t channels, double pitch_mm)
{
    tg_scan scan = {.geometry = geometry,
                    .channels = channels,
                    .views = 1,
                    .rows = 1,
                    .channel_zero = 0.5 * ((double)channels - 1),
                    .channel_step = pitch_mm};
    if (geometry == TG_PARALLEL) return scan;
    scan.source_axis_mm = 500;
    scan.source_detector_mm = 1000;
    scan.channel_step *= geometry == TG_FAN_EQUIANGULAR ? 1 / 500.0 : 2;
    return scan;
}

/* Kak and Slaney 1988, ch. 3: h(0) = 1/(4 tau^2), 0 at even n, -1/(pi n tau)^2 at odd n. */
START_TEST(taps)
{
    static const double want[] = {.25, -.1013212, 0, -.0112579, 0, -.00405285};
    const tg_scan parallel = make_scan(TG_PARALLEL, 10, 1), flat = make_scan(TG_FAN_EQUISPACED, 10, 1),
                  curved = make_scan(TG_FAN_EQUIANGULAR, 10, 1);
    for (size_t n = 0; n < 6; n++) {
        CK_NEAR(tg_ramp_tap_per_mm2(&parallel, n), want[n], 0, 5e-8, "Kak and Slaney 1988, 7 digits");
        CK_NEAR(tg_ramp_tap_per_mm2(&flat, n), want[n], 0, 5e-8, "the same on a virtual detector at the axis");
    }
    /* g(n alpha) = -1 / (2 pi^2 sin^2(n alpha)) per rad^2 halves the ramp (both sides of a full turn) */
    const double alpha = curved.channel_step, r2 = 500 * 500;
    CK_NEAR(tg_ramp_tap_per_mm2(&curved, 0) * r2 / 2, 1 / (8 * alpha * alpha), 1e-12, 0, "Kak and Slaney 1988, g(0)");
    for (size_t n = 1; n < 200; n += 2)
        CK_NEAR(tg_ramp_tap_per_mm2(&curved, n) * r2 / 2, -1 / (2 * pow(M_PI * sin((double)n * alpha), 2)), 1e-12, 0,
                "Kak and Slaney 1988, g(n alpha)");
}
END_TEST

/* Filter one view in which a single channel measures 1. */
static void filter_point(const tg_scan *scan, const char *window, size_t channel, double weight, float *out)
{
    tg_error e = {0};
    tg_kernel kernel;
    tg_filter *filter;
    float *line, *filtered;
    CK_OK(tg_kernel_read(window, &kernel, &e));
    CK_OK(tg_filter_create(scan, &kernel, &filter, &e));
    ck_assert_uint_ge(tg_filter_stride(filter), 2 * scan->channels);
    CK_OK(TG_NEW(line, scan->channels, &e));
    CK_OK(TG_NEW(filtered, tg_filter_stride(filter), &e));
    line[channel] = 1;
    tg_filter_apply(filter, &weight, line, filtered);
    for (size_t i = 0; i < scan->channels; i++)
        out[i] = filtered[i];
    tg_free(line);
    tg_free(filtered);
    tg_filter_free(filter);
    tg_kernel_free(&kernel);
}

/* The bare ramp is the linear convolution with its taps to float precision: nothing comes round from the other end,
 * and a fan's row is weighted with the cosine of its fan angle. */
START_TEST(convolution)
{
    const tg_scan scan = make_scan((tg_geometry)_i, 101, 0.8);
    float out[101];
    filter_point(&scan, "ramp", 3, 2.5, out);
    const double fan = tg_scan_fan_angle(&scan, tg_scan_coordinate(&scan, 3));
    for (size_t i = 0; i < 101; i++) {
        const double want = 2.5 * cos(fan) * 0.8 * tg_ramp_tap_per_mm2(&scan, i > 3 ? i - 3 : 3 - i);
        CK_NEAR(out[i], want, 0, 4e-7, "sum of taps, float");
    }
}
END_TEST

/* Shepp and Logan 1974: h(n) = -2 / (pi^2 tau^2 (4 n^2 - 1)). The ramp's taps beyond the 401 channels would change its
 * response by up to 1 / (400 pi^2) in a band of 1 / 400 around 0: 6e-7 in all; the rest of 2e-6 is for float. */
START_TEST(shepp_logan)
{
    static const double want[] = {.2026424, -.0675475, -.0135095, -.00578978, -.00321655};
    const tg_scan scan = make_scan(TG_PARALLEL, 401, 1);
    float out[401];
    filter_point(&scan, "shepp-logan", 200, 1, out);
    for (size_t n = 0; n < 5; n++) {
        CK_NEAR(out[200 + n], want[n], 0, 2e-6, "Shepp and Logan 1974");
        CK_NEAR(out[200 - n], want[n], 0, 2e-6, "Shepp and Logan 1974");
    }
}
END_TEST

/* The response at zero frequency is the sum of the taps, not 0: taps up to N add up to 0.1013 / N. */
START_TEST(no_dc_loss)
{
    static const size_t reach[] = {64, 256, 1024};
    static const double want[] = {.001583, .000396, .0000990};
    const tg_scan scan = make_scan(TG_PARALLEL, 10, 1);
    for (int i = 0; i < 3; i++) {
        double sum = tg_ramp_tap_per_mm2(&scan, 0);
        for (size_t n = 1; n <= reach[i]; n++)
            sum += 2 * tg_ramp_tap_per_mm2(&scan, n);
        CK_NEAR(sum, want[i], 0, 6e-7, "1 / (pi^2 N)");
    }
}
END_TEST

START_TEST(too_wide)
{
    tg_scan scan = make_scan(TG_FAN_EQUIANGULAR, 1600, 1);
    tg_kernel kernel;
    tg_error e = {0};
    CK_OK(tg_kernel_read("ramp", &kernel, &e));
    tg_filter *filter = NULL;
    ck_assert_int_eq(tg_filter_create(&scan, &kernel, &filter, &e), TG_INPUT);
    ck_assert_ptr_null(filter);
    tg_kernel_free(&kernel);
}
END_TEST

Suite *suite_filter(void);
Suite *suite_filter(void)
{
    SUITE_BEGIN("filter", 10);
    tcase_add_test(tcase, taps);
    tcase_add_loop_test(tcase, convolution, TG_PARALLEL, TG_FAN_EQUISPACED + 1);
    tcase_add_test(tcase, shepp_logan);
    tcase_add_test(tcase, no_dc_loss);
    tcase_add_test(tcase, too_wide);
    return suite;
}
