#include "io/fits_file.h"
#include "io/memory.h"

#include <math.h>
#include <strings.h>

/* Units of attenuation, in 1/mm; FITS writes them without a solidus where it can. */
static const tg_fits_unit attenuations[] = {{"mm-1", 1},     {"1/mm", 1},       {"mm**-1", 1},  {"mm**(-1)", 1},
                                            {"mm^-1", 1},    {"/mm", 1},        {"cm-1", 0.1},  {"1/cm", 0.1},
                                            {"cm**-1", 0.1}, {"cm**(-1)", 0.1}, {"cm^-1", 0.1}, {"/cm", 0.1},
                                            {"m-1", 1e-3},   {"1/m", 1e-3},     {NULL, 0}};

/* @param size  of the file's unit in ours */
static tg_code read_unit(tg_fits *f, tg_unit *unit, double *size)
{
    char word[TG_FITS_WORD];
    const tg_code code = tg_fits_text(f, "BUNIT", word, sizeof word);
    if (code != TG_OK) return code;
    const bool hu = !strcasecmp(word, "HU");
    *unit = hu ? TG_HU : TG_PER_MM;
    *size = hu ? 1 : tg_fits_unit_size(attenuations, word);
    if (!isnan(*size)) return TG_OK;
    return tg_fail(f->e, TG_INPUT, f->path, 0, "BUNIT is %s%s%s; write 'HU' or 'mm-1'", word[0] ? "'" : "missing", word,
                   word[0] ? "'" : "");
}

/* What an integer pixel type can hold, in the image's unit. */
static tg_code read_range(tg_fits *f, double size, double *least, double *most)
{
    tg_code code = TG_OK;
    double scale = 1, zero = 0;
    if (f->bitpix < 0) return TG_OK;
    TG_TRY(tg_fits_number(f, "BSCALE", &scale));
    TG_TRY(tg_fits_number(f, "BZERO", &zero));
    const double low = f->bitpix == 8 ? 0 : -ldexp(1, f->bitpix - 1);
    const double high = f->bitpix == 8 ? 255 : ldexp(1, f->bitpix - 1) - 1;
    const double a = (zero + scale * low) * size, b = (zero + scale * high) * size;
    /* one float further in: the samples are rounded to floats on their way */
    *least = (double)nextafterf((float)fmin(a, b), INFINITY);
    *most = (double)nextafterf((float)fmax(a, b), -INFINITY);
done:
    return code;
}

static tg_code refuse_rotation(tg_fits *f)
{
    static const char *const keys[] = {"PC1_2", "PC2_1", "CD1_2", "CD2_1", "CROTA2"};
    for (size_t i = 0; i < sizeof keys / sizeof *keys; i++) {
        double v = 0;
        const tg_code code = tg_fits_number(f, keys[i], &v);
        if (code != TG_OK) return code;
        if (v != 0) return tg_fail(f->e, TG_INPUT, f->path, 0, "%s turns the axes; resample along x and y", keys[i]);
    }
    return TG_OK;
}

/* A slice without a third axis: through the source and as thick as its pixels, unless it says otherwise. */
static tg_code read_plane(tg_fits *f, tg_grid *g)
{
    tg_code code = TG_OK;
    g->first_mm[2] = 0;
    g->step_mm[2] = fabs(g->step_mm[0]);
    TG_TRY(tg_fits_number(f, "ZPLANE", &g->first_mm[2]));
    TG_TRY(tg_fits_number(f, "ZSTEP", &g->step_mm[2]));
    if (!(g->step_mm[2] > 0)) code = tg_fail(f->e, TG_INPUT, f->path, 0, "ZSTEP is not greater than 0");
done:
    return code;
}

static tg_code read_grid(tg_fits *f, tg_grid *g)
{
    static const char *const types[] = {"X", "Y", "Z"};
    tg_code code = refuse_rotation(f);
    for (int i = 0; i < 3 && code == TG_OK; i++) {
        g->n[i] = f->n[i];
        if (i >= f->axes) continue;
        tg_fits_axis axis = {types[i], tg_fits_lengths, "pixel size", tg_fits_middle(f->n[i]), 0, NAN};
        code = tg_fits_axis_of(f, i + 1, &axis);
        g->step_mm[i] = axis.step;
        g->first_mm[i] = -tg_fits_axis_zero(&axis) * axis.step;
    }
    return code != TG_OK || f->axes == 3 ? code : read_plane(f, g);
}

