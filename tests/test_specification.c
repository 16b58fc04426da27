/* Specifications: what a file may say, what is refused with which line, and when one speaks of an image. */
#include "io/memory.h"
#include "metrics/specification.h"
#include "tests/near.h"
#include "tests/scratch.h"

static tg_solid solids[] = {{.name = {.v = (char[]){"body"}}}, {.name = {.v = (char[]){"ptfe-rod"}}}};
static const tg_phantom phantom = {.solid = solids, .n_solids = 2};

static tg_code read_text(const char *text, tg_specification *s, tg_error *e)
{
    scratch_begin();
    const tg_code code = tg_specification_read(scratch_write("spec.yaml", text), &phantom, s, e);
    scratch_end();
    return code;
}

START_TEST(reads_all_keys)
{
    tg_error e = {0};
    tg_specification s;
    CK_OK(read_text("specification: routine body\n"
                    "conditions: {kernel: hann, kv: 120, slice: 5}\n"
                    "checks:\n"
                    "  - {measure: ct-number, in: ptfe-rod, nominal: 940, tolerance: 40, source: data sheet}\n"
                    "  - {measure: ct-number, in: body, nominal: computed, tolerance: 4}\n"
                    "  - {measure: uniformity, in: body, tolerance: 4}\n"
                    "  - {measure: noise, in: body, high: 5.75}\n"
                    "  - {measure: mtf50, at: ptfe-rod, by: edge, low: 5.6}\n",
                    &s, &e));
    const tg_check *c = s.checks.v;
    ck_assert_str_eq(s.name.v, "routine body");
    ck_assert_str_eq(s.conditions.kernel.v, "hann");
    ck_assert(s.conditions.kv.v == 120 && s.conditions.slice.v == 5 && !s.conditions.energy.line);
    ck_assert_uint_eq(s.checks.n, 5);
    ck_assert(s.unit.v == 0); /* HU */
    ck_assert(c[0].nominal.v == 940 && c[0].tolerance.v == 40);
    ck_assert_str_eq(c[0].source.v, "data sheet");
    ck_assert(c[1].nominal.line == 5 && isnan(c[1].nominal.v)); /* computed */
    ck_assert(c[3].high.v == 5.75 && !c[3].low.line);
    ck_assert_str_eq(tg_check_solid(&c[3]), "body");
    ck_assert_str_eq(tg_check_solid(&c[4]), "ptfe-rod");
    ck_assert(c[4].by.line && c[4].by.v == 1);
    tg_specification_free(&s);
    tg_specification_free(&s); /* a zeroed one */
}
END_TEST

static const struct {
    const char *check; /* in line 4 */
    const char *says;
} refused[] = {
    {"{measure: ct-number, in: body, tolerance: 4}", "needs a nominal value"},
    {"{measure: ct-number, in: body, low: 3, high: 2}", "low: is above high"},
    {"{measure: ct-number, in: body}", "nothing is asked"},
    {"{measure: ct-number, in: body, nominal: 3}", "alone asks nothing"},
    {"{measure: ct-number, in: body, nominal: 3, tolerance: 1, low: 2}", "either a tolerance or limits"},
    {"{measure: ct-number, in: body, nominal: 3, tolerance: 0}", "tolerance"},
    {"{measure: ct-number, in: body, at: body, low: 3}", "both name the solid"},
    {"{measure: ct-number, low: 3}", "in: missing"},
    {"{measure: ct-nubmer, in: body, low: 3}", "did you mean 'ct-number'"},
    {"{measure: quuxfrobnicate, in: body, low: 3}", "there are: ct-number"},
    {"{measure: ct-number, in: ptfe-rood, low: 3}", "did you mean 'ptfe-rod'"},
    {"{measure: noise, in: body, by: edge, high: 3}", "by: this measure"},
    {"{measure: mtf50, at: body, by: eye, high: 3}", "by"},
    {"{measure: noise, in: body, high: 3 HU}", "high"},
    {"{measure: noise, in: body, hihg: 3}", "high"},
    {"{measure: noise, in: ptfe-rod, low: 1}", "checked in line 3 already"},
    {"{measure: mtf50, at: body, by: edge, low: 1}\n  - {measure: mtf10, at: body, by: wire, low: 1}", "one way"},
    {"{measure: mtf50, at: body, by: edge, low: 1}\n  - {measure: mtf10, at: body, low: 1}", "same here and in line 4"},
};

START_TEST(refuses)
{
    char text[512];
    tg_error e = {0};
    tg_specification s;
    snprintf(text, sizeof text, "specification: s\nchecks:\n  - {measure: noise, in: ptfe-rod, low: 1}\n  - %s\n",
             refused[_i].check);
    ck_assert_int_eq(read_text(text, &s, &e), TG_INPUT);
    ck_assert_int_eq(e.message[0].line, strchr(refused[_i].check, '\n') ? 5 : 4);
    ck_assert_msg(strstr(e.message[0].what, refused[_i].says), "'%s' says: %s", refused[_i].check, e.message[0].what);
    ck_assert_ptr_null(s.checks.v);
}
END_TEST

