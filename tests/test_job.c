/* Jobs: all keys, paths beside the file, and every error told with its line before work begins. */
#include "io/memory.h"
#include "metrics/job.h"
#include "tests/near.h"
#include "tests/scratch.h"

static void set_up(void)
{
    scratch_begin();
    scratch_write("disc.yaml", "phantom: disc\nmaterials:\n  - {name: water, compound: \"Water, Liquid\"}\n"
                               "solids:\n  - {name: body, shape: cylinder, material: water, radius: 40, length: 20}\n");
    scratch_write("scanner.yaml",
                  "scanner: bench\ngeometry: parallel\nchannels: 100\npitch: 1\nviews: 90\narc: 180\nenergy: 70\n");
    scratch_write("spec.yaml",
                  "specification: s\nchecks:\n  - {measure: ct-number, in: body, nominal: 0, tolerance: 4}\n");
    scratch_write("bad-spec.yaml", "specification: s\nchecks:\n  - {measure: ct-number, in: bodi, low: 4}\n");
    scratch_write("kernel.txt", "0 1\n0.5 0.8\n1 0\n");
    scratch_write("not-a-scan.fits", "SIMPLE\n");
}

static void tear_down(void)
{
    scratch_end();
}

START_TEST(reads_all_keys)
{
    tg_error e = {0};
    tg_job job;
    scratch_write("job.yaml",
                  "job: routine\nphantom: disc.yaml\nscanner: scanner.yaml\nphotons: 1e5\nseed: 7\nwater: body\n"
                  "specification: spec.yaml\nfrequency-unit: lp/mm\nnote: after the service\n"
                  "reconstructions:\n"
                  "  - {name: smooth, kernel: hann@0.8, pixels: 64, field: 90}\n"
                  "  - {name: own, kernel: kernel.txt, specification: spec.yaml}\n");
    CK_OK(tg_job_read(scratch("job.yaml"), &job, &e));
    const tg_recipe *r = job.reconstructions.v;
    char beside[600];
    ck_assert_str_eq(job.name.v, "routine");
    ck_assert_str_eq(job.note.v, "after the service");
    ck_assert_str_eq(job.water.v, "body");
    ck_assert(job.photons.v == 1e5 && job.seed.v == 7 && job.frequency_unit.v == 1);
    ck_assert_uint_eq(job.reconstructions.n, 2);
    ck_assert_str_eq(r[0].name.v, "smooth");
    ck_assert_str_eq(r[0].kernel.v, "hann@0.8");
    ck_assert(r[0].pixels.v == 64 && r[0].line == 11);
    snprintf(beside, sizeof beside, "%s/kernel.txt", scratch_folder);
    ck_assert_str_eq(r[1].kernel.v, beside);
    snprintf(beside, sizeof beside, "%s/spec.yaml", scratch_folder);
    ck_assert_str_eq(r[1].specification.v, beside);
    snprintf(beside, sizeof beside, "%s/disc.yaml", scratch_folder);
    ck_assert_str_eq(job.phantom.v, beside);
    tg_job_free(&job);
    tg_job_free(&job);
}
END_TEST

#define HEAD "job: j\nphantom: disc.yaml\n"
#define TAIL "reconstructions:\n  - {name: a}\n"

static const struct {
    const char *text;
    int line; /* 0: of the whole file */
    const char *says;
} refused[] = {
    {HEAD TAIL, 0, "name one of them"},
    {HEAD "scan: not-a-scan.fits\nscanner: scanner.yaml\n" TAIL, 3, "name one of them"},
    {HEAD "scan: absent.fits\n" TAIL, 0, ""},
    {HEAD "scan: not-a-scan.fits\n" TAIL, 0, ""},
    {HEAD "scanner: absent.yaml\n" TAIL, 0, ""},
    {"job: j\nphantom: absent.yaml\nscanner: scanner.yaml\n" TAIL, 0, ""},
    {"job: j\nscanner: scanner.yaml\n" TAIL, 0, "phantom"},
    {HEAD "scanner: scanner.yaml\nwater: boby\n" TAIL, 4, "did you mean 'body'"},
    {HEAD "scanner: scanner.yaml\nspecification: bad-spec.yaml\n" TAIL, 3, "did you mean 'body'"},
    {HEAD "scanner: scanner.yaml\nfrequency-unit: lp/m\n" TAIL, 4, "lp/cm"},
    {HEAD "scanner: scanner.yaml\nphotons: -3\n" TAIL, 4, "photons"},
    {HEAD "scanner: scanner.yaml\nreconstructions: []\n", 4, "at least one"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {kernel: hann}\n", 5, "name"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a}\n  - {name: a}\n", 6, "taken by line 5"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a/b}\n", 5, "name of a file"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: .a}\n", 5, "name of a file"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a, kernel: hamn}\n", 5, "hann"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a, method: fbq}\n", 5, "fbp"},
    {HEAD "scanner: scanner.yaml\nreconstructions:\n  - {name: a, pixles: 4}\n", 5, "pixels"},
    {HEAD "scanner: scanner.yaml\nwater: body\nreconstructions:\n  - {name: a, mu-water: 0.02}\n", 6,
     "defines CT number 0 already"},
};

START_TEST(refuses)
{
    tg_error e = {0};
    tg_job job;
    scratch_write("job.yaml", refused[_i].text);
    ck_assert_int_eq(tg_job_read(scratch("job.yaml"), &job, &e), TG_INPUT);
    ck_assert_uint_ge(e.count, 1);
    ck_assert_msg(strstr(e.message[0].what, refused[_i].says), "%s\nsays: %s", refused[_i].text, e.message[0].what);
    if (refused[_i].line) ck_assert_int_eq(e.message[0].line, refused[_i].line);
    ck_assert_ptr_null(job.reconstructions.v);
}
END_TEST

START_TEST(photons_belong_to_simulations)
{
    tg_error e = {0};
    tg_job job;
    scratch_write("job.yaml", HEAD "scan: absent.fits\nphotons: 10\nseed: 1\n" TAIL);
    ck_assert_int_eq(tg_job_read(scratch("job.yaml"), &job, &e), TG_INPUT);
    ck_assert_uint_eq(e.count, 3); /* the file, and both keys */
    ck_assert_int_eq(e.message[1].line, 4);
    ck_assert_int_eq(e.message[2].line, 5);
}
END_TEST

START_TEST(reports_all_errors_and_a_file_once)
{
    tg_error e = {0};
    tg_job job;
    scratch_write("job.yaml",
                  HEAD "scanner: absent.yaml\nwater: boby\nreconstructions:\n"
                       "  - {name: a b, specification: bad-spec.yaml}\n  - {name: b, specification: bad-spec.yaml}\n");
    ck_assert_int_eq(tg_job_read(scratch("job.yaml"), &job, &e), TG_INPUT);
    ck_assert_uint_eq(e.count, 4); /* scanner, water, name, and the solid in bad-spec.yaml */
}
END_TEST

Suite *suite_job(void);
Suite *suite_job(void)
{
    SUITE_BEGIN("job", 20);
    tcase_add_unchecked_fixture(tcase, set_up, tear_down);
    tcase_add_test(tcase, reads_all_keys);
    tcase_add_loop_test(tcase, refuses, 0, sizeof refused / sizeof *refused);
    tcase_add_test(tcase, photons_belong_to_simulations);
    tcase_add_test(tcase, reports_all_errors_and_a_file_once);
    return suite;
}