static void swap(float *a, float *b)
{
    const float was = *a;
    *a = *b;
    *b = was;
}

/* To steps > 0: pixel i of an axis changes place with pixel n - 1 - i. */
static void normalise(tg_image *image)
{
    tg_grid *g = &image->grid;
    const size_t stride[3] = {1, g->n[0], tg_grid_slice(g)}, all = tg_grid_samples(g);
    for (int a = 0; a < 3; a++) {
        const size_t n = g->n[a], line = stride[a] * n;
        if (g->step_mm[a] > 0) continue;
        for (size_t at = 0; at < all; at += line)
            for (size_t i = 0; i < n / 2; i++)
                for (size_t k = 0; k < stride[a]; k++)
                    swap(&image->v[at + i * stride[a] + k], &image->v[at + (n - 1 - i) * stride[a] + k]);
        g->first_mm[a] += (double)(n - 1) * g->step_mm[a];
        g->step_mm[a] = -g->step_mm[a];
    }
}

/* The scan of an image in keywords of its own, as its axes are X and Y. */
typedef struct {
    double channels, step, zero, views, first, view_step, rows, row_step, row_zero;
} scan_values;
static const struct {
    const char *key, *comment;
    size_t at;
} scan_keys[] = {{"CHANNELS", "channels of the scan", offsetof(scan_values, channels)},
                 {"CHANSTEP", "channel pitch, as SCANGEOM has it: mm or deg", offsetof(scan_values, step)},
                 {"CHANAXIS", "channel of the axis, counted from 1", offsetof(scan_values, zero)},
                 {"VIEWS", "views of the scan", offsetof(scan_values, views)},
                 {"VIEWFRST", "[deg] angle of the first view", offsetof(scan_values, first)},
                 {"VIEWSTEP", "[deg] step of the angles", offsetof(scan_values, view_step)},
                 {"ROWS", "rows of the scan", offsetof(scan_values, rows)},
                 {"ROWSTEP", "[mm] distance of rows", offsetof(scan_values, row_step)},
                 {"ROWMID", "row of z = 0, counted from 1", offsetof(scan_values, row_zero)}};
enum { SCAN_KEYS = sizeof scan_keys / sizeof *scan_keys };

static bool is_count(double v)
{
    return v >= 1 && v <= 1 << 20 && v == rint(v);
}

/* The angles stand in another HDU: read last. An image without SCANGEOM has no known scan. */
static tg_code read_scan(tg_fits *f, tg_scan *scan)
{
    tg_code code = TG_OK;
    char word[TG_FITS_WORD];
    scan_values v = {NAN, NAN, NAN, NAN, NAN, NAN, NAN, NAN, NAN};
    TG_TRY(tg_fits_text(f, "SCANGEOM", word, sizeof word));
    if (!word[0]) goto done;
    TG_TRY(tg_fits_source(f, scan));
    for (size_t i = 0; i < SCAN_KEYS; i++) {
        double *to = (double *)(void *)((char *)&v + scan_keys[i].at);
        TG_TRY(tg_fits_number(f, scan_keys[i].key, to));
        if (isnan(*to))
            TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "%s is missing: SCANGEOM announces a scan (%s)",
                           scan_keys[i].key, scan_keys[i].comment));
    }
    if (!is_count(v.channels) || !is_count(v.views) || !is_count(v.rows) || !(v.step > 0) || !(v.row_step >= 0))
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0,
                       "CHANNELS, VIEWS and ROWS must be whole numbers of 1 to %d, "
                       "CHANSTEP greater than 0, ROWSTEP 0 or greater",
                       1 << 20));
    scan->channels = (size_t)v.channels;
    scan->views = (size_t)v.views;
    scan->rows = (size_t)v.rows;
    scan->channel_step = v.step * (scan->geometry == TG_FAN_EQUIANGULAR ? TG_DEGREE : 1);
    scan->channel_zero = v.zero - 1;
    scan->row_step_mm = v.row_step;
    scan->row_zero = v.row_zero - 1;
    TG_TRY(tg_fits_view_angles(f, v.first, v.view_step, scan));
done:
    return code;
}

