#include "io/command.h"
#include "io/embedded.h"
#include "io/fits.h"
#include "io/memory.h"
#include "io/output.h"
#include "io/table.h"
#include "metrics/display.h"
#include "metrics/job.h"
#include "metrics/measure.h"
#include "metrics/words.h"
#include "recon/kernel.h"

#include <errno.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const double DEGREES = 57.295779513082320877; /* in a radian */

typedef struct {
    tg_text example;
    tg_number energy_kev, png, level, width, slice, bits;
} show_options;

static const tg_field show_fields[] = {
    TG_ROW(show_options, "energy", TG_NUMBER, energy_kev, .unit = "keV", .standard = "70",
           .what = "photon energy at which the materials of a phantom are told", .low = 1, .high = 1000),
    TG_ROW(show_options, "example", TG_TEXT, example, .what = "print a description to start from, such as rods-disc"),
    TG_ROW(show_options, "png", TG_SWITCH, png, .standard = "false",
           .what = "write a picture of one slice of an image"),
    TG_ROW(show_options, "level", TG_NUMBER, level,
           .what = "value in the middle of the picture's grey range; not given: the median of the body"),
    TG_ROW(show_options, "width", TG_NUMBER, width, .what = "width of the grey range; not given: 400 HU",
           .low = TG_ABOVE_ZERO, .high = DBL_MAX),
    TG_ROW(show_options, "slice", TG_INTEGER, slice,
           .what = "slice of the picture, counted from 1; not given: the middle one", .low = 1, .high = 0x1p53),
    TG_ROW(show_options, "bits", TG_CHOICE, bits, .words = "8 16", .standard = "8",
           .what = "bits per pixel of the picture"),
    {0},
};

static void line(const char *label, const char *format, ...) __attribute__((format(printf, 2, 3)));
static void line(const char *label, const char *format, ...)
{
    va_list args;
    va_start(args, format);
    printf("  %-19s ", label);
    vprintf(format, args);
    printf("\n");
    va_end(args);
}

/* Nothing else stands for zero: neither -0 nor the rest of a rounding. */
static double tidy(double v)
{
    return fabs(v) < 1e-9 ? 0 : v;
}

/* ---- scans and images ---- */

static void show_values(const float *v, size_t n, const char *unit)
{
    double least = INFINITY, most = -INFINITY, sum = 0;
    size_t good = 0;
    for (size_t i = 0; i < n; i++) {
        if (!isfinite(v[i])) continue;
        good++;
        sum += (double)v[i];
        least = fmin(least, (double)v[i]);
        most = fmax(most, (double)v[i]);
    }
    if (good) line("values", "%.6g to %.6g%s, mean %.6g", least, most, unit, sum / (double)good);
    if (good < n) line("without a value", "%zu of %zu", n - good, n);
}

/* Is the step from view to view always the same, to a millionth of it? */
static bool regular(const tg_scan *s)
{
    const double step = s->views > 1 ? s->angle_rad[1] - s->angle_rad[0] : 0;
    for (size_t i = 1; i < s->views; i++)
        if (fabs(s->angle_rad[i] - s->angle_rad[0] - (double)i * step) > 1e-6 * fabs(step)) return false;
    return true;
}

static void show_scan(const tg_scan *s)
{
    char geometry[TG_WORD] = "";
    tg_word_at(TG_GEOMETRIES, (int)s->geometry, geometry);
    line("geometry", "%s", geometry);
    if (s->geometry != TG_PARALLEL) {
        line("source to axis", "%.6g mm", s->source_axis_mm);
        line("source to detector", "%.6g mm", s->source_detector_mm);
    }
    line("channels", "%zu, pitch %.6g mm at the axis", s->channels, tg_scan_pitch_mm(s));
    line("centre of rotation", "channel %.6g", s->channel_zero + 1);
    line("field of view", "radius %.5g mm", tg_scan_field_radius_mm(s));
    const double first = s->angle_rad[0] * DEGREES, last = s->angle_rad[s->views - 1] * DEGREES;
    if (s->views == 1)
        line("views", "1 at %.6g deg", first);
    else if (regular(s))
        line("views", "%zu from %.6g deg in steps of %.6g deg", s->views, first,
             (last - first) / (double)(s->views - 1));
    else
        line("views", "%zu from %.6g to %.6g deg, uneven steps", s->views, first, last);
    if (s->rows > 1) line("rows", "%zu, pitch %.6g mm at the axis", s->rows, s->row_step_mm);
}

