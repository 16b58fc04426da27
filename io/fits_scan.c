#include "io/fits_file.h"
#include "io/memory.h"
#include "io/spelling.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *const geometries = TG_GEOMETRIES;

/* A keyword that is one of several words. @param index  -1 where it is absent */
static tg_code choice(tg_fits *f, const char *key, const char *words, int *index)
{
    char word[TG_FITS_WORD], list[256];
    const tg_code code = tg_fits_text(f, key, word, sizeof word);
    *index = tg_word_index(word, words);
    if (code != TG_OK || *index >= 0 || !word[0]) return code;
    tg_words_list(words, " or ", list, sizeof list);
    return tg_fail(f->e, TG_INPUT, f->path, 0, "%s is '%s'; write %s", key, tg_show(word).text, list);
}

tg_code tg_fits_source(tg_fits *f, tg_scan *scan)
{
    tg_code code = TG_OK;
    int geometry = 0;
    TG_TRY(choice(f, "SCANGEOM", geometries, &geometry));
    if (geometry < 0) TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "SCANGEOM is missing; write one of: %s", geometries));
    scan->geometry = (tg_geometry)geometry;
    scan->source_axis_mm = scan->source_detector_mm = 0;
    if (scan->geometry == TG_PARALLEL) goto done;
    TG_TRY(tg_fits_number(f, "SRCAXIS", &scan->source_axis_mm));
    TG_TRY(tg_fits_number(f, "SRCDET", &scan->source_detector_mm));
    if (!(scan->source_axis_mm > 0))
        code = tg_fail(f->e, TG_INPUT, f->path, 0,
                       "SRCAXIS, the distance of source and axis in mm, is missing or not "
                       "greater than 0");
    else if (!(scan->source_detector_mm >= scan->source_axis_mm))
        code = tg_fail(f->e, TG_INPUT, f->path, 0,
                       "SRCDET, the distance of source and detector in mm, is missing or "
                       "less than SRCAXIS");
done:
    return code;
}

void tg_fits_put_source(tg_fits *f, const tg_scan *scan)
{
    char word[TG_WORD];
    tg_fits_put_text(f, "SCANGEOM", tg_word_at(geometries, (int)scan->geometry, word), NULL);
    if (scan->geometry == TG_PARALLEL) return;
    tg_fits_put_number(f, "SRCAXIS", scan->source_axis_mm, "[mm] source to axis");
    tg_fits_put_number(f, "SRCDET", scan->source_detector_mm, "[mm] source to detector");
}

tg_code tg_fits_facts(tg_fits *f, tg_facts *facts)
{
    for (const tg_field *field = tg_fact_fields; field->key; field++) {
        char text[TG_FITS_LONG] = "";
        double v = NAN;
        tg_code code =
            field->kind == TG_TEXT ? tg_fits_text(f, field->key, text, sizeof text) : tg_fits_number(f, field->key, &v);
        if (code == TG_OK && !isnan(v)) snprintf(text, sizeof text, "%.17g", v);
        if (code == TG_OK && text[0]) code = tg_field_set(field, facts, text, f->path, 0, f->e);
        if (code != TG_OK) return code;
    }
    return TG_OK;
}

void tg_fits_put_facts(tg_fits *f, const tg_facts *facts)
{
    for (const tg_field *field = tg_fact_fields; field->key; field++) {
        const void *value = (const char *)facts + field->at;
        char comment[64];
        snprintf(comment, sizeof comment, "%s%s%s%s", field->unit ? "[" : "", field->unit ? field->unit : "",
                 field->unit ? "] " : "", field->what);
        if (field->kind == TG_TEXT)
            tg_fits_put_text(f, field->key, ((const tg_text *)value)->v, comment);
        else if (!isnan(((const tg_number *)value)->v))
            tg_fits_put_number(f, field->key, ((const tg_number *)value)->v, comment);
    }
}

double tg_fits_degrees(double rad)
{
    char text[32];
    snprintf(text, sizeof text, "%.15g", rad / TG_DEGREE);
    return strtod(text, NULL);
}

static bool is_regular(const tg_scan *scan, double *first_deg, double *step_deg)
{
    const double *a = scan->angle_rad;
    const size_t n = scan->views;
    const double step = n > 1 ? tg_fits_degrees((a[n - 1] - a[0]) / (double)(n - 1)) : 1;
    *first_deg = tg_fits_degrees(a[0]);
    *step_deg = step != 0 ? step : 1; /* FITS wants a CDELT other than 0 */
    for (size_t i = 0; i < n; i++)
        if (!(fabs((*first_deg + (double)i * *step_deg) * TG_DEGREE - a[i]) <= 1e-9)) return false;
    return true;
}