START_TEST(reports_all_errors)
{
    tg_error e = {0};
    tg_specification s;
    ck_assert_int_eq(read_text("specification: s\nchecks:\n"
                               "  - {measure: ct-number, in: body, tolerance: 4}\n"
                               "  - {measure: nosie, in: boody}\n",
                               &s, &e),
                     TG_INPUT);
    ck_assert_uint_eq(e.count, 4); /* no nominal; nothing asked, unknown measure, unknown solid */
}
END_TEST

START_TEST(reads_without_a_phantom)
{
    tg_error e = {0};
    tg_specification s;
    scratch_begin();
    scratch_write("s.yaml", "specification: s\nchecks:\n  - {measure: noise, in: anything, high: 4}\n");
    CK_OK(tg_specification_read(scratch("s.yaml"), NULL, &s, &e));
    tg_specification_free(&s);
    scratch_end();
}
END_TEST

static tg_number given(double v)
{
    return (tg_number){v, 1};
}

static const struct {
    const char *kernel;
    double kv, energy, slice;
    const char *image_kernel;
    double image_kv, image_energy, image_slice;
    const char *why; /* NULL: it speaks of the image */
} cases[] = {
    {NULL, NAN, NAN, NAN, NULL, NAN, NAN, 0, NULL},
    {"hann", NAN, NAN, NAN, "hann", NAN, NAN, 0, NULL},
    {"hann", NAN, NAN, NAN, "hann@1", NAN, NAN, 0, NULL},
    {"hann", NAN, NAN, NAN, "hann@0.8", NAN, NAN, 0, "hann@0.8"},
    {"hann", NAN, NAN, NAN, "ramp", NAN, NAN, 0, "they want kernel hann, and the image has ramp"},
    {"hann", NAN, NAN, NAN, NULL, NAN, NAN, 0, "does not state its own"},
    {NULL, 120, NAN, NAN, NULL, 120, NAN, 0, NULL},
    {NULL, 120, NAN, NAN, NULL, 100, NAN, 0, "120 kV"},
    {NULL, 120, NAN, NAN, NULL, NAN, NAN, 0, "does not state its own"},
    {NULL, NAN, 70, NAN, NULL, NAN, 70, 0, NULL},
    {NULL, NAN, 70, NAN, NULL, NAN, 60, 0, "60 keV"},
    {NULL, NAN, NAN, 5, NULL, NAN, NAN, 5, NULL},
    {NULL, NAN, NAN, 5, NULL, NAN, NAN, 2, "slice thickness 5 mm"},
    {NULL, NAN, NAN, 5, NULL, NAN, NAN, 0, "does not state its own"},
};

START_TEST(conditions)
{
    char wanted[32], has[32], why[200] = "";
    tg_specification s = {0};
    tg_image image = {.grid = {.n = {4, 4, 1}, .step_mm = {1, 1, 1}}};
    if (cases[_i].kernel) s.conditions.kernel.v = strcpy(wanted, cases[_i].kernel);
    if (!isnan(cases[_i].kv)) s.conditions.kv = given(cases[_i].kv);
    if (!isnan(cases[_i].energy)) s.conditions.energy = given(cases[_i].energy);
    if (!isnan(cases[_i].slice)) s.conditions.slice = given(cases[_i].slice);
    if (cases[_i].image_kernel) image.kernel = strcpy(has, cases[_i].image_kernel);
    image.facts.tube_kv.v = cases[_i].image_kv;
    image.facts.energy_kev.v = cases[_i].image_energy;
    for (int stack = 0; stack < 2; stack++) { /* a stack states its step, a slice what its scan or file says */
        image.grid.n[2] = stack && cases[_i].image_slice > 0 ? 3 : 1;
        image.grid.step_mm[2] = stack ? cases[_i].image_slice : 1;
        image.scan.row_step_mm = stack ? 0 : cases[_i].image_slice;
        ck_assert_int_eq(tg_specification_covers(&s, &image, why), cases[_i].why == NULL);
        if (cases[_i].why) ck_assert_msg(strstr(why, cases[_i].why), "says: %s", why);
    }
}
END_TEST

Suite *suite_specification(void);
Suite *suite_specification(void)
{
    SUITE_BEGIN("specification", 10);
    tcase_add_test(tcase, reads_all_keys);
    tcase_add_loop_test(tcase, refuses, 0, sizeof refused / sizeof *refused);
    tcase_add_test(tcase, reports_all_errors);
    tcase_add_test(tcase, reads_without_a_phantom);
    tcase_add_loop_test(tcase, conditions, 0, sizeof cases / sizeof *cases);
    return suite;
}
