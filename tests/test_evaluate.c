/* A small job from description to folder: figures against what went in, the same bytes for any number of threads,
 * CT numbers from a water solid, and folders that are not ours. */
#include "io/input.h"
#include "io/memory.h"
#include "metrics/results_file.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <omp.h>
#include <sys/stat.h>

#define HEAD "job: small\nphantom: disc.yaml\n"

static void set_up(void)
{
    scratch_begin();
    scratch_write("disc.yaml",
                  "phantom: disc\nmaterials:\n"
                  "  - {name: water, compound: \"Water, Liquid\"}\n  - {name: ptfe, formula: C2F4, density: 2.16}\n"
                  "solids:\n"
                  "  - {name: body, shape: cylinder, material: water, radius: 40, length: 20}\n"
                  "  - {name: rod, shape: cylinder, material: ptfe, centre: [14, 6, 0], radius: 8, length: 20}\n");
    scratch_write("scanner.yaml",
                  "scanner: bench\ngeometry: parallel\nchannels: 240\npitch: 0.4\nviews: 360\narc: 180\nenergy: 70\n"
                  "seed: 3\n");
    scratch_write("tight.yaml",
                  "specification: tight, \"quoted\"\nchecks:\n"
                  "  - {measure: ct-number, in: rod, nominal: computed, tolerance: 20, source: \"a, b\"}\n"
                  "  - {measure: ct-number, in: body, nominal: 500, tolerance: 4}\n");
    scratch_write("other.yaml", "specification: other\nconditions: {kernel: ramp}\nchecks:\n"
                                "  - {measure: ct-number, in: body, nominal: 500, tolerance: 4}\n");
}

static void tear_down(void)
{
    scratch_end();
}

/** A job that ends with these lines. @param job  must outlive the evaluation */
static void evaluate(const char *rest, tg_job *job, tg_evaluation *ev)
{
    tg_error e = {0};
    char text[1024];
    snprintf(text, sizeof text, HEAD "scanner: scanner.yaml\n%s", rest);
    scratch_write("job.yaml", text);
    CK_OK(tg_job_read(scratch("job.yaml"), job, &e));
    CK_OK(tg_evaluate(job, NULL, ev, &e));
}

static const tg_result *find(const tg_evaluated *item, const char *measure, const char *where)
{
    for (size_t i = 0; i < item->results.n_results; i++)
        if (!strcmp(item->results.result[i].measure, measure) && !strcmp(item->results.result[i].where, where))
            return &item->results.result[i];
    ck_abort_msg("%s of %s is missing", measure, where);
    return NULL;
}

START_TEST(measures_and_judges)
{
    tg_job job;
    tg_evaluation ev;
    evaluate("specification: tight.yaml\nreconstructions:\n"
             "  - {name: fine, kernel: hann, pixels: 240, field: 96}\n"
             "  - {name: no-limits, kernel: hann, pixels: 240, field: 96, specification: other.yaml}\n",
             &job, &ev);
    ck_assert_uint_eq(ev.n, 2);
    ck_assert_str_eq(ev.phantom_name, "disc");
    ck_assert_uint_eq(ev.inputs.n, 5); /* job, phantom, scanner, two specifications */
    ck_assert_int_eq(ev.verdict, TG_FAIL);
    ck_assert_str_eq(ev.item[0].lost, "");
    ck_assert_str_eq(ev.item[0].image_name, "fine.fits");
    const tg_result *water = find(&ev.item[0], "ct-number", "body"), *rod = find(&ev.item[0], "ct-number", "rod");
    ck_assert_int_eq(water->verdict, TG_FAIL);
    ck_assert_int_eq(rod->verdict, TG_PASS);
    /* water is 0 HU by definition; 3 HU for a grid of 0.4 mm rays without noise, far less than what is checked */
    CK_NEAR(water->value, 0, 0, 3, "definition of the CT number");
    CK_NEAR(rod->value, rod->predicted, 0, 3, "attenuation that went into the line integrals");
    CK_NEAR(hypot(ev.item[0].shift_mm[0], ev.item[0].shift_mm[1]), 0, 0, 0.04, "a tenth of a pixel");
    ck_assert_int_eq(ev.item[1].verdict, TG_NO_LIMITS);
    ck_assert_ptr_nonnull(strstr(ev.item[1].unspecified, "they want kernel ramp"));
    ck_assert(ev.peak_mib > 1);
    ck_assert_int_eq(tg_verdict_code(ev.verdict), TG_FAILS);
    ck_assert_int_eq(tg_verdict_code(TG_INCONCLUSIVE), TG_OPEN);
    ck_assert_int_eq(tg_verdict_code(TG_NO_LIMITS), TG_OK);
    tg_evaluation_free(&ev);
    tg_job_free(&job);
}
END_TEST

