/* Every allocation of a call fails once: the call answers TG_MACHINE, leaves its output as it was and no file behind,
 * and loses nothing (which the address sanitizer sees). */
#include "io/embedded.h"
#include "io/fits.h"
#include "io/json.h"
#include "io/memory.h"
#include "io/png.h"
#include "metrics/results_file.h"
#include "phantoms/simulate.h"
#include "recon/kernel.h"
#include "recon/reconstruct.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <string.h>

static long left = -1; /* allocations that still succeed before one fails; below 0: all succeed */

/* The linker sends every call of aligned_alloc to the first, which is known to it as the second. */
void *__wrap_aligned_alloc(size_t alignment, size_t bytes);
void *__real_aligned_alloc(size_t alignment, size_t bytes);

void *__wrap_aligned_alloc(size_t alignment, size_t bytes)
{
    return left >= 0 && left-- == 0 ? NULL : __real_aligned_alloc(alignment, bytes);
}

static const char scanner_text[] = "scanner: small\ngeometry: fan-equispaced\nsource-axis: 500\nsource-detector: 900\n"
                                   "channels: 128\npitch: 3\nviews: 60\nslices: 2\nsubrays: 1\nphotons: 1000000\n";

/* What the calls work on, made while memory was plenty. */
static tg_phantom phantom;
static tg_scanner scanner;
static tg_sinogram sinogram;
static tg_recipe recipe;
static tg_image image;
static tg_job job;
static tg_inputs inputs;
static const tg_provenance made = {"test", "pixels=8", &inputs};
static size_t files;

static tg_code read_phantom(void *out, tg_error *e)
{
    return tg_phantom_read(scratch("phantom.yaml"), out, e);
}

static void free_phantom(void *out)
{
    tg_phantom_free(out);
}

static tg_code read_scanner(void *out, tg_error *e)
{
    return tg_scanner_read(scratch("scanner.yaml"), out, e);
}

static void free_scanner(void *out)
{
    tg_scanner_free(out);
}

static tg_code simulate(void *out, tg_error *e)
{
    return tg_simulate(&phantom, &scanner, NULL, out, NULL, e);
}

static tg_code read_sinogram(void *out, tg_error *e)
{
    return tg_fits_read_sinogram(scratch("sinogram.fits"), out, e);
}

static void free_sinogram(void *out)
{
    tg_sinogram_free(out);
}

static tg_code reconstruct(void *out, tg_error *e)
{
    return tg_reconstruct(&sinogram, &recipe, NULL, out, e);
}

static tg_code read_image(void *out, tg_error *e)
{
    return tg_fits_read_image(scratch("image.fits"), out, e);
}

static void free_image(void *out)
{
    tg_image_free(out);
}

static tg_code read_kernel(void *out, tg_error *e)
{
    return tg_kernel_read(scratch("kernel.txt"), out, e);
}

static void free_kernel(void *out)
{
    tg_kernel_free(out);
}

static tg_code add_input(void *out, tg_error *e)
{
    return tg_inputs_add(out, scratch("sinogram.fits"), e);
}

static void free_inputs(void *out)
{
    tg_inputs_free(out);
}

static tg_code write_sinogram(void *out, tg_error *e)
{
    (void)out;
    return tg_fits_write_sinogram(scratch("out"), &sinogram, &made, e);
}

static tg_code write_image(void *out, tg_error *e)
{
    (void)out;
    return tg_fits_write_image(scratch("out"), &image, &made, e);
}

static tg_code write_png(void *out, tg_error *e)
{
    (void)out;
    static const tg_region region = {.outline = TG_DISC, .outer_mm = 20};
    static const tg_window window = {.width = 400, .bits = 8, .region = &region, .n_regions = 1};
    return tg_png_write(scratch("out"), &image, 1, &window, e);
}

static tg_code write_json(void *out, tg_error *e)
{
    (void)out;
    tg_json *j = tg_json_object(), *list = tg_json_array();
    tg_json_add_text(list, "a");
    tg_json_add_number(list, 1);
    tg_json_set(j, "list", list);
    tg_json_set_text(j, "text", "b");
    const tg_code code = tg_json_write(scratch("out"), j, e);
    tg_json_free(j);
    return code;
}

static tg_code read_job(void *out, tg_error *e)
{
    return tg_job_read(scratch("job.yaml"), out, e);
}

static void free_job(void *out)
{
    tg_job_free(out);
}

static tg_code evaluate(void *out, tg_error *e)
{
    return tg_evaluate(&job, NULL, out, e);
}

static void free_evaluation(void *out)
{
    tg_evaluation_free(out);
}

