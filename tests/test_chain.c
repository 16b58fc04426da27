/* From a description to CT numbers: noiseless scans of the rods disc, in every geometry and against every sign, give
 * back the CT numbers of its materials (truth: the attenuation that went into the line integrals). */
#include "io/fits.h"
#include "phantoms/simulate.h"
#include "recon/reconstruct.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <fitsio.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { PIXELS = 512 };
static const double tolerance_hu = 0.1, edge_gap_mm = 10;

/* Channel pitch at most 0.5 mm at the axis, 984 views. */
static const char parallel[] = "geometry: parallel\nchannels: 500\npitch: 0.45\n";
static const char equiangular[] =
    "geometry: fan-equiangular\nsource-axis: 570\nsource-detector: 1040\nchannels: 520\npitch: 0.045\n";
static const char equispaced[] =
    "geometry: fan-equispaced\nsource-axis: 570\nsource-detector: 1040\nchannels: 520\npitch: 0.85\n";

static const struct {
    const char *name, *geometry, *rest;
    bool reversed; /* channels of the file count the other way */
} cases[] = {
    {"parallel, 180 degrees, odd start", parallel, "arc: 180\nstart: 33.7\naxis-channel: 254.3\n", false},
    {"parallel, 360 degrees, clockwise", parallel, "direction: clockwise\nstart: -121.1\n", false},
    {"parallel, 180 degrees, reversed channels", parallel, "arc: 180\naxis-channel: 246.2\n", true},
    {"equiangular, off-centre axis", equiangular, "start: 211.9\naxis-channel: 264.75\n", false},
    {"equiangular, clockwise, reversed channels", equiangular, "direction: clockwise\naxis-channel: 258.1\n", true},
    {"equispaced, odd start", equispaced, "start: 77.3\naxis-channel: 257.25\n", false},
    {"equispaced, clockwise, reversed channels", equispaced, "direction: clockwise\nstart: 5.5\naxis-channel: 262.4\n",
     true},
};

static void turn_channels_round(const char *path)
{
    fitsfile *f;
    int status = 0;
    long n[2];
    double step, zero;
    fits_open_diskfile(&f, path, READWRITE, &status);
    fits_get_img_size(f, 2, n, &status);
    ck_assert_int_eq(status, 0);
    float *row = malloc((size_t)n[0] * sizeof *row);
    for (long view = 0; view < n[1]; view++) {
        fits_read_img(f, TFLOAT, 1 + view * n[0], n[0], NULL, row, NULL, &status);
        for (long i = 0; i < n[0] / 2; i++) {
            const float kept = row[i];
            row[i] = row[n[0] - 1 - i];
            row[n[0] - 1 - i] = kept;
        }
        fits_write_img(f, TFLOAT, 1 + view * n[0], n[0], row, &status);
    }
    free(row);
    fits_read_key(f, TDOUBLE, "CDELT1", &step, NULL, &status);
    fits_read_key(f, TDOUBLE, "CRPIX1", &zero, NULL, &status);
    step = -step;
    zero = (double)n[0] + 1 - zero;
    fits_update_key(f, TDOUBLE, "CDELT1", &step, NULL, &status);
    fits_update_key(f, TDOUBLE, "CRPIX1", &zero, NULL, &status);
    fits_write_chksum(f, &status);
    fits_close_file(f, &status);
    ck_assert_int_eq(status, 0);
}

static double disc_mean(const tg_image *image, double x, double y, double radius_mm)
{
    double sum = 0, n = 0;
    for (size_t iy = 0; iy < image->grid.n[1]; iy++)
        for (size_t ix = 0; ix < image->grid.n[0]; ix++)
            if (hypot(tg_grid_mm(&image->grid, 0, (double)ix) - x, tg_grid_mm(&image->grid, 1, (double)iy) - y) <=
                radius_mm) {
                sum += (double)image->v[iy * image->grid.n[0] + ix];
                n++;
            }
    return sum / n;
}

