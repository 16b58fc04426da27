#include "recon/weights.h"

#include "tests/near.h"

#include <string.h>

enum { MOST = 400 };

static tg_code weights(tg_geometry geometry, size_t views, const double *degrees, double *share, tg_error *e)
{
    double angle[MOST];
    for (size_t i = 0; i < views; i++)
        angle[i] = degrees[i] * M_PI / 180;
    const tg_scan scan = {.geometry = geometry, .views = views, .angle_rad = angle};
    return tg_angle_weights(&scan, share, e);
}

/* Even steps: every view has the same share of pi, whatever the start, the sense and the number of turns; a view that
 * repeats the first shares with it. */
static const struct {
    tg_geometry geometry;
    size_t views;
    double start, step;
    size_t repeats; /* views at the end that stand for the first ones again */
} even[] = {
    {TG_PARALLEL, 180, 0, 1, 0},          {TG_PARALLEL, 181, 0, 1, 1},          {TG_PARALLEL, 360, 12.5, 1, 0},
    {TG_PARALLEL, 181, 0, 360 / 181., 0}, {TG_PARALLEL, 12, 400, -15, 0},       {TG_FAN_EQUIANGULAR, 360, 0, -1, 0},
    {TG_FAN_EQUISPACED, 361, -90, 1, 1},  {TG_FAN_EQUIANGULAR, 36, 720, 10, 0},
};

START_TEST(even_steps)
{
    double degrees[MOST], share[MOST], sum = 0;
    tg_error e = {0};
    const size_t n = even[_i].views, repeats = even[_i].repeats;
    for (size_t i = 0; i < n; i++)
        degrees[i] = even[_i].start + even[_i].step * (double)i;
    CK_OK(weights(even[_i].geometry, n, degrees, share, &e));
    ck_assert_uint_eq(e.count, 0);
    for (size_t i = 0; i < n; i++) {
        sum += share[i];
        if (i >= repeats && i < n - repeats)
            CK_NEAR(share[i], M_PI / (double)(n - repeats), 1e-9, 0, "the same share of the half turn");
    }
    for (size_t i = 0; i < repeats; i++)
        CK_NEAR(share[i] + share[n - repeats + i], M_PI / (double)(n - repeats), 1e-9, 0, "two views share");
    CK_NEAR(sum, M_PI, 1e-12, 0, "shares of the half turn");
}
END_TEST

/* Irregular angles in any order: half of the gaps to both neighbours. */
START_TEST(irregular)
{
    static const double degrees[] = {0, 170, 30, 70, 100, 140}; /* gaps 30 40 30 40 30 10 */
    static const double want[] = {20, 20, 35, 35, 35, 35};
    double share[6];
    tg_error e = {0};
    CK_OK(weights(TG_PARALLEL, 6, degrees, share, &e));
    for (int i = 0; i < 6; i++)
        CK_NEAR(share[i], want[i] * M_PI / 180, 1e-12, 0, "half of both gaps");
}
END_TEST

static const struct {
    tg_geometry geometry;
    size_t views;
    double step;
    size_t drop, dropped; /* views left out */
    bool refused;
    const char *says; /* NULL: nothing */
} gaps[] = {
    {TG_PARALLEL, 1, 1, 0, 0, true, "needs views all over 180 degrees"},
    {TG_PARALLEL, 150, 1, 0, 0, true, "between 149 and 180 degrees"},
    {TG_FAN_EQUIANGULAR, 200, 1, 0, 0, true, "needs views all over 360 degrees"},
    {TG_FAN_EQUISPACED, 360, 1, 100, 4, true, "between 99 and 104 degrees"},
    {TG_FAN_EQUISPACED, 360, 1, 100, 3, false, "missing between 99 and 103"},
    {TG_PARALLEL, 360, 0.5, 100, 3, false, "missing"},
    {TG_PARALLEL, 180, 1, 100, 2, false, NULL},
    {TG_PARALLEL, 3, 60, 0, 0, true, "between"},
};

START_TEST(gap)
{
    double degrees[MOST], share[MOST];
    tg_error e = {0};
    size_t n = 0;
    for (size_t i = 0; i < gaps[_i].views; i++)
        if (i < gaps[_i].drop || i >= gaps[_i].drop + gaps[_i].dropped) degrees[n++] = gaps[_i].step * (double)i;
    const tg_code code = weights(gaps[_i].geometry, n, degrees, share, &e);
    ck_assert_int_eq(code, gaps[_i].refused ? TG_INPUT : TG_OK);
    ck_assert_uint_eq(e.count, gaps[_i].says ? 1 : 0);
    if (gaps[_i].says) ck_assert_msg(strstr(e.message[0].what, gaps[_i].says), "%s", e.message[0].what);
}
END_TEST

Suite *suite_weights(void);
Suite *suite_weights(void)
{
    SUITE_BEGIN("weights", 10);
    tcase_add_loop_test(tcase, even_steps, 0, sizeof even / sizeof *even);
    tcase_add_test(tcase, irregular);
    tcase_add_loop_test(tcase, gap, 0, sizeof gaps / sizeof *gaps);
    return suite;
}