START_TEST(a_solid_of_water_makes_ct_numbers)
{
    tg_job job, plain_job;
    tg_evaluation ev, plain;
    static const char recipes[] = "reconstructions:\n  - {name: a, pixels: 240, field: 96}\n";
    char rest[256];
    snprintf(rest, sizeof rest, "photons: 1e6\nwater: body\nspecification: tight.yaml\n%s", recipes);
    evaluate(rest, &job, &ev);
    snprintf(rest, sizeof rest, "photons: 1e6\n%s", recipes);
    evaluate(rest, &plain_job, &plain);
    const tg_result *water = find(ev.item, "ct-number", "body"), *rod = find(ev.item, "ct-number", "rod");
    CK_NEAR(water->value, 0, 0, 1e-3, "definition: its mean is CT number 0, in float32"); /* 1e-3 HU: 1e-6 of mu */
    ck_assert_int_eq(water->verdict, TG_NO_LIMITS);
    ck_assert_str_eq(water->note, "defines CT number 0");
    ck_assert_int_eq(ev.verdict, TG_PASS);
    const tg_result *before = find(plain.item, "ct-number", "body"), *rod_before = find(plain.item, "ct-number", "rod");
    const double scale = 1 / (1 + before->value / 1000); /* HU + 1000 is proportional to mu / mu_water */
    CK_NEAR(rod->value, (rod_before->value + 1000) * scale - 1000, 0, 0.01, "definition of the CT number");
    CK_NEAR(ev.item->image.facts.mu_water_per_mm.v / plain.item->image.facts.mu_water_per_mm.v, 1 / scale, 1e-6, 0,
            "definition of the CT number");
    ck_assert_str_eq(rod->budget[rod->n_budget - 1].source, "water value");
    CK_NEAR(rod->budget[rod->n_budget - 1].u * 1000 / (1000 + rod->value) * 1.96, before->uncertainty, 0.1, 0,
            "the water value is as uncertain as the water's CT number");
    tg_evaluation_free(&ev);
    tg_evaluation_free(&plain);
    tg_job_free(&job);
    tg_job_free(&plain_job);
}
END_TEST

static char *written(const char *rest, int threads, const char *folder)
{
    tg_job job;
    tg_evaluation ev;
    tg_error e = {0};
    char *text;
    size_t bytes;
    const int before = omp_get_max_threads();
    omp_set_num_threads(threads);
    evaluate(rest, &job, &ev);
    CK_OK(tg_evaluation_write(&ev, scratch(folder), false, &e));
    omp_set_num_threads(before);
    char path[600];
    snprintf(path, sizeof path, "%s/%s/results.json", scratch_folder, folder);
    CK_OK(tg_read_file(path, 1 << 24, &text, &bytes, &e));
    tg_evaluation_free(&ev);
    tg_job_free(&job);
    return text;
}

static const char noisy[] = "photons: 1e5\nspecification: tight.yaml\nreconstructions:\n"
                            "  - {name: a, pixels: 160, field: 96}\n  - {name: b, kernel: ramp, pixels: 120}\n";

START_TEST(the_same_bytes_for_any_number_of_threads)
{
    static const char *const files[] = {"a.fits",       "a.png",       "b.fits",   "b.png",
                                        "results.json", "results.csv", "run.json", "report.html"};
    char *one = written(noisy, 1, "one"), *three = written(noisy, 3, "three"), *again = written(noisy, 1, "one");
    ck_assert_str_eq(one, three);
    ck_assert_str_eq(one, again); /* and an earlier run of ours gives way */
    for (size_t i = 0; i < sizeof files / sizeof *files; i++) {
        char name[64];
        struct stat status;
        snprintf(name, sizeof name, "three/%s", files[i]);
        ck_assert_msg(!stat(scratch(name), &status) && status.st_size > 0, "%s is missing", name);
    }
    tg_free(one);
    tg_free(three);
    tg_free(again);
}
END_TEST

