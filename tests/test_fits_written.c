/* FITS files of our own: what is written comes back, to the byte, and says so by its sums. */
#include "io/fits.h"
#include "io/memory.h"
#include "tests/near.h"
#include "tests/says.h"
#include "tests/scratch.h"

#include <stdint.h>
#include <sys/stat.h>

#define RAD 0.017453292519943295 /* of a degree */

static char *whole(const char *path, size_t *n)
{
    tg_error e = {0};
    char *text = NULL;
    CK_OK(tg_read_file(path, 1 << 20, &text, n, &e));
    return text;
}

/* Where the data of the HDU at `at` begin. */
static size_t data_at(const char *bytes, size_t at)
{
    size_t end = at;
    while (strncmp(bytes + end, "END     ", 8) != 0)
        end += 80;
    return at + (end - at) / 2880 * 2880 + 2880;
}

static void set_text(tg_text *t, const char *v)
{
    t->v = tg_copy_text(v);
    t->line = 1;
}

static void set_facts(tg_facts *facts)
{
    facts->tube_kv = (tg_number){120, 1};
    facts->energy_kev = (tg_number){70.1, 1};
    facts->photons_per_ray = (tg_number){1e5 / 3, 1};
    facts->mu_water_per_mm = (tg_number){0.019276, 1};
    facts->seed = (tg_number){9007199254740991, 1};
    set_text(&facts->phantom, "a name of more than sixty-eight characters, which a single card of eighty cannot hold");
    set_text(&facts->scanner, "it's 'quoted'");
}

static void same_facts(const tg_facts *a, const tg_facts *b)
{
    for (const tg_field *f = tg_fact_fields; f->key; f++) {
        const void *x = (const char *)a + f->at, *y = (const char *)b + f->at;
        if (f->kind == TG_TEXT)
            ck_assert_pstr_eq(((const tg_text *)x)->v, ((const tg_text *)y)->v);
        else
            ck_assert_msg(!memcmp(x, y, sizeof(double)), "%s differs", f->key);
    }
}

/* Same to the bit, but for what is kept in degrees: a few units of the last place. */
static void same_scan(const tg_scan *a, const tg_scan *b)
{
    const double ulp = 4 * 2.3e-16;
    ck_assert_int_eq(a->geometry, b->geometry);
    ck_assert_uint_eq(a->channels, b->channels);
    ck_assert_uint_eq(a->views, b->views);
    ck_assert_uint_eq(a->rows, b->rows);
    ck_assert_double_eq(a->source_axis_mm, b->source_axis_mm);
    ck_assert_double_eq(a->source_detector_mm, b->source_detector_mm);
    CK_NEAR(a->channel_step, b->channel_step, a->geometry == TG_FAN_EQUIANGULAR ? ulp : 0, 0, "channel step");
    CK_NEAR(a->channel_zero, b->channel_zero, ulp, 0, "channel of the axis");
    if (a->channels) ck_assert_double_eq(a->row_step_mm, b->row_step_mm); /* without a scan it is the grid's, ZSTEP */
    ck_assert_double_eq(a->row_zero, b->row_zero);
    for (size_t i = 0; i < a->views; i++)
        CK_NEAR(a->angle_rad[i], b->angle_rad[i], ulp, 2e-15, "angle");
}

static const struct {
    tg_geometry geometry;
    double first_deg, step_deg, jitter_rad, row_step_mm;
    size_t rows;
    bool table; /* the angles need one */
} variants[] = {{TG_PARALLEL, 0, 0.36, 0, 0, 1, false},       {TG_PARALLEL, 33.3, -0.7, 0, 2.5, 3, false},
                {TG_PARALLEL, 5, 1, 0, 0.3, 1, false},        {TG_FAN_EQUIANGULAR, 270, 360.0 / 7, 0, 0, 1, false},
                {TG_FAN_EQUIANGULAR, 0, 1, 1e-5, 0, 1, true}, {TG_FAN_EQUISPACED, -720, 1.0 / 3, 1e-8, 1, 2, true},
                {TG_FAN_EQUISPACED, 180, 0, 0, 0, 1, true}};
