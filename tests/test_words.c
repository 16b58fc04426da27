/* Figures in words: two digits of the uncertainty (JCGM 100:2008, 7.2.6), rounded up so that nothing is promised too
 * much. */
#include "metrics/words.h"
#include "tests/near.h"

static const struct {
    double value, uncertainty;
    const char *say_value, *say_uncertainty;
} figures[] = {
    {938.2431, 1.8503, "938.2", "1.9"},
    {-0.0449, 0.0121, "-0.045", "0.013"},
    {5.6, 0, "5.6", "-"},
    {12345.6, 118, "12346", "118"},
    {0.0321, 0.00002, "0.032100", "0.000020"},
    {NAN, 1, "-", "1.0"},
    {7.26, 1.0, "7.3", "1.0"},
    {-0.004, 0.57, "0.00", "0.57"},
};

START_TEST(figure)
{
    char text[TG_WORDS];
    tg_words_value(figures[_i].value, figures[_i].uncertainty, text);
    ck_assert_str_eq(text, figures[_i].say_value);
    tg_words_uncertainty(figures[_i].uncertainty, text);
    ck_assert_str_eq(text, figures[_i].say_uncertainty);
}
END_TEST

START_TEST(limits)
{
    char text[TG_WORDS];
    tg_words_limits(900, 980, text);
    ck_assert_str_eq(text, "900 to 980");
    tg_words_limits(NAN, 5.75, text);
    ck_assert_str_eq(text, "at most 5.75");
    tg_words_limits(5.6, NAN, text);
    ck_assert_str_eq(text, "at least 5.6");
    tg_words_limits(NAN, NAN, text);
    ck_assert_str_eq(text, "");
}
END_TEST

Suite *suite_words(void);
Suite *suite_words(void)
{
    SUITE_BEGIN("words", 4);
    tcase_add_loop_test(tcase, figure, 0, sizeof figures / sizeof *figures);
    tcase_add_test(tcase, limits);
    return suite;
}