static void put_scan(tg_fits *f, const tg_scan *scan)
{
    scan_values v = {(double)scan->channels, scan->channel_step, scan->channel_zero + 1, (double)scan->views, 0, 0,
                     (double)scan->rows,     scan->row_step_mm,  scan->row_zero + 1};
    if (!scan->channels) return;
    if (scan->geometry == TG_FAN_EQUIANGULAR) v.step = tg_fits_degrees(scan->channel_step);
    tg_fits_put_source(f, scan);
    tg_fits_put_regular(f, scan, &v.first, &v.view_step);
    for (size_t i = 0; i < SCAN_KEYS; i++)
        tg_fits_put_number(f, scan_keys[i].key, *(const double *)(const void *)((const char *)&v + scan_keys[i].at),
                           scan_keys[i].comment);
}

static tg_code read_word(tg_fits *f, const char *key, char **out)
{
    char text[TG_FITS_LONG];
    const tg_code code = tg_fits_text(f, key, text, sizeof text);
    if (code != TG_OK || !text[0]) return code;
    *out = tg_copy_text(text);
    return *out ? TG_OK : tg_no_memory(f->e, 1, sizeof text);
}

static tg_code read_samples(tg_fits *f, tg_image *image, double size)
{
    const tg_code code = tg_fits_samples(f, image->v);
    for (size_t i = 0; code == TG_OK && i < tg_grid_samples(&image->grid); i++)
        image->v[i] = isfinite(image->v[i]) ? (float)((double)image->v[i] * size) : NAN;
    return code;
}

tg_code tg_fits_read_image(const char *path, tg_image *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_fits f;
    tg_grid grid;
    tg_unit unit;
    double size;
    *out = (tg_image){0};
    TG_TRY(tg_fits_open(&f, path, e));
    TG_TRY(tg_fits_refuse(&f, "CHANNEL", "is a sinogram; an image is expected here: reconstruct it first"));
    if (f.axes < 2) TG_TRY(tg_fail(e, TG_INPUT, path, 0, "has one axis; an image has two or three"));
    TG_TRY(read_unit(&f, &unit, &size));
    TG_TRY(read_grid(&f, &grid));
    TG_TRY(tg_image_create(&grid, unit, out, e));
    TG_TRY(read_range(&f, size, &out->least, &out->most));
    TG_TRY(tg_fits_facts(&f, &out->facts));
    TG_TRY(read_word(&f, "METHOD", &out->method));
    TG_TRY(read_word(&f, "KERNEL", &out->kernel));
    TG_TRY(read_samples(&f, out, size));
    TG_TRY(read_scan(&f, &out->scan));
    if (!out->scan.channels) TG_TRY(tg_fits_number(&f, "ZSTEP", &out->scan.row_step_mm)); /* all that is known of it */
    normalise(out);
done:
    tg_fits_close(&f);
    if (code != TG_OK) tg_image_free(out);
    return code;
}

static tg_fits_axis axis_of(const tg_grid *g, int i)
{
    static const char *const types[] = {"X", "Y", "Z"};
    /* the axis of rotation is the reference: first = (1 - pixel) step */
    return (tg_fits_axis){types[i], tg_fits_lengths, NULL, 1 - g->first_mm[i] / g->step_mm[i], 0, g->step_mm[i]};
}

tg_code tg_fits_write_image(const char *path, const tg_image *image, const tg_provenance *made, tg_error *e)
{
    const tg_grid *g = &image->grid;
    const int axes = g->n[2] > 1 ? 3 : 2;
    tg_fits f;
    const tg_code code = tg_fits_create(&f, path, axes, g->n, e);
    if (code != TG_OK) return code;
    tg_fits_put_text(&f, "BUNIT", image->unit == TG_HU ? "HU" : "mm-1", NULL);
    for (int i = 0; i < axes; i++) {
        const tg_fits_axis axis = axis_of(g, i);
        tg_fits_put_axis(&f, i + 1, &axis);
    }
    if (axes == 2) {
        tg_fits_put_number(&f, "ZPLANE", g->first_mm[2], "[mm] where the slice is");
        if (image->scan.channels || image->scan.row_step_mm > 0) /* else it is a guess, which is not stated */
            tg_fits_put_number(&f, "ZSTEP", g->step_mm[2], "[mm] how thick it is");
    }
    put_scan(&f, &image->scan);
    tg_fits_put_facts(&f, &image->facts);
    tg_fits_put_text(&f, "METHOD", image->method, "method of reconstruction");
    tg_fits_put_text(&f, "KERNEL", image->kernel, "kernel@cutoff, a fraction of Nyquist");
    tg_fits_put_made(&f, made);
    tg_fits_put_samples(&f, image->v);
    if (image->scan.channels) tg_fits_put_angles(&f, &image->scan);
    return tg_fits_finish(&f);
}