enum { VARIANTS = sizeof variants / sizeof *variants };

static tg_scan make_scan(int i)
{
    tg_scan scan = {.geometry = variants[i].geometry,
                    .channels = 5,
                    .views = 7,
                    .rows = variants[i].rows,
                    .channel_step = 1.0 / 3,
                    .channel_zero = 1.9371,
                    .row_step_mm = variants[i].row_step_mm,
                    .row_zero = variants[i].rows > 1 ? 0.3125 : 0};
    scan.angle_rad = tg_alloc(scan.views, sizeof *scan.angle_rad);
    for (size_t k = 0; k < scan.views; k++)
        scan.angle_rad[k] = (variants[i].first_deg + (double)k * variants[i].step_deg) * RAD +
                            variants[i].jitter_rad * (double)(k * k % 3);
    if (scan.geometry == TG_FAN_EQUIANGULAR) scan.channel_step = 0.05 * RAD;
    if (scan.geometry != TG_PARALLEL) {
        scan.source_axis_mm = 541.1;
        scan.source_detector_mm = 949.075;
    }
    return scan;
}

static tg_sinogram make_sinogram(int i)
{
    tg_error e = {0};
    tg_scan scan = make_scan(i);
    tg_sinogram s;
    CK_OK(tg_sinogram_create(&scan, &s, &e));
    for (size_t k = 0; k < scan.channels * scan.views * scan.rows; k++)
        s.v[k] = (float)k / 7;
    s.v[1] = 1e-41f; /* subnormal */
    s.v[2] = -0.0f;
    if (i % 2) set_facts(&s.facts);
    tg_scan_free(&scan);
    return s;
}

static tg_provenance make_provenance(void)
{
    static tg_input input[] = {{NULL, NULL}, {NULL, NULL}};
    static char path[] = "scans/\xc3\xa9t\xc3\xa9 2026.fits", sum[] = "DATASUM 2503531142", other[] = "phantom.yaml",
                crc[] = "CRC-32 3610a686";
    static tg_inputs inputs = {input, 2};
    input[0] = (tg_input){path, sum};
    input[1] = (tg_input){other, crc};
    return (tg_provenance){
        "reconstruct", "method=fbp kernel=hann@0.8 pixels=512 field=250 centre=0,0 name='it''s long' mu_water=0.0193",
        &inputs};
}

START_TEST(sinogram_round_trip)
{
    tg_error e = {0};
    tg_sinogram s = make_sinogram(_i), back;
    const tg_provenance made = make_provenance();
    CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, &made, &e));
    CK_OK(tg_fits_read_sinogram(scratch("s.fits"), &back, &e));
    ck_assert_uint_eq(e.count, 0);
    same_scan(&s.scan, &back.scan);
    same_facts(&s.facts, &back.facts);
    ck_assert_mem_eq(s.v, back.v, s.scan.channels * s.scan.views * s.scan.rows * sizeof *s.v);
    size_t n;
    char *bytes = whole(scratch("s.fits"), &n);
    ck_assert_msg((n > data_at(bytes, 0) + 2880) == variants[_i].table, "a table of angles only where they need one");
    tg_free(bytes);
    ck_assert_uint_eq(scratch_files(), 1);
    tg_sinogram_free(&s);
    tg_sinogram_free(&back);
}
END_TEST

static tg_image make_image(int i)
{
    static const double centre[2] = {12.5, -7.25};
    tg_error e = {0};
    tg_grid g = tg_grid_square(6, 250, centre);
    tg_image image;
    if (i == 2) g.first_mm[2] = -12.5, g.step_mm[2] = 1.0 / 3; /* one slice off the plane of the source */
    if (i % 2) g = (tg_grid){{4, 3, 5}, {0.7, 0.8, 2.5}, {-3.3, 1.0 / 3, -5}};
    CK_OK(tg_image_create(&g, i % 3 ? TG_HU : TG_PER_MM, &image, &e));
    for (size_t k = 0; k < tg_grid_samples(&g); k++)
        image.v[k] = (float)k - 3.3f;
    image.v[5] = NAN;
    if (i < VARIANTS) {
        image.scan = make_scan(i);
        set_facts(&image.facts);
        image.method = tg_copy_text("fbp");
        image.kernel = tg_copy_text("kernels/of a path that is longer than the sixty-eight characters of one card.csv");
    }
    return image;
}