void tg_fits_put_regular(tg_fits *f, const tg_scan *scan, double *first_deg, double *step_deg)
{
    if (!is_regular(scan, first_deg, step_deg)) tg_fits_put_text(f, "ANGLES", "irregular", "see the table ANGLES");
}

void tg_fits_put_angles(tg_fits *f, const tg_scan *scan)
{
    double first, step, *degrees;
    if (is_regular(scan, &first, &step)) return;
    if (TG_NEW(degrees, scan->views, f->e) != TG_OK) {
        f->code = TG_MACHINE;
        return;
    }
    for (size_t i = 0; i < scan->views; i++)
        degrees[i] = scan->angle_rad[i] / TG_DEGREE;
    tg_fits_put_column(f, "ANGLES", "ANGLE", "deg", scan->views, degrees);
    tg_free(degrees);
}

tg_code tg_fits_view_angles(tg_fits *f, double first_deg, double step_deg, tg_scan *scan)
{
    tg_code code = TG_OK;
    char unit[TG_FITS_WORD];
    bool table;
    double *a = NULL, size = 1;
    char expected[TG_FITS_WORD];
    TG_TRY(tg_fits_text(f, "ANGLES", expected, sizeof expected));
    TG_TRY(tg_fits_extension(f, "ANGLES", &table));
    if (expected[0] && !table)
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "is cut short: its extension ANGLES is not there"));
    TG_TRY(TG_NEW(a, scan->views, f->e));
    if (table) {
        TG_TRY(tg_fits_column(f, "ANGLE", scan->views, a, unit));
        if (unit[0]) size = tg_fits_unit_size(tg_fits_angles, unit);
        if (isnan(size))
            TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "column ANGLE is in '%s'; write degrees and 'deg'", unit));
    } else if (isnan(step_deg) && scan->views > 1) {
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0,
                       "neither the step of the angles nor an extension ANGLES is there; write CDELT2, in deg"));
    }
    for (size_t i = 0; i < scan->views; i++) {
        a[i] = (table ? a[i] * size : i ? first_deg + (double)i * step_deg : first_deg) * TG_DEGREE;
        if (!isfinite(a[i]))
            TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "the angle of view %zu is not a number", i + 1));
    }
    scan->angle_rad = a;
    a = NULL;
done:
    tg_free(a);
    return code;
}

/* What the samples mean. */
typedef enum { LINE_INTEGRAL, TRANSMISSION, COUNT } meaning;
static const char *const meanings = "line-integral transmission count"; /* in the order of the enum */

static tg_code read_meaning(tg_fits *f, meaning *m)
{
    int index;
    const tg_code code = choice(f, "SCANDATA", meanings, &index);
    if (code != TG_OK) return code;
    if (index < 0 && f->bitpix > 0)
        return tg_fail(f->e, TG_INPUT, f->path, 0, "SCANDATA is missing and the data are integers; write one of: %s",
                       meanings);
    if (index < 0) tg_warn(f->e, f->path, 0, "SCANDATA is missing: the data are taken as line integrals");
    *m = index < 0 ? LINE_INTEGRAL : (meaning)index;
    return TG_OK;
}

/* Where sample i of the file is, for people: counted from 1. */
static tg_code fail_at(tg_fits *f, const tg_scan *scan, size_t i, const char *what)
{
    const size_t channel = i % scan->channels, view = i / scan->channels % scan->views;
    return tg_fail(f->e, TG_INPUT, f->path, 0, "channel %zu, view %zu, row %zu: %s", channel + 1, view + 1,
                   i / scan->channels / scan->views + 1, what);
}

static size_t samples(const tg_scan *scan)
{
    return scan->channels * scan->views * scan->rows;
}

/* p = -ln(v / full) where v is at least `least`; answers how many samples were below. */
static size_t to_line_integrals(float *v, size_t n, double full, double least)
{
    size_t low = 0;
    for (size_t i = 0; i < n; i++) {
        const double sample = v[i];
        low += sample < least;
        v[i] = (float)-log(fmax(sample, least) / full);
    }
    return low;
}

/* Transmission: half a photon is known only where the photons are. */
static tg_code from_transmission(tg_fits *f, tg_sinogram *s, size_t *low)
{
    const double photons = s->facts.photons_per_ray.v;
    for (size_t i = 0; isnan(photons) && i < samples(&s->scan); i++)
        if (!(s->v[i] > 0))
            return fail_at(f, &s->scan, i,
                           "no transmission, so no line integral; write PHOTONS, photons per channel "
                           "and view, to have half a photon assumed");
    *low = to_line_integrals(s->v, samples(&s->scan), 1, isnan(photons) ? 0 : 0.5 / photons);
    return TG_OK;
}