static void show_facts(const tg_facts *facts)
{
    bool first = true;
    for (const tg_field *f = tg_fact_fields; f->key; f++) {
        const void *value = (const char *)facts + f->at;
        char text[64] = "";
        if (f->kind == TG_TEXT) {
            const char *given = ((const tg_text *)value)->v;
            if (given) snprintf(text, sizeof text, "%s", tg_show(given).text);
        } else if (!isnan(((const tg_number *)value)->v)) {
            snprintf(text, sizeof text, "%.10g%s%s", ((const tg_number *)value)->v, f->unit ? " " : "",
                     f->unit ? f->unit : "");
        }
        if (!*text) continue;
        if (first) printf("Known of the scan\n");
        printf("  %s: %s\n", f->what, text);
        first = false;
    }
}

static tg_code show_sinogram(const char *path, tg_error *e)
{
    tg_sinogram s = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_fits_read_sinogram(path, &s, e));
    printf("Sinogram\n");
    show_scan(&s.scan);
    show_values(s.v, s.scan.channels * s.scan.views * s.scan.rows, "");
    show_facts(&s.facts);
done:
    tg_sinogram_free(&s);
    return code;
}

static void describe_image(const tg_image *image)
{
    const tg_grid *g = &image->grid;
    printf("Image\n");
    line("pixels", "%zu x %zu of %.6g x %.6g mm", g->n[0], g->n[1], g->step_mm[0], g->step_mm[1]);
    line("field", "%.6g x %.6g mm around (%.6g, %.6g) mm", (double)g->n[0] * g->step_mm[0],
         (double)g->n[1] * g->step_mm[1], tidy(tg_grid_mm(g, 0, 0.5 * ((double)g->n[0] - 1))),
         tidy(tg_grid_mm(g, 1, 0.5 * ((double)g->n[1] - 1))));
    if (g->n[2] > 1) line("slices", "%zu from z = %.6g mm in steps of %.6g mm", g->n[2], g->first_mm[2], g->step_mm[2]);
    if (image->scan.row_step_mm > 0) line("slice thickness", "%.6g mm", image->scan.row_step_mm);
    line("unit", "%s", tg_unit_text(image->unit));
    if (image->method) line("method", "%s", tg_show(image->method).text);
    if (image->kernel) line("kernel", "%s", tg_show(image->kernel).text);
    show_values(image->v, tg_grid_samples(g), image->unit == TG_HU ? " HU" : " 1/mm");
    if (image->scan.channels) {
        printf("Made from a scan\n");
        show_scan(&image->scan);
    }
    show_facts(&image->facts);
}

static tg_code write_picture(const tg_image *image, const tg_call *call, const show_options *o, tg_error *e)
{
    const char *input = call->operand[0];
    const size_t slices = image->grid.n[2];
    const size_t slice = o->slice.line ? (size_t)o->slice.v - 1 : slices / 2;
    tg_window w;
    tg_code code = TG_OK;
    if (slice >= slices) return tg_fail(e, TG_USAGE, NULL, 0, "--slice: the image has %zu of them", slices);
    TG_TRY(tg_output_allowed(call->output, call->force, &input, 1, e));
    TG_TRY(tg_display_window(image, slice, &w, e));
    if (o->level.line) w.level = o->level.v;
    if (o->width.line) w.width = o->width.v;
    w.bits = o->bits.v != 0 ? 16 : 8;
    if (!call->check) TG_TRY(tg_png_write(call->output, image, slice, &w, e));
    printf("%s: slice %zu of %zu, level %.5g, width %.5g %s\n", call->output, slice + 1, slices, w.level, w.width,
           tg_unit_text(image->unit));
done:
    return code;
}

static tg_code show_image(const tg_call *call, const show_options *o, tg_error *e)
{
    tg_image image = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_fits_read_image(call->operand[0], &image, e));
    if (o->png.v != 0)
        TG_TRY(write_picture(&image, call, o, e));
    else
        describe_image(&image);
done:
    tg_image_free(&image);
    return code;
}

static tg_code show_fits(const tg_call *call, const show_options *o, tg_error *e)
{
    const char *path = call->operand[0];
    tg_fits_kind kind;
    tg_code code = TG_OK;
    TG_TRY(tg_fits_what(path, &kind, e));
    if (kind == TG_FITS_OTHER) return tg_fail(e, TG_INPUT, path, 0, "holds neither a sinogram nor an image");
    if (kind == TG_FITS_IMAGE) return show_image(call, o, e);
    if (o->png.v != 0) return tg_fail(e, TG_USAGE, path, 0, "is a sinogram; --png draws images: reconstruct it first");
    code = show_sinogram(path, e);
done:
    return code;
}