START_TEST(image_round_trip)
{
    tg_error e = {0};
    tg_image image = make_image(_i), back;
    const tg_provenance made = make_provenance();
    CK_OK(tg_fits_write_image(scratch("i.fits"), &image, _i % 2 ? &made : NULL, &e));
    CK_OK(tg_fits_read_image(scratch("i.fits"), &back, &e));
    ck_assert_uint_eq(e.count, 0);
    ck_assert_int_eq(image.unit, back.unit);
    for (int a = 0; a < 3; a++) {
        ck_assert_uint_eq(image.grid.n[a], back.grid.n[a]);
        ck_assert_double_eq(image.grid.step_mm[a], back.grid.step_mm[a]);
        /* kept as a pixel number: rounded at the size of the grid */
        CK_NEAR(back.grid.first_mm[a], image.grid.first_mm[a], 4e-16, 4e-16 * image.grid.step_mm[a], "first pixel");
    }
    for (size_t k = 0; k < tg_grid_samples(&image.grid); k++)
        ck_assert_msg(k == 5 ? isnan(back.v[k]) : image.v[k] == back.v[k], "pixel %zu", k);
    ck_assert(isinf(back.least) && isinf(back.most));
    ck_assert_pstr_eq(image.method, back.method);
    ck_assert_pstr_eq(image.kernel, back.kernel);
    same_facts(&image.facts, &back.facts);
    same_scan(&image.scan, &back.scan);
    tg_image_free(&image);
    tg_image_free(&back);
}
END_TEST

START_TEST(same_bytes_twice)
{
    tg_error e = {0};
    size_t n[2];
    char *bytes[2];
    for (int i = 0; i < 2; i++) {
        tg_sinogram s = make_sinogram(5);
        const tg_provenance made = make_provenance();
        CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, &made, &e));
        bytes[i] = whole(scratch("s.fits"), &n[i]);
        tg_sinogram_free(&s);
        if (!i) sleep(1); /* a time stamp would show */
    }
    ck_assert_uint_eq(n[0], n[1]);
    ck_assert_mem_eq(bytes[0], bytes[1], n[0]);
    tg_free(bytes[0]);
    tg_free(bytes[1]);
}
END_TEST

/* Ones' complement sum of big-endian words, carries folded back in (FITS 4.0, appendix J). */
static uint32_t sum_words(const char *bytes, size_t n)
{
    uint64_t sum = 0;
    for (size_t i = 0; i < n; i += 4) {
        uint64_t word = 0;
        for (size_t k = 0; k < 4; k++)
            word = word << 8 | (unsigned char)bytes[i + k];
        sum += word;
    }
    while (sum >> 32)
        sum = (sum & 0xffffffff) + (sum >> 32);
    return (uint32_t)sum;
}

START_TEST(sums)
{
    tg_error e = {0};
    tg_sinogram s = make_sinogram(4); /* two HDUs, one block of data each */
    size_t n;
    char text[16], card[64];
    CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, NULL, &e));
    char *bytes = whole(scratch("s.fits"), &n);
    const size_t data = data_at(bytes, 0), second = data + 2880;
    ck_assert_uint_eq(n, data_at(bytes, second) + 2880);
    ck_assert_uint_eq(sum_words(bytes, second), 0xffffffff);
    ck_assert_uint_eq(sum_words(bytes + second, n - second), 0xffffffff);
    CK_OK(tg_fits_datasum(scratch("s.fits"), text, &e));
    snprintf(card, sizeof card, "%u", sum_words(bytes + data, 2880));
    ck_assert_str_eq(text, card);
    snprintf(card, sizeof card, "DATASUM = '%s", text);
    ck_assert_ptr_nonnull(strstr(bytes, card));
    tg_free(bytes);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(damaged)
{
    tg_error e = {0};
    tg_sinogram s = make_sinogram(4), back;
    for (int i = 0; i < 2; i++) { /* the samples, then the table of angles */
        e = (tg_error){0};
        CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, NULL, &e));
        size_t n;
        char *bytes = whole(scratch("s.fits"), &n);
        const size_t data = data_at(bytes, 0), table = data_at(bytes, data + 2880);
        tg_free(bytes);
        FILE *file = fopen(scratch("s.fits"), "r+b");
        fseek(file, (long)(i ? table + 3 : data + 40), SEEK_SET);
        fputc(0x11, file);
        fclose(file);
        ck_assert_int_eq(tg_fits_read_sinogram(scratch("s.fits"), &back, &e), TG_INPUT);
        ck_assert_uint_eq(e.count, 1);
        ck_assert(says(&e, "DATASUM") && says(&e, "export it again"));
        ck_assert_ptr_null(back.v);
    }
    tg_sinogram_free(&s);
}
END_TEST

