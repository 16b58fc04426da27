/* The report page: from an evaluation made by hand, so that every case stands on it. */
#include "io/memory.h"
#include "metrics/page.h"
#include "tests/near.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { PIXELS = 128 };

static void add_figure(tg_results *r, const char *measure, const char *where, const char *unit, double value, double u,
                       double low, double high)
{
    tg_result *result = tg_results_add(r, measure, where, unit);
    ck_assert_ptr_nonnull(result);
    result->value = value;
    result->low = low;
    result->high = high;
    tg_result_budget(result, "noise", 0.4 * u, 40);
    tg_result_budget(result, "position", 0.2 * u, INFINITY);
    tg_result_combine(result);
    result->verdict = tg_judge(value, result->uncertainty, low, high);
}

static void fill(tg_evaluated *item, const tg_recipe *recipe, double shift)
{
    tg_error e = {0};
    const tg_grid grid = tg_grid_square(PIXELS, 256, (const double[2]){0, 0});
    item->recipe = recipe;
    CK_OK(tg_image_create(&grid, TG_HU, &item->image, &e));
    for (size_t i = 0; i < tg_grid_slice(&grid); i++) {
        const double x = tg_grid_mm(&grid, 0, (double)(i % PIXELS)), y = tg_grid_mm(&grid, 1, (double)(i / PIXELS));
        item->image.v[i] = hypot(x, y) < 100 ? (hypot(x - 50, y - 20) < 12 ? 120 : 0) : -1000;
    }
    item->specification = tg_copy_text("routine <body>");
    add_figure(&item->results, "ct-number", "ptfe-rod", "HU", 938.24 + shift, 2.1, 900, 980);
    add_figure(&item->results, "uniformity", "body", "HU", 3.9 + 0.1 * shift, 0.6, -4, 4);
    add_figure(&item->results, "noise", "body", "HU", 9.2, 0.3, NAN, 5.75);
    add_figure(&item->results, "mtf50", "wire", "lp/cm", 4.1, 0.05, NAN, NAN);
    tg_result_null(tg_results_add(&item->results, "mtf10", "wire", "lp/cm"),
                   "the pixels are too coarse: use a smaller field");
    tg_curve *mtf = tg_results_add_curve(&item->results, "mtf", "wire", "lp/cm", "", 40, true);
    for (size_t k = 0; k < 40; k++) {
        mtf->x[k] = 0.25 * (double)k;
        mtf->y[k] = exp(-0.02 * (1 + 0.1 * shift) * (double)(k * k) * 0.25);
        mtf->predicted[k] = exp(-0.02 * (double)(k * k) * 0.25);
    }
    tg_curve *nps = tg_results_add_curve(&item->results, "nps", "body", "lp/cm", "HU^2 mm^2", 40, false);
    for (size_t k = 0; k < 40; k++) {
        nps->x[k] = 0.25 * (double)k;
        nps->y[k] = 40 * nps->x[k] * exp(-0.3 * nps->x[k] * (1 + 0.1 * shift));
    }
    const tg_region regions[] = {{TG_DISC, {50, 20}, 0, 7.2, {0, 0}, 0, "ptfe-rod"},
                                 {TG_RING, {0, 0}, 88, 92, {0, 0}, 0, "ring"},
                                 {TG_BOX, {-40, -30}, 0, 0, {14, 8}, 0.4, "box"}};
    for (size_t k = 0; k < 3; k++)
        CK_OK(tg_results_add_region(&item->results, &regions[k], &e));
    for (size_t k = 0; k < item->results.n_results; k++)
        item->verdict = tg_worst(item->verdict, item->results.result[k].verdict);
}

