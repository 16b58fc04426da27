#include "metrics/mtf.h"
#include "near.h"

/* Modulation left by the size of a test object. The values were evaluated with scipy.special, to four digits. */
START_TEST(size_of_objects)
{
    static const double f[4] = {0.5, 1, 1.5, 2};
    static const struct {
        double (*object)(double, double);
        double size_mm, left[4];
        const char *what;
    } row[] = {
        {tg_mtf_disc, 0.10, {.9969, .9877, .9725, .9515}, "wire of 0.10 mm"},
        {tg_mtf_disc, 0.18, {.9900, .9606, .9127, .8484}, "wire of 0.18 mm"},
        {tg_mtf_disc, 0.28, {.9760, .9063, .7976, .6599}, "wire of 0.28 mm"},
        {tg_mtf_ball, 0.18, {.9920, .9684, .9299, .8778}, "bead of 0.18 mm"},
        {tg_mtf_ball, 0.28, {.9808, .9247, .8364, .7228}, "bead of 0.28 mm"},
    };
    for (size_t i = 0; i < sizeof row / sizeof *row; i++)
        for (int k = 0; k < 4; k++)
            CK_NEAR(row[i].object(row[i].size_mm, f[k]), row[i].left[k], 0, 5.1e-5, row[i].what);
}
END_TEST

/* Both start as 1 - c x^2 (series of J1 and of sine and cosine): where the code changes from series to function the
 * values must meet. The next term is x^4 / 192 or x^4 / 280, 4e-15 there. */
START_TEST(small_objects)
{
    for (double x = 1e-8; x < 2e-3; x *= 1.7) {
        CK_NEAR(tg_mtf_disc(x / M_PI, 1), 1 - x * x / 8, 0, 1e-12, "2 J1(x) / x");
        CK_NEAR(tg_mtf_ball(x / M_PI, 1), 1 - x * x / 10, 0, 1e-9, "3 (sin x - x cos x) / x^3");
    }
}
END_TEST

START_TEST(taper)
{
    CK_NEAR(tg_taper(-1.999, 2, 5, NULL), 1, 0, 0, "flat");
    CK_NEAR(tg_taper(3.5, 2, 5, NULL), 0.5, 1e-12, 0, "half way");
    CK_NEAR(tg_taper(5, 2, 5, NULL), 0, 0, 0, "end");
    const double h = 1e-5;
    for (double x = -6; x <= 6; x += 0.37) {
        double slope;
        tg_taper(x, 2, 5, &slope);
        /* third derivative below (pi / 3)^3 / 2 = 0.6 times h^2 / 6, and rounding 1e-16 / h */
        CK_NEAR(slope, (tg_taper(x + h, 2, 5, NULL) - tg_taper(x - h, 2, 5, NULL)) / (2 * h), 0, 1e-10, "slope");
    }
}
END_TEST

Suite *suite_mtf(void);
Suite *suite_mtf(void)
{
    SUITE_BEGIN("mtf", 20);
    tcase_add_test(tcase, size_of_objects);
    tcase_add_test(tcase, small_objects);
    tcase_add_test(tcase, taper);
    return suite;
}