/* ---- descriptions ---- */

static void fill_solid(const tg_phantom *p, const tg_solid *s, tg_row *row)
{
    const double *c = s->centre_mm, *h = s->half_mm;
    tg_cell(row->cell[0], "%s", tg_show(s->name.v).text);
    tg_word_at(TG_SHAPES, (int)s->shape, row->cell[1]);
    tg_cell(row->cell[2], "%s", tg_show(p->material[s->material].name.v).text);
    tg_cell(row->cell[3], "%.5g, %.5g, %.5g", tidy(c[0]), tidy(c[1]), tidy(c[2]));
    tg_cell(row->cell[4], "%.5g, %.5g, %.5g", 2 * h[0], 2 * h[1], 2 * h[2]);
    const double tilt = acos(fmin(fabs(s->turn[2][2]), 1)) * DEGREES; /* of the own z axis, which has no sense */
    if (tilt > 1e-3) tg_cell(row->cell[5], "%.3g deg", tilt);
}

static tg_code show_solids(const tg_phantom *p, tg_error *e)
{
    static const tg_row head = {{"solid", "shape", "material", "centre [mm]", "size [mm]", "tilt"}};
    tg_row *row;
    const tg_code code = TG_NEW(row, p->n_solids, e);
    if (code != TG_OK) return code;
    for (size_t i = 0; i < p->n_solids; i++)
        fill_solid(p, &p->solid[i], &row[i]);
    printf("\n");
    tg_table_print(stdout, &head, row, p->n_solids);
    tg_free(row);
    return TG_OK;
}

static tg_code show_materials(const tg_phantom *p, double energy_kev, tg_error *e)
{
    tg_row head = {{"material", "density [g/cm3]"}}, *row = NULL;
    double *mu = NULL, water;
    tg_code code = TG_OK;
    TG_TRY(TG_NEW(row, p->n_materials, e));
    TG_TRY(TG_NEW(mu, p->n_materials, e));
    TG_TRY(tg_phantom_mu(p, energy_kev, mu, e));
    TG_TRY(tg_water_mu(energy_kev, &water, e));
    tg_cell(head.cell[2], "at %.5g keV [1/mm]", energy_kev);
    tg_cell(head.cell[3], "CT number [HU]");
    for (size_t i = 0; i < p->n_materials; i++) {
        tg_cell(row[i].cell[0], "%s", tg_show(p->material[i].name.v).text);
        if (p->material[i].n) tg_cell(row[i].cell[1], "%.5g", p->material[i].density_g_cm3);
        tg_cell(row[i].cell[2], "%.6f", mu[i]);
        tg_cell(row[i].cell[3], "%.1f", 1000 * (mu[i] - water) / water);
    }
    printf("\n");
    tg_table_print(stdout, &head, row, p->n_materials);
done:
    tg_free(row);
    tg_free(mu);
    return code;
}

static tg_code show_phantom(const char *path, const show_options *o, tg_error *e)
{
    tg_phantom p = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_phantom_read(path, &p, e));
    printf("Phantom %s: %zu solids of %zu materials; the later displaces the earlier\n", tg_show(p.name.v).text,
           p.n_solids, p.n_materials);
    TG_TRY(show_solids(&p, e));
    TG_TRY(show_materials(&p, o->energy_kev.v, e));
done:
    tg_phantom_free(&p);
    return code;
}

static tg_code show_scanner(const char *path, tg_error *e)
{
    tg_scanner s = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_scanner_read(path, &s, e));
    printf("Scanner %s\n", tg_show(s.name.v).text);
    show_scan(&s.scan);
    line("energy", "%.6g keV", s.energy_kev);
    line("aperture", "%.5g of the pitch, %d rays, averaging %s", s.aperture, s.subrays,
         s.average_lines ? "line integrals" : "intensities");
    if (isnan(s.photons_per_ray))
        line("noise", "none");
    else
        line("photons", "%.6g per channel and view, seed %.0f", s.photons_per_ray, s.seed);
done:
    tg_scanner_free(&s);
    return code;
}