static char *make_page(void)
{
    tg_error e = {0};
    char smooth[] = "smooth", sharp[] = "sharp", title[] = "three \"kernels\" & <script>alert(1)</script>",
         rods[] = "rods-disc";
    tg_recipe recipe[2] = {{.name = {smooth, 1}}, {.name = {sharp, 1}}};
    tg_job job = {.name = {title, 1}};
    tg_evaluated item[2] = {{.turn_known = true, .turn_rad = 0.02}, {.shift_mm = {1.2, -0.3}}};
    tg_evaluation ev = {.job = &job, .phantom_name = rods, .item = item, .n = 2};
    for (size_t i = 0; i < 2; i++) {
        CK_OK(tg_fields_default(tg_recipe_fields, &recipe[i], &e));
        fill(&item[i], &recipe[i], (double)i);
        ev.verdict = tg_worst(ev.verdict, item[i].verdict);
    }
    tg_warn(&ev.remarks, NULL, 0, "sharp: 3 slices lie outside the phantom and were left out");
    char *html = NULL;
    CK_OK(tg_page_report(&ev, &html, &e));
    for (size_t i = 0; i < 2; i++) {
        tg_results_free(&item[i].results);
        tg_image_free(&item[i].image);
        tg_free(item[i].specification);
        recipe[i].name.v = NULL; /* not the table's */
        tg_fields_free(tg_recipe_fields, &recipe[i]);
    }
    const char *keep = getenv("TG_KEEP_PAGE"); /* to look at it in a browser */
    FILE *file = keep ? fopen(keep, "w") : NULL;
    if (file) {
        fputs(html, file);
        fclose(file);
    }
    return html;
}

static size_t count(const char *text, const char *what)
{
    size_t n = 0;
    for (const char *at = strstr(text, what); at; at = strstr(at + 1, what))
        n++;
    return n;
}

START_TEST(verdict_comes_first)
{
    char *html = make_page();
    const char *body = strstr(html, "<main>");
    ck_assert_ptr_nonnull(body);
    ck_assert_ptr_nonnull(strstr(body, "<h1>fail</h1>"));
    ck_assert(strstr(body, "<h1>") < strstr(body, "<table"));
    ck_assert_ptr_nonnull(strstr(body, "2 of 6 specified figures pass, 2 fail, 2 cannot be decided."));
    tg_free(html);
}
END_TEST

START_TEST(words_of_the_user_stay_words)
{
    char *html = make_page();
    ck_assert_ptr_null(strstr(html, "<script>alert"));
    ck_assert_ptr_nonnull(strstr(html, "&lt;script&gt;alert"));
    ck_assert_ptr_nonnull(strstr(html, "routine &lt;body&gt;"));
    tg_free(html);
}
END_TEST

START_TEST(needs_no_network)
{
    char *html = make_page();
    ck_assert_ptr_nonnull(strstr(html, "default-src 'none'"));
    ck_assert_uint_eq(count(html, " src=\""), count(html, " src=\"data:"));
    ck_assert_ptr_null(strstr(html, " href=\""));
    ck_assert_ptr_null(strstr(html, "@import"));
    tg_free(html);
}
END_TEST

START_TEST(shows_what_was_asked_for)
{
    static const char *const parts[] = {"938.2",
                                        "&plusmn; ",
                                        "900 to 980",
                                        "at most 5.75",
                                        "the pixels are too coarse",
                                        "<svg",
                                        "data-measure=\"mtf\"",
                                        "data-measure=\"nps\"",
                                        "Signature",
                                        "not for diagnosis",
                                        "3 slices lie outside",
                                        "MIT License"};
    char *html = make_page();
    for (size_t i = 0; i < sizeof parts / sizeof *parts; i++)
        ck_assert_msg(strstr(html, parts[i]) != NULL, "no %s", parts[i]);
    tg_free(html);
}
END_TEST

Suite *suite_page(void);
Suite *suite_page(void)
{
    SUITE_BEGIN("page", 20);
    tcase_add_test(tcase, verdict_comes_first);
    tcase_add_test(tcase, words_of_the_user_stay_words);
    tcase_add_test(tcase, needs_no_network);
    tcase_add_test(tcase, shows_what_was_asked_for);
    return suite;
}
