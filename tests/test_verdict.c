/* Verdicts: the decision rules of JCGM 106:2012, 8.3.2 (guarded acceptance) and 8.3.3 (guarded rejection), with the
 * guard band equal to the expanded uncertainty. */
#include "metrics/verdict.h"
#include "tests/near.h"

static const struct {
    double value, uncertainty, low, high;
    tg_verdict want;
    const char *why;
} rows[] = {
    {0, 1, -4, 4, TG_PASS, "inside both acceptance limits"},
    {3, 1, -4, 4, TG_PASS, "on the upper acceptance limit T - U, which belongs to the acceptance interval"},
    {3.1, 1, -4, 4, TG_INCONCLUSIVE, "within the guard band below the limit"},
    {4, 1, -4, 4, TG_INCONCLUSIVE, "on the tolerance limit"},
    {4.9, 1, -4, 4, TG_INCONCLUSIVE, "within the guard band above the limit"},
    {5, 1, -4, 4, TG_INCONCLUSIVE, "the interval touches the limit, so it is not outside"},
    {5.1, 1, -4, 4, TG_FAIL, "beyond the upper rejection limit"},
    {-3.1, 1, -4, 4, TG_INCONCLUSIVE, "the same below"},
    {-5.1, 1, -4, 4, TG_FAIL, "the same below"},
    {0, 5, -4, 4, TG_INCONCLUSIVE, "an uncertainty wider than the limits never passes"},
    {0, 0, -4, 4, TG_PASS, "an exact value"},
    {4, 0, -4, 4, TG_PASS, "an exact value on the limit conforms (JCGM 106, 7.1: limits belong to the tolerance)"},
    {5, 0.2, NAN, 5.75, TG_PASS, "one-sided: upper"},
    {5.7, 0.2, NAN, 5.75, TG_INCONCLUSIVE, "one-sided: upper"},
    {6, 0.2, NAN, 5.75, TG_FAIL, "one-sided: upper"},
    {-1e9, 0.2, NAN, 5.75, TG_PASS, "one-sided: nothing is too low"},
    {6, 0.2, 5.6, NAN, TG_PASS, "one-sided: lower"},
    {5.7, 0.2, 5.6, NAN, TG_INCONCLUSIVE, "one-sided: lower"},
    {5, 0.2, 5.6, NAN, TG_FAIL, "one-sided: lower"},
    {5, 0.2, NAN, NAN, TG_NO_LIMITS, "no limits, no verdict"},
    {NAN, NAN, NAN, NAN, TG_NO_LIMITS, "no limits, no verdict, no figure either"},
    {NAN, 1, -4, 4, TG_INCONCLUSIVE, "a figure that could not be had"},
    {9, NAN, -4, 4, TG_INCONCLUSIVE, "an uncertainty that could not be had decides nothing"},
};

START_TEST(judges_with_a_guard_band)
{
    const tg_verdict got = tg_judge(rows[_i].value, rows[_i].uncertainty, rows[_i].low, rows[_i].high);
    ck_assert_msg(got == rows[_i].want, "%s: %g +- %g in [%g, %g] is %s, want %s", rows[_i].why, rows[_i].value,
                  rows[_i].uncertainty, rows[_i].low, rows[_i].high, tg_verdict_text(got),
                  tg_verdict_text(rows[_i].want));
}
END_TEST

START_TEST(worst_of_several)
{
    static const tg_verdict rising[] = {TG_NO_LIMITS, TG_PASS, TG_INCONCLUSIVE, TG_FAIL};
    for (int i = 0; i < 4; i++)
        for (int j = 0; j < 4; j++)
            ck_assert_int_eq((int)tg_worst(rising[i], rising[j]), (int)rising[i > j ? i : j]);
}
END_TEST

START_TEST(has_words)
{
    ck_assert_str_eq(tg_verdict_text(TG_NO_LIMITS), "none");
    ck_assert_str_eq(tg_verdict_text(TG_PASS), "pass");
    ck_assert_str_eq(tg_verdict_text(TG_INCONCLUSIVE), "inconclusive");
    ck_assert_str_eq(tg_verdict_text(TG_FAIL), "fail");
}
END_TEST

Suite *suite_verdict(void);
Suite *suite_verdict(void)
{
    SUITE_BEGIN("verdict", 5);
    tcase_add_loop_test(tcase, judges_with_a_guard_band, 0, sizeof rows / sizeof *rows);
    tcase_add_test(tcase, worst_of_several);
    tcase_add_test(tcase, has_words);
    return suite;
}