static void remove_out(void *out)
{
    (void)out;
    scratch_remove(scratch("out"));
}

static const struct {
    const char *name;
    tg_code (*run)(void *out, tg_error *e);
    void (*undo)(void *out);
    bool predicts; /* goes on without a prediction that theory could not make */
} calls[] = {
    {"read a phantom", read_phantom, free_phantom, false},
    {"read a scanner", read_scanner, free_scanner, false},
    {"simulate", simulate, free_sinogram, false},
    {"read a sinogram", read_sinogram, free_sinogram, false},
    {"reconstruct", reconstruct, free_image, false},
    {"read an image", read_image, free_image, false},
    {"read a kernel", read_kernel, free_kernel, false},
    {"add an input", add_input, free_inputs, false},
    {"write a sinogram", write_sinogram, remove_out, false},
    {"write an image", write_image, remove_out, false},
    {"write a PNG", write_png, remove_out, false},
    {"write JSON", write_json, remove_out, false},
    {"read a job", read_job, free_job, false},
    {"evaluate", evaluate, free_evaluation, true},
};

START_TEST(every_allocation_fails_once)
{
    static const max_align_t zero[1024];
    static max_align_t out[1024]; /* any of the structs */
    for (long n = 0;; n++) {
        tg_error e = {0};
        memset(out, 0, sizeof out);
        left = n;
        const tg_code code = calls[_i].run(out, &e);
        const bool failed = left < 0;
        left = -1;
        if (!failed || (code == TG_OK && calls[_i].predicts)) {
            CK_OK(code);
            calls[_i].undo(out);
            if (failed) continue;
            ck_assert_int_gt(n, 0);
            break;
        }
        ck_assert_msg(code == TG_MACHINE && e.code == TG_MACHINE && e.count == 1,
                      "%s: allocation %ld fails: answers %d with %zu messages, first '%s'", calls[_i].name, n,
                      (int)code, e.count, e.message[0].what);
        ck_assert_msg(!memcmp(out, zero, sizeof out), "%s: allocation %ld fails: output is set", calls[_i].name, n);
        ck_assert_uint_eq(scratch_files(), files);
    }
}
END_TEST

static void setup(void)
{
    tg_error e = {0};
    scratch_begin();
    scratch_write("phantom.yaml", tg_embedded_text("rods-disc.yaml"));
    scratch_write("scanner.yaml", scanner_text);
    scratch_write("kernel.txt", "0 1\n1 0\n");
    CK_OK(tg_phantom_read(scratch("phantom.yaml"), &phantom, &e));
    CK_OK(tg_scanner_read(scratch("scanner.yaml"), &scanner, &e));
    CK_OK(tg_simulate(&phantom, &scanner, NULL, &sinogram, NULL, &e));
    sinogram.scan.angle_rad[3] += 0.01; /* irregular: the angles need a table of their own */
    CK_OK(tg_fields_default(tg_recipe_fields, &recipe, &e));
    CK_OK(tg_field_set(tg_fields_find(tg_recipe_fields, "pixels"), &recipe, "8", NULL, 0, &e));
    CK_OK(tg_reconstruct(&sinogram, &recipe, NULL, &image, &e));
    CK_OK(tg_inputs_add(&inputs, scratch("phantom.yaml"), &e));
    CK_OK(tg_fits_write_sinogram(scratch("sinogram.fits"), &sinogram, &made, &e));
    CK_OK(tg_fits_write_image(scratch("image.fits"), &image, &made, &e));
    scratch_write("job.yaml", "job: j\nphantom: phantom.yaml\nscan: sinogram.fits\nreconstructions:\n  - {name: a, "
                              "pixels: 64, specification: spec.yaml}\n");
    scratch_write("spec.yaml", tg_embedded_text("spec-rods-disc.yaml"));
    CK_OK(tg_job_read(scratch("job.yaml"), &job, &e));
    files = scratch_files();
}

static void teardown(void)
{
    tg_job_free(&job);
    tg_inputs_free(&inputs);
    tg_image_free(&image);
    tg_fields_free(tg_recipe_fields, &recipe);
    tg_sinogram_free(&sinogram);
    tg_scanner_free(&scanner);
    tg_phantom_free(&phantom);
    scratch_end();
}

Suite *suite_memory(void);
Suite *suite_memory(void)
{
    SUITE_BEGIN("memory", 60);
    tcase_add_unchecked_fixture(tcase, setup, teardown);
    tcase_add_loop_test(tcase, every_allocation_fails_once, 0, sizeof calls / sizeof *calls);
    return suite;
}