/* An extension [channel, row]; `v` stays zero where an optional one is absent. */
static tg_code read_frame(tg_fits *f, const char *name, bool needed, const tg_scan *scan, float *v)
{
    bool found;
    const tg_code code = tg_fits_extension(f, name, &found);
    if (code != TG_OK) return code;
    if (!found && needed)
        return tg_fail(f->e, TG_INPUT, f->path, 0, "counts need an extension %s [channel, row]", name);
    if (!found) return TG_OK;
    if (!f->axes || f->n[0] != scan->channels || f->n[1] != scan->rows || f->n[2] != 1)
        return tg_fail(f->e, TG_INPUT, f->path, 0, "extension %s must be an image of %zu channels, %zu rows", name,
                       scan->channels, scan->rows);
    return tg_fits_samples(f, v);
}

/* Counts: p = -ln((count - DARK) / (AIR - DARK)). */
static tg_code from_counts(tg_fits *f, tg_sinogram *s, size_t *low)
{
    tg_code code = TG_OK;
    const size_t channels = s->scan.channels, views = s->scan.views, n = channels * s->scan.rows;
    float *air = NULL, *dark = NULL;
    TG_TRY(TG_NEW(air, n, f->e));
    TG_TRY(TG_NEW(dark, n, f->e));
    TG_TRY(read_frame(f, "AIR", true, &s->scan, air));
    TG_TRY(read_frame(f, "DARK", false, &s->scan, dark));
    for (size_t i = 0; i < n; i++) {
        const double full = (double)air[i] - (double)dark[i];
        if (!(full > 0.5 && isfinite(full)))
            TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0,
                           "AIR less DARK is %g at channel %zu, row %zu: it must exceed "
                           "half a photon",
                           full, i % channels + 1, i / channels + 1));
        for (size_t view = 0; view < views; view++) {
            float *v = s->v + (i / channels * views + view) * channels + i % channels;
            *v -= dark[i];
            *low += to_line_integrals(v, 1, full, 0.5);
        }
    }
done:
    tg_free(air);
    tg_free(dark);
    return code;
}

static tg_code read_samples(tg_fits *f, meaning m, tg_sinogram *s)
{
    tg_code code = TG_OK;
    size_t low = 0;
    TG_TRY(tg_fits_samples(f, s->v));
    for (size_t i = 0; i < samples(&s->scan); i++)
        if (!isfinite(s->v[i])) TG_TRY(fail_at(f, &s->scan, i, "not a number; repair it, or leave the view out"));
    if (m == TRANSMISSION) TG_TRY(from_transmission(f, s, &low));
    if (m == COUNT) TG_TRY(from_counts(f, s, &low));
    if (low) tg_warn(f->e, f->path, 0, "%zu samples below half a photon were taken as half a photon", low);
done:
    return code;
}

/* Reverse the order of n items of `size` floats. */
static void reverse(float *v, size_t n, size_t size)
{
    for (size_t i = 0; i < n / 2; i++)
        for (size_t k = 0; k < size; k++) {
            float *a = v + i * size + k, *b = v + (n - 1 - i) * size + k;
            const float swap = *a;
            *a = *b;
            *b = swap;
        }
}

/* To steps > 0: a coordinate does not change when the array and its step are both reversed. */
static void normalise(tg_sinogram *s)
{
    tg_scan *scan = &s->scan;
    if (scan->channel_step < 0) {
        for (size_t i = 0; i < scan->views * scan->rows; i++)
            reverse(s->v + i * scan->channels, scan->channels, 1);
        scan->channel_step = -scan->channel_step;
        scan->channel_zero = (double)(scan->channels - 1) - scan->channel_zero;
    }
    if (scan->row_step_mm < 0) {
        reverse(s->v, scan->rows, scan->views * scan->channels);
        scan->row_step_mm = -scan->row_step_mm;
        scan->row_zero = (double)(scan->rows - 1) - scan->row_zero;
    }
}

