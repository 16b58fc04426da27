/* Any bytes as a FITS file: read as what it says it is, and as what it does not. */
#include "io/fits.h"

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

/* A refusal says why, once, in one line; a success leaves only warnings. */
static void check(tg_code code, const tg_error *e)
{
    if (code != e->code || (code != TG_OK && !e->count)) abort();
    for (size_t i = 0; i < e->count && i < TG_MESSAGES; i++)
        if (!e->message[i].what[0]) abort();
}

static void read_sinogram(const char *path)
{
    tg_error e = {0};
    tg_sinogram s;
    const tg_code code = tg_fits_read_sinogram(path, &s, &e);
    check(code, &e);
    if (code != TG_OK) return;
    const size_t n = s.scan.channels * s.scan.views * s.scan.rows;
    for (size_t i = 0; i < n; i++)
        if (!isfinite(s.v[i])) abort();
    for (size_t i = 0; i < s.scan.views; i++)
        if (!isfinite(s.scan.angle_rad[i])) abort();
    if (!(s.scan.channel_step > 0) || !isfinite(s.scan.channel_zero) || s.scan.row_step_mm < 0) abort();
    tg_sinogram_free(&s);
}

static void read_image(const char *path)
{
    tg_error e = {0};
    tg_image image;
    const tg_code code = tg_fits_read_image(path, &image, &e);
    check(code, &e);
    if (code != TG_OK) return;
    for (int a = 0; a < 3; a++)
        if (!(image.grid.step_mm[a] > 0) || !isfinite(image.grid.first_mm[a])) abort();
    volatile float last = image.v[tg_grid_samples(&image.grid) - 1];
    (void)last;
    tg_image_free(&image);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    char path[] = "/dev/shm/tomogauge-fuzz-XXXXXX"; /* cfitsio reads files */
    const int file = mkstemp(path);
    if (file < 0) return 0;
    FILE *out = fdopen(file, "wb");
    if (!out) abort();
    fwrite(data, 1, size, out);
    fclose(out);
    tg_error e = {0};
    tg_fits_kind kind;
    check(tg_fits_what(path, &kind, &e), &e);
    read_sinogram(path);
    read_image(path);
    remove(path);
    return 0;
}