static void check_discs(const tg_phantom *p, const tg_image *image, const char *name)
{
    tg_error e = {0};
    double mu[64];
    char what[160];
    ck_assert_uint_le(p->n_materials, 64);
    CK_OK(tg_phantom_mu(p, 70, mu, &e));
    const double water = image->facts.mu_water_per_mm.v;
    size_t rods = 0;
    double worst_rod = 0, worst_edge = 0;
    for (size_t i = 1; i < p->n_solids; i++) {
        const tg_solid *s = &p->solid[i];
        if (s->shape != TG_CYLINDER || s->half_mm[0] < 8) continue;
        rods++;
        const double found = disc_mean(image, s->centre_mm[0], s->centre_mm[1], 0.6 * s->half_mm[0]);
        const double truth = 1000 * (mu[s->material] / water - 1);
        worst_rod = fmax(worst_rod, fabs(found - truth));
        snprintf(what, sizeof what, "%s, %s against its material", name, s->name.v);
        CK_NEAR(found, truth, 0, tolerance_hu, what);
    }
    ck_assert_uint_ge(rods, 8);
    const double radius = p->solid[0].half_mm[0], at = radius - edge_gap_mm - 0.1 * radius;
    const double middle = disc_mean(image, 0, 0, 0.1 * radius);
    for (int k = 0; k < 4; k++) {
        const double edge = disc_mean(image, at * cos(k * M_PI / 2), at * sin(k * M_PI / 2), 0.1 * radius);
        worst_edge = fmax(worst_edge, fabs(edge - middle));
        snprintf(what, sizeof what, "%s, edge region %d against the middle", name, k);
        CK_NEAR(edge, middle, 0, tolerance_hu, what);
    }
    printf("%-42s rods within %.3f HU, centre to edge within %.3f HU\n", name, worst_rod, worst_edge);
}

START_TEST(ct_numbers_come_back)
{
    tg_error e = {0};
    tg_phantom p = {0};
    tg_scanner scanner = {0};
    tg_sinogram s = {0}, again = {0};
    tg_image image = {0};
    tg_recipe recipe = {0};
    char text[512];
    const char *path = scratch("chain.fits");
    CK_OK(tg_phantom_read("phantoms/rods-disc.yaml", &p, &e));
    const int n =
        snprintf(text, sizeof text, "scanner: test\n%s%sviews: 984\nenergy: 70\naverage: line-integrals\nsubrays: 5\n",
                 cases[_i].geometry, cases[_i].rest);
    CK_OK(tg_scanner_parse(text, (size_t)n, "scanner", &scanner, &e));
    CK_OK(tg_simulate(&p, &scanner, NULL, &s, NULL, &e));
    CK_OK(tg_fits_write_sinogram(path, &s, NULL, &e));
    if (cases[_i].reversed) turn_channels_round(path);
    CK_OK(tg_fits_read_sinogram(path, &again, &e));
    CK_OK(tg_fields_default(tg_recipe_fields, &recipe, &e));
    recipe.pixels.v = PIXELS;
    recipe.field_mm = (tg_number){212, 1};
    CK_OK(tg_reconstruct(&again, &recipe, NULL, &image, &e));
    ck_assert_int_eq(image.unit, TG_HU);
    check_discs(&p, &image, cases[_i].name);
    tg_fields_free(tg_recipe_fields, &recipe);
    tg_image_free(&image);
    tg_sinogram_free(&again);
    tg_sinogram_free(&s);
    tg_scanner_free(&scanner);
    tg_phantom_free(&p);
}
END_TEST

Suite *suite_chain(void);
Suite *suite_chain(void)
{
    SUITE_BEGIN("chain", 120);
    tcase_add_checked_fixture(tcase, scratch_begin, scratch_end);
    tcase_add_loop_test(tcase, ct_numbers_come_back, 0, sizeof cases / sizeof *cases);
    return suite;
}