/* Geometry from the axes; the angles come later, from first_deg and step_deg or their own extension. */
static tg_code read_scan(tg_fits *f, tg_scan *scan, tg_fits_axis *view)
{
    tg_code code = TG_OK;
    TG_TRY(tg_fits_source(f, scan));
    const bool angle = scan->geometry == TG_FAN_EQUIANGULAR;
    tg_fits_axis channel = {
        "CHANNEL", angle ? tg_fits_angles : tg_fits_lengths, "channel pitch", tg_fits_middle(f->n[0]), 0, NAN};
    *view = (tg_fits_axis){"VIEW", tg_fits_angles, NULL, 1, 0, NAN};
    TG_TRY(tg_fits_axis_of(f, 1, &channel));
    TG_TRY(tg_fits_axis_of(f, 2, view));
    scan->channels = f->n[0];
    scan->views = f->n[1];
    scan->rows = f->n[2];
    scan->channel_step = channel.step * (angle ? TG_DEGREE : 1);
    scan->channel_zero = tg_fits_axis_zero(&channel);
    if (f->axes == 3) {
        tg_fits_axis row = {"ROW", tg_fits_lengths, "distance of rows", tg_fits_middle(f->n[2]), 0, NAN};
        TG_TRY(tg_fits_axis_of(f, 3, &row));
        scan->row_step_mm = row.step;
        scan->row_zero = tg_fits_axis_zero(&row);
    } else { /* a single row may say where it is and how wide */
        double middle = 1;
        TG_TRY(tg_fits_number(f, "ROWMID", &middle));
        TG_TRY(tg_fits_number(f, "ROWSTEP", &scan->row_step_mm));
        scan->row_zero = middle - 1;
        if (scan->row_step_mm < 0) TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "ROWSTEP is less than 0"));
    }
    const double last = tg_scan_coordinate(scan, (double)scan->channels - 1), first = tg_scan_coordinate(scan, 0);
    if (angle && !(fmax(fabs(first), fabs(last)) < 90 * TG_DEGREE))
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0,
                       "its channels reach %.4g degrees from the axis; CDELT1 or CUNIT1 is "
                       "wrong",
                       fmax(fabs(first), fabs(last)) / TG_DEGREE));
done:
    return code;
}

tg_code tg_fits_read_sinogram(const char *path, tg_sinogram *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_fits f;
    tg_scan scan = {0};
    tg_fits_axis view;
    meaning m = LINE_INTEGRAL;
    *out = (tg_sinogram){0};
    TG_TRY(tg_fits_open(&f, path, e));
    TG_TRY(tg_fits_refuse(&f, "X", "is an image; a sinogram is expected here"));
    if (f.axes < 2) TG_TRY(tg_fail(e, TG_INPUT, path, 0, "has one axis; a sinogram has channels and views"));
    TG_TRY(read_scan(&f, &scan, &view));
    TG_TRY(read_meaning(&f, &m));
    TG_TRY(tg_sinogram_create(&scan, out, e));
    TG_TRY(tg_fits_facts(&f, &out->facts));
    TG_TRY(read_samples(&f, m, out));
    TG_TRY(tg_fits_view_angles(&f, view.value + (1 - view.pixel) * (isnan(view.step) ? 0 : view.step), view.step,
                               &out->scan));
    normalise(out);
done:
    tg_fits_close(&f);
    if (code != TG_OK) tg_sinogram_free(out);
    return code;
}

tg_code tg_fits_write_sinogram(const char *path, const tg_sinogram *s, const tg_provenance *made, tg_error *e)
{
    const tg_scan *scan = &s->scan;
    const bool angle = scan->geometry == TG_FAN_EQUIANGULAR, stack = scan->rows > 1;
    const size_t n[3] = {scan->channels, scan->views, scan->rows};
    const tg_fits_axis channel = {"CHANNEL", angle ? tg_fits_angles : tg_fits_lengths,
                                  NULL,      scan->channel_zero + 1,
                                  0,         angle ? tg_fits_degrees(scan->channel_step) : scan->channel_step};
    const tg_fits_axis row = {"ROW", tg_fits_lengths, NULL, scan->row_zero + 1, 0, scan->row_step_mm};
    tg_fits_axis view = {"VIEW", tg_fits_angles, NULL, 1, 0, 0};
    tg_fits f;
    const tg_code code = tg_fits_create(&f, path, stack ? 3 : 2, n, e);
    if (code != TG_OK) return code;
    tg_fits_put_source(&f, scan);
    tg_fits_put_regular(&f, scan, &view.value, &view.step);
    tg_fits_put_text(&f, "SCANDATA", "line-integral", NULL);
    tg_fits_put_axis(&f, 1, &channel);
    tg_fits_put_axis(&f, 2, &view);
    if (stack) {
        tg_fits_put_axis(&f, 3, &row);
    } else if (scan->row_step_mm > 0) {
        tg_fits_put_number(&f, "ROWSTEP", scan->row_step_mm, "[mm] distance of rows");
        tg_fits_put_number(&f, "ROWMID", scan->row_zero + 1, "row of z = 0, counted from 1");
    }
    tg_fits_put_facts(&f, &s->facts);
    tg_fits_put_made(&f, made);
    tg_fits_put_samples(&f, s->v);
    tg_fits_put_angles(&f, scan);
    return tg_fits_finish(&f);
}