static void fill_check(const tg_check *c, tg_row *row)
{
    tg_cell(row->cell[0], "%s", tg_show(c->measure.v).text);
    tg_cell(row->cell[1], "%s", tg_show(tg_check_solid(c)).text);
    if (c->by.line) tg_word_at(TG_BY_WORDS, (int)c->by.v, row->cell[2]);
    if (c->nominal.line && isnan(c->nominal.v))
        tg_cell(row->cell[3], "computed");
    else if (c->nominal.line)
        tg_cell(row->cell[3], "%.6g", c->nominal.v);
    if (c->tolerance.line)
        tg_cell(row->cell[4], "+- %.6g", c->tolerance.v);
    else
        tg_words_limits(c->low.v, c->high.v, row->cell[4]);
    if (c->source.v) tg_cell(row->cell[5], "%s", tg_show(c->source.v).text);
}

static tg_code show_specification(const char *path, tg_error *e)
{
    static const tg_row head = {{"measure", "where", "by", "nominal", "asked", "source"}};
    tg_specification s = {0};
    tg_row *row = NULL;
    tg_code code = TG_OK;
    TG_TRY(tg_specification_read(path, NULL, &s, e));
    TG_TRY(TG_NEW(row, s.checks.n, e));
    const tg_conditions *c = &s.conditions;
    printf("Specification %s: %zu checks\n", tg_show(s.name.v).text, s.checks.n);
    if (c->method.v) line("for the method", "%s", tg_show(c->method.v).text);
    if (c->kernel.v) line("for the kernel", "%s", tg_show(c->kernel.v).text);
    if (c->kv.line) line("for a tube voltage", "%.6g kV", c->kv.v);
    if (c->energy.line) line("for an energy", "%.6g keV", c->energy.v);
    if (c->slice.line) line("for a slice", "%.6g mm", c->slice.v);
    for (size_t i = 0; i < s.checks.n; i++)
        fill_check((const tg_check *)s.checks.v + i, &row[i]);
    printf("\n");
    tg_table_print(stdout, &head, row, s.checks.n);
done:
    tg_free(row);
    tg_specification_free(&s);
    return code;
}

static const char *file_name(const char *path)
{
    const char *slash = strrchr(path, '/');
    return slash ? slash + 1 : path;
}

static tg_code show_job(const char *path, tg_error *e)
{
    static const tg_row head = {{"reconstruction", "method", "kernel", "pixels", "field [mm]", "specification"}};
    tg_job job = {0};
    tg_row *row = NULL;
    tg_code code = TG_OK;
    TG_TRY(tg_job_read(path, &job, e));
    TG_TRY(TG_NEW(row, job.reconstructions.n, e));
    printf("Job %s\n", tg_show(job.name.v).text);
    line("phantom", "%s", job.phantom.v);
    if (job.scan.v) line("scan", "%s", job.scan.v);
    if (job.scanner.v) line("simulated with", "%s", job.scanner.v);
    if (job.photons.line) line("photons", "%.6g per channel and view", job.photons.v);
    if (job.water.v) line("water is", "%s", tg_show(job.water.v).text);
    if (job.note.v) line("note", "%s", tg_show(job.note.v).text);
    for (size_t i = 0; i < job.reconstructions.n; i++) {
        const tg_recipe *r = (const tg_recipe *)job.reconstructions.v + i;
        const char *specification = r->specification.v ? r->specification.v : job.specification.v;
        tg_cell(row[i].cell[0], "%s", tg_show(r->name.v).text);
        tg_word_at(TG_METHODS, (int)r->method.v, row[i].cell[1]);
        tg_cell(row[i].cell[2], "%s", tg_show(r->kernel.v ? r->kernel.v : "").text);
        tg_cell(row[i].cell[3], "%.0f", r->pixels.v);
        if (r->field_mm.line)
            tg_cell(row[i].cell[4], "%.6g", r->field_mm.v);
        else
            tg_cell(row[i].cell[4], "the scan's");
        tg_cell(row[i].cell[5], "%s", tg_show(specification ? file_name(specification) : "none").text);
    }
    printf("\n");
    tg_table_print(stdout, &head, row, job.reconstructions.n);
done:
    tg_free(row);
    tg_job_free(&job);
    return code;
}