START_TEST(leaves_foreign_files_alone)
{
    tg_job job;
    tg_evaluation ev;
    tg_error e = {0};
    struct stat status;
    evaluate("reconstructions:\n  - {name: a, pixels: 64}\n", &job, &ev);
    ck_assert_int_eq(mkdir(scratch("theirs"), 0777), 0);
    scratch_write("theirs/a.png", "a picture of somebody else\n");
    scratch_write("theirs/results.csv", "x,y\n1,2\n");
    ck_assert_int_eq(tg_evaluation_allowed(&job, scratch("theirs"), false, &e), TG_USAGE); /* known before the work */
    ck_assert_int_eq(tg_evaluation_write(&ev, scratch("theirs"), false, &e), TG_USAGE);
    ck_assert_uint_eq(e.count, 4);
    ck_assert_msg(stat(scratch("theirs/a.fits"), &status), "nothing is written when one is refused");
    e = (tg_error){0};
    CK_OK(tg_evaluation_allowed(&job, scratch("theirs"), true, &e));
    CK_OK(tg_evaluation_write(&ev, scratch("theirs"), true, &e));
    tg_evaluation_free(&ev);
    tg_job_free(&job);
}
END_TEST

START_TEST(tables_as_text)
{
    tg_recipe recipe = {.name = {.v = (char[]){"one, \"two\""}}};
    tg_evaluated item = {
        .recipe = &recipe, .verdict = TG_FAIL, .specification = (char[]){"routine"}}; /* shows what was judged */
    tg_evaluation ev = {.item = &item, .n = 1, .verdict = TG_FAIL};
    tg_error e = {0};
    char *csv, *text;
    tg_result *r =
        tg_results_add(&item.results, "ct-number", "rod-of-polyoxymethylene", "HU"); /* good until the next is added */
    r->value = 938.2431;
    r->uncertainty = 1.8503;
    r->low = 940;
    r->high = 980;
    r->verdict = TG_INCONCLUSIVE;
    snprintf(r->note, sizeof r->note, "line\nbreak");
    tg_result_null(tg_results_add(&item.results, "noise", "body", "HU"),
                   "a reason of many words that would run over the edge of a terminal of eighty columns if it were not "
                   "broken");
    item.results.result[1].verdict = TG_INCONCLUSIVE;
    tg_results_add(&item.results, "cupping", "body", "HU")->value = 1; /* nobody asked for it */
    CK_OK(tg_results_csv(&ev, &csv, &e));
    /* RFC 4180: CRLF, quotes doubled inside quotes */
    ck_assert_ptr_nonnull(
        strstr(csv, "\r\n\"one, \"\"two\"\"\",ct-number,rod-of-polyoxymethylene,938.2431,HU,1.8503,,,940,980,,"
                    "inconclusive,,\"line\nbreak\",\r\n"));
    CK_OK(tg_results_text(&ev, &text, &e));
    ck_assert_ptr_nonnull(strstr(text, "verdict: fail\n"));
    const char *row = strstr(text, "\n  ct-number [HU]\n    rod-of-polyoxymethylene  ");
    ck_assert_ptr_nonnull(row);
    static const char *const cells[] = {"938.2 +- 1.9", "940 to 980", "inconclusive\n"};
    for (size_t i = 0; i < sizeof cells / sizeof *cells; i++)
        ck_assert_ptr_nonnull(row = strstr(row, cells[i]));
    ck_assert_ptr_nonnull(strstr(text, "noise of body: a reason"));
    ck_assert_ptr_null(strstr(text, "cupping"));
    ck_assert_ptr_nonnull(strstr(text, "and 1 more without limits, in the results\n"));
    for (const char *line = text; *line; line += strcspn(line, "\n") + 1)
        ck_assert_msg(strcspn(line, "\n") <= 80, "more than 80 columns: %.*s", (int)strcspn(line, "\n"), line);
    tg_free(csv);
    tg_free(text);
    tg_results_free(&item.results);
}
END_TEST

START_TEST(estimates)
{
    tg_job job;
    tg_error e = {0};
    double seconds, mib;
    scratch_write("job.yaml", HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a, pixels: 512}\n");
    CK_OK(tg_job_read(scratch("job.yaml"), &job, &e));
    CK_OK(tg_evaluate_estimate(&job, &seconds, &mib, &e));
    ck_assert(seconds > 0.01 && seconds < 60);
    ck_assert(mib > 4 * 512. * 512 / 1048576); /* the image itself at the least */
    tg_job_free(&job);
}
END_TEST

Suite *suite_evaluate(void);
Suite *suite_evaluate(void)
{
    SUITE_BEGIN("evaluate", 120);
    tcase_add_unchecked_fixture(tcase, set_up, tear_down);
    tcase_add_test(tcase, measures_and_judges);
    tcase_add_test(tcase, a_solid_of_water_makes_ct_numbers);
    tcase_add_test(tcase, the_same_bytes_for_any_number_of_threads);
    tcase_add_test(tcase, leaves_foreign_files_alone);
    tcase_add_test(tcase, tables_as_text);
    tcase_add_test(tcase, estimates);
    return suite;
}
