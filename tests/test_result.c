/* Results: lists that grow, and how an uncertainty budget becomes an expanded uncertainty. */
#include "metrics/result.h"
#include "tests/near.h"

#include <stdio.h>

/* JCGM 100:2008, table G.2, the column p = 95 % */
static const struct {
    double dof, k;
} quantiles[] = {{1, 12.71}, {2, 4.30}, {3, 3.18}, {5, 2.57}, {10, 2.23}, {20, 2.09}, {50, 2.01}, {INFINITY, 1.960}};

START_TEST(expands_by_the_t_quantile)
{
    tg_results all = {0};
    tg_result *r = tg_results_add(&all, "ct-number", "body", "HU");
    ck_assert_ptr_nonnull(r);
    tg_result_budget(r, "noise", 2, quantiles[_i].dof);
    tg_result_combine(r);
    CK_NEAR(r->uncertainty, 2 * quantiles[_i].k, 0, 0.01, "JCGM 100:2008, table G.2, p = 95 %"); /* k to two places */
    CK_NEAR(r->uncertainty_noise, r->uncertainty, 1e-15, 0, "noise is all there is");
    tg_results_free(&all);
}
END_TEST

START_TEST(combines_end_gauge)
{
    /* JCGM 100:2008, H.1.6: u = 25, 9.7, 2.9, 16.6 nm with 18, 25.6, 50, 2 degrees of freedom: u_c = 32 nm, 16
     * effective degrees, and k = 2.12 for 95 % (G.2); the book rounds u_c to 32 and truncates 16.7 to 16. */
    tg_results all = {0};
    tg_result *r = tg_results_add(&all, "position", "end gauge", "nm");
    ck_assert_ptr_nonnull(r);
    tg_result_budget(r, "noise", 25, 18);
    tg_result_budget(r, "noise", 9.7, 25.6);
    tg_result_budget(r, "method", 2.9, 50);
    tg_result_budget(r, "method", 16.6, 2);
    tg_result_combine(r);
    CK_NEAR(r->uncertainty, 2.12 * 32, 0.5 / 32 + 0.01 / 2.12, 0, "JCGM 100:2008, H.1.6");
    const double u = hypot(25, 9.7), dof = pow(u, 4) / (pow(25, 4) / 18 + pow(9.7, 4) / 25.6);
    ck_assert(dof > 20 && dof < 25); /* table G.2: k between 2.06 and 2.09 */
    ck_assert(r->uncertainty_noise > 2.055 * u && r->uncertainty_noise < 2.095 * u);
    tg_results_free(&all);
}
END_TEST

START_TEST(leaves_nothing_out_of_a_full_budget)
{
    tg_results all = {0};
    tg_result *r = tg_results_add(&all, "noise", "body", "HU");
    ck_assert_ptr_nonnull(r);
    for (int i = 0; i < 2 * TG_BUDGET; i++)
        tg_result_budget(r, "method", 1, INFINITY);
    ck_assert_uint_eq(r->n_budget, TG_BUDGET);
    tg_result_budget(r, "method", 0, 1);
    tg_result_budget(r, "method", NAN, 1);
    tg_result_combine(r);
    CK_NEAR(r->uncertainty, 1.959963985 * 4, 1e-9, 0, "sqrt(16) times the normal quantile (Abramowitz Stegun 26.2)");
    ck_assert(r->uncertainty_noise == 0);
    tg_results_free(&all);
}
END_TEST

START_TEST(says_why)
{
    tg_results all = {0};
    tg_result *r = tg_results_add(&all, "mtf50", "wire", "lp/cm");
    ck_assert_ptr_nonnull(r);
    ck_assert(isnan(r->value) && isnan(r->uncertainty) && isnan(r->low) && isnan(r->high) && isnan(r->predicted));
    ck_assert_str_eq(r->why, "");
    r->value = 1;
    tg_result_null(r, "the wire is %d pixels from the edge", 3);
    ck_assert(isnan(r->value));
    ck_assert_str_eq(r->why, "the wire is 3 pixels from the edge");
    tg_results_free(&all);
}
END_TEST

START_TEST(grows)
{
    tg_results all = {0};
    tg_error e = {0};
    char where[16];
    for (int i = 0; i < 40; i++) {
        snprintf(where, sizeof where, "rod %d", i);
        tg_result *r = tg_results_add(&all, "ct-number", where, "HU");
        ck_assert_ptr_nonnull(r);
        r->value = i;
        tg_curve *c = tg_results_add_curve(&all, "mtf", where, "lp/cm", "", 5, i % 2);
        ck_assert_ptr_nonnull(c);
        c->x[4] = c->y[4] = i;
        ck_assert((c->predicted != NULL) == (i % 2 != 0));
        tg_region disc = {.outline = TG_DISC, .centre_mm = {i, 0}, .outer_mm = 5};
        snprintf(disc.label, sizeof disc.label, "%s", where);
        CK_OK(tg_results_add_region(&all, &disc, &e));
        CK_OK(tg_results_add_region(&all, &disc, &e)); /* measured twice, drawn once */
    }
    ck_assert_uint_eq(all.n_results, 40);
    ck_assert_uint_eq(all.n_curves, 40);
    ck_assert_uint_eq(all.n_regions, 40);
    for (int i = 0; i < 40; i++) {
        snprintf(where, sizeof where, "rod %d", i);
        ck_assert_str_eq(all.result[i].where, where);
        ck_assert(all.result[i].value == i && all.curve[i].x[4] == i && all.region[i].centre_mm[0] == i);
    }
    tg_results_free(&all);
    ck_assert_ptr_null(all.result);
    tg_results_free(&all);
}
END_TEST

Suite *suite_result(void);
Suite *suite_result(void)
{
    SUITE_BEGIN("result", 5);
    tcase_add_loop_test(tcase, expands_by_the_t_quantile, 0, sizeof quantiles / sizeof *quantiles);
    tcase_add_test(tcase, combines_end_gauge);
    tcase_add_test(tcase, leaves_nothing_out_of_a_full_budget);
    tcase_add_test(tcase, says_why);
    tcase_add_test(tcase, grows);
    return suite;
}