static tg_code show_kernel(const char *path, tg_error *e)
{
    tg_kernel k = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_kernel_read(path, &k, e));
    printf("Kernel file: %zu rows up to %.6g of the Nyquist frequency\n\n", k.n, k.cutoff);
    static const tg_row head = {{"fraction of Nyquist", "window"}};
    tg_row row[11] = {0};
    for (int i = 0; i < 11; i++) {
        const double u = k.cutoff * i / 10;
        tg_cell(row[i].cell[0], "%.4g", u);
        tg_cell(row[i].cell[1], "%.6f", tg_kernel_response(&k, u));
    }
    tg_table_print(stdout, &head, row, 11);
done:
    tg_kernel_free(&k);
    return code;
}

/* ---- what is it? ---- */

/* The first line of a text file that is neither empty nor a comment. */
static const char *first_line(const char *text)
{
    for (;;) {
        text += strspn(text, " \t\r\n");
        if (*text != '#' && strncmp(text, "---", 3)) return text;
        text += strcspn(text, "\n");
    }
}

static bool begins(const char *text, const char *key)
{
    const size_t n = strlen(key);
    return !strncmp(text, key, n) && text[n] == ':';
}

static tg_code show_file(const tg_call *call, const show_options *o, tg_error *e)
{
    const char *path = call->operand[0];
    char head[4096] = "";
    FILE *f = fopen(path, "rb");
    if (!f) return tg_fail(e, TG_INPUT, path, 0, "cannot be opened: %s", strerror(errno));
    const size_t n = fread(head, 1, sizeof head - 1, f);
    const bool bad = ferror(f);
    fclose(f);
    if (bad) return tg_fail(e, TG_INPUT, path, 0, "cannot be read: is it a file?");
    head[n] = '\0';
    if (!strncmp(head, "SIMPLE  =", 9)) return show_fits(call, o, e);
    if (o->png.v != 0) return tg_fail(e, TG_USAGE, path, 0, "is no image; --png draws images");
    const char *text = first_line(head);
    if (begins(text, "phantom")) return show_phantom(path, o, e);
    if (begins(text, "scanner")) return show_scanner(path, e);
    if (begins(text, "specification")) return show_specification(path, e);
    if (begins(text, "job")) return show_job(path, e);
    if (*text && strspn(text, "0123456789.")) return show_kernel(path, e);
    return tg_fail(e, TG_INPUT, path, 0,
                   "not recognised; known are FITS files, descriptions whose first key is phantom, scanner, "
                   "specification or job, and kernel files");
}

static tg_code show_example(const char *name, tg_error *e)
{
    char words[512] = "", list[512], near[TG_WORD];
    size_t n = 0;
    for (const tg_embedded *f = tg_embedded_files; f->name && n < sizeof words; f++) {
        const char *end = strstr(f->name, ".yaml");
        if (!end) continue;
        const int stem = (int)(end - f->name);
        if (!strcmp(name, f->name) || ((int)strlen(name) == stem && !strncmp(name, f->name, (size_t)stem))) {
            printf("%s", (const char *)f->bytes);
            return TG_OK;
        }
        n += (size_t)snprintf(words + n, sizeof words - n, "%.*s ", stem, f->name);
    }
    if (tg_nearest(name, words, near))
        return tg_fail(e, TG_USAGE, NULL, 0, "--example: there is no '%s'; did you mean '%s'?", tg_show(name).text,
                       near);
    tg_words_list(words, ", ", list, sizeof list);
    return tg_fail(e, TG_USAGE, NULL, 0, "--example: there is no '%s'; there are: %s", tg_show(name).text, list);
}

static tg_code run(tg_call *call, const void *options, tg_error *e)
{
    const show_options *o = options;
    if (o->example.v && call->n) return tg_fail(e, TG_USAGE, NULL, 0, "show either a file or an --example");
    if (o->example.v) return show_example(o->example.v, e);
    if (!call->n) return tg_fail(e, TG_USAGE, NULL, 0, "show needs a FILE or --example NAME");
    if ((o->png.v != 0) != (call->output != NULL))
        return tg_fail(e, TG_USAGE, NULL, 0, "a picture needs both: --png -o FILE.png");
    return show_file(call, o, e);
}

const tg_command tg_show_command = {
    .name = "show",
    .operands = "[FILE]",
    .what = "say in words what a file holds, draw an image, or print an example to start from",
    .example = "tomogauge show phantoms/rods-disc.yaml\n"
               "tomogauge show --example rods-disc > my-disc.yaml",
    .fields = show_fields,
    .size = sizeof(show_options),
    .least = 0,
    .most = 1,
    .output = "FILE.png",
    .output_required = false,
    .run = run,
};