/* fitsverify reports neither errors nor warnings on any variant. */
START_TEST(conformity)
{
    tg_error e = {0};
    char command[256];
    if (system("command -v fitsverify >/dev/null 2>&1") != 0) return;
    const tg_provenance made = make_provenance();
    for (int i = 0; i < VARIANTS; i++) {
        char name[32];
        tg_sinogram s = make_sinogram(i);
        tg_image image = make_image(i);
        snprintf(name, sizeof name, "s%d.fits", i);
        CK_OK(tg_fits_write_sinogram(scratch(name), &s, &made, &e));
        snprintf(name, sizeof name, "i%d.fits", i);
        CK_OK(tg_fits_write_image(scratch(name), &image, &made, &e));
        tg_sinogram_free(&s);
        tg_image_free(&image);
    }
    snprintf(command, sizeof command, "test $(fitsverify -q %s/*.fits | grep -c '^verification OK') = %d",
             scratch_folder, 2 * VARIANTS);
    ck_assert_int_eq(system(command), 0);
}
END_TEST

/* A file cut anywhere before its end is refused, never read short, its table of angles included. */
START_TEST(cut)
{
    tg_error e = {0};
    tg_sinogram s = make_sinogram(4), back;
    size_t n;
    CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, NULL, &e));
    char *bytes = whole(scratch("s.fits"), &n);
    for (size_t keep = 0; keep < n; keep += 8) {
        FILE *out = fopen(scratch("cut.fits"), "wb");
        fwrite(bytes, 1, keep, out);
        fclose(out);
        e = (tg_error){0};
        const tg_code code = tg_fits_read_sinogram(scratch("cut.fits"), &back, &e);
        ck_assert_msg(code == TG_INPUT && e.count == 1, "cut to %zu bytes: %s", keep, e.message[0].what);
    }
    tg_free(bytes);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(unwritable)
{
    tg_error e = {0};
    tg_sinogram s = make_sinogram(0);
    ck_assert_int_eq(tg_fits_write_sinogram(scratch("no/folder/s.fits"), &s, NULL, &e), TG_USAGE);
    ck_assert(says(&e, "folder does not exist"));
    e = (tg_error){0};
    if (!access("/dev/full", W_OK)) {
        ck_assert_int_eq(tg_fits_write_sinogram("/dev/full", &s, NULL, &e), TG_USAGE);
        ck_assert(says(&e, "is not a plain file"));
    }
    ck_assert_uint_eq(scratch_files(), 0);
    tg_sinogram_free(&s);
}
END_TEST

Suite *suite_fits_written(void);
Suite *suite_fits_written(void)
{
    SUITE_BEGIN("fits_written", 30);
    tcase_add_checked_fixture(tcase, scratch_begin, scratch_end);
    tcase_add_loop_test(tcase, sinogram_round_trip, 0, VARIANTS);
    tcase_add_loop_test(tcase, image_round_trip, 0, VARIANTS + 2);
    tcase_add_test(tcase, same_bytes_twice);
    tcase_add_test(tcase, sums);
    tcase_add_test(tcase, damaged);
    tcase_add_test(tcase, conformity);
    tcase_add_test(tcase, cut);
    tcase_add_test(tcase, unwritable);
    return suite;
}
