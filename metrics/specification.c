#include "metrics/specification.h"

#include "io/memory.h"
#include "io/yaml.h"
#include "metrics/measure.h"
#include "recon/kernel.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const tg_field condition_fields[] = {
    TG_ROW(tg_conditions, "kernel", TG_TEXT, kernel, .what = "kernel of the reconstruction, NAME or NAME@CUTOFF"),
    TG_ROW(tg_conditions, "method", TG_TEXT, method, .what = "method of the reconstruction"),
    TG_ROW(tg_conditions, "kv", TG_NUMBER, kv, .unit = "kV", .low = TG_ABOVE_ZERO, .high = 1e4, .what = "tube voltage"),
    TG_ROW(tg_conditions, "energy", TG_NUMBER, energy, .unit = "keV", .low = TG_ABOVE_ZERO, .high = 1e4,
           .what = "photon energy of a monochromatic beam"),
    TG_ROW(tg_conditions, "slice", TG_NUMBER, slice, .unit = "mm", .low = TG_ABOVE_ZERO, .high = 1e4,
           .what = "slice thickness"),
    {0},
};

static const tg_field check_fields[] = {
    TG_LINE_AT(tg_check),
    TG_ROW(tg_check, "measure", TG_TEXT, measure, .what = "what is measured", .required = true),
    TG_ROW(tg_check, "in", TG_TEXT, in, .what = "the solid it is measured in"),
    TG_ROW(tg_check, "at", TG_TEXT, at, .what = "the solid it is measured at"),
    TG_ROW(tg_check, "by", TG_CHOICE, by, .words = TG_BY_WORDS, .what = "how a resolution is measured"),
    TG_ROW(tg_check, "nominal", TG_NUMBER, nominal, .words = "computed",
           .what = "the right value; computed: from composition, beam and theory"),
    TG_ROW(tg_check, "tolerance", TG_NUMBER, tolerance, .low = TG_ABOVE_ZERO, .high = DBL_MAX,
           .what = "most that the value may be off, either way"),
    TG_ROW(tg_check, "low", TG_NUMBER, low, .what = "least that the value may be"),
    TG_ROW(tg_check, "high", TG_NUMBER, high, .what = "most that the value may be"),
    TG_ROW(tg_check, "source", TG_TEXT, source, .what = "where the figure comes from"),
    {0},
};

static const tg_field specification_fields[] = {
    TG_ROW(tg_specification, "specification", TG_TEXT, name, .what = "its name", .required = true),
    TG_ROW(tg_specification, "conditions", TG_GROUP, conditions, .item = condition_fields,
           .what = "what the image must be for the specification to speak of it"),
    TG_ROW(tg_specification, "unit", TG_CHOICE, unit, .words = "HU 1/mm", .standard = "HU",
           .what = "unit of the limits on CT numbers, uniformity, cupping and noise"),
    TG_ROW(tg_specification, "checks", TG_LIST, checks, .item = check_fields, .item_size = sizeof(tg_check),
           .what = "what must hold", .required = true),
    {0},
};

const char *tg_check_solid(const tg_check *c)
{
    return c->in.v ? c->in.v : c->at.v;
}

/** An unknown name with the nearest of the known ones. */
static tg_code unknown(const char *key, const tg_text *name, const char *kind, const char *words, const char *path,
                       tg_error *e)
{
    char near[64];
    if (tg_nearest(name->v, words, near))
        return tg_fail(e, TG_INPUT, path, name->line, "%s: there is no %s '%s'; did you mean '%s'?", key, kind,
                       tg_show(name->v).text, near);
    return tg_fail(e, TG_INPUT, path, name->line, "%s: there is no %s '%s'; there are: %s", key, kind,
                   tg_show(name->v).text, words);
}

tg_code tg_solid_unknown(const tg_phantom *phantom, const char *key, const tg_text *name, const char *path, tg_error *e)
{
    size_t bytes = 1;
    for (size_t i = 0; i < phantom->n_solids; i++)
        bytes += strlen(phantom->solid[i].name.v) + 1;
    char *words = tg_alloc(bytes, 1);
    if (!words) return tg_no_memory(e, bytes, 1);
    for (size_t i = 0, at = 0; i < phantom->n_solids; i++)
        at += (size_t)snprintf(words + at, bytes - at, "%s%s", i ? " " : "", phantom->solid[i].name.v);
    const tg_code code = unknown(key, name, "solid", words, path, e);
    tg_free(words);
    return code;
}

static tg_code measure_unknown(const tg_text *name, const char *path, tg_error *e)
{
    char words[512];
    size_t at = 0;
    for (const tg_measure *m = tg_measures; m->name && at < sizeof words; m++)
        at += (size_t)snprintf(words + at, sizeof words - at, "%s%s", at ? " " : "", m->name);
    return unknown("measure", name, "measure", words, path, e);
}

/** Does a check say one thing that a value can keep or break? NULL: yes; else what is wrong with it. */
static const char *senseless(const tg_check *c, const tg_measure *m)
{
    const bool nominal = c->nominal.line, tolerance = c->tolerance.line, limits = c->low.line || c->high.line;
    if (c->in.v && c->at.v) return "in, at: both name the solid; write one of them";
    if (!c->in.v && !c->at.v) return "in: missing; name the solid to measure in";
    if (!nominal && !tolerance && !limits)
        return "nothing is asked of the value; write nominal and tolerance, or low, or high";
    if (tolerance && limits) return "tolerance: stands beside low or high; write either a tolerance or limits";
    if (tolerance && !nominal && !(m && m->zero))
        return "tolerance: needs a nominal value; write nominal: NUMBER or nominal: computed";
    if (nominal && !tolerance && !limits) return "nominal: alone asks nothing; write a tolerance, or low, or high";
    if (c->low.line && c->high.line && c->low.v > c->high.v) return "low: is above high; no value can be between them";
    if (c->by.line && m && !m->by) return "by: this measure is made in one way only; leave it out";
    return NULL;
}

static tg_code check_one(const tg_specification *s, size_t at, const tg_phantom *phantom, tg_error *e)
{
    const tg_check *all = s->checks.v, *c = &all[at];
    const tg_measure *m = tg_measure_find(c->measure.v);
    const char *solid = tg_check_solid(c), *wrong = senseless(c, m);
    tg_code code = TG_OK;
    if (!m) code = measure_unknown(&c->measure, s->path, e);
    if (wrong) code = tg_fail(e, TG_INPUT, s->path, c->line, "%s", wrong);
    if (phantom && solid && tg_phantom_find(phantom, solid) == TG_NO_SOLID)
        code = tg_solid_unknown(phantom, c->in.v ? "in" : "at", c->in.v ? &c->in : &c->at, s->path, e);
    for (size_t i = 0; solid && i < at; i++) {
        const char *other = tg_check_solid(&all[i]);
        const tg_measure *known = tg_measure_find(all[i].measure.v);
        if (!other || strcmp(other, solid) != 0) continue;
        if (!strcmp(all[i].measure.v, c->measure.v))
            return tg_fail(e, TG_INPUT, s->path, c->line, "%s of '%s' is checked in line %d already; keep one of them",
                           c->measure.v, tg_show(solid).text, all[i].line);
        if (m && known && m->run == known->run && (!c->by.line != !all[i].by.line || c->by.v != all[i].by.v))
            return tg_fail(e, TG_INPUT, s->path, c->line,
                           "by: the curve of '%s' is measured in one way; write the same here and in line %d",
                           tg_show(solid).text, all[i].line);
    }
    return code;
}

tg_code tg_specification_read(const char *path, const tg_phantom *phantom, tg_specification *s, tg_error *e)
{
    tg_code code = TG_OK;
    *s = (tg_specification){0};
    TG_TRY(tg_yaml_read(path, specification_fields, s, e));
    if (!(s->path = tg_copy_text(path))) TG_TRY(tg_no_memory(e, strlen(path), 1));
    for (size_t i = 0; i < s->checks.n; i++) {
        const tg_code found = check_one(s, i, phantom, e);
        if (code == TG_OK) code = found;
    }
done:
    if (code != TG_OK) tg_specification_free(s);
    return code;
}

void tg_specification_free(tg_specification *s)
{
    tg_free(s->path);
    tg_fields_free(specification_fields, s);
    *s = (tg_specification){0};
}

enum { WHY = 200 };

static bool agrees(const char *what, const char *wanted, const char *stated, bool same, char why[WHY])
{
    if (!wanted) return true;
    if (!stated)
        snprintf(why, WHY, "they want %s %s, and the image does not state its own", what, wanted);
    else if (!same)
        snprintf(why, WHY, "they want %s %s, and the image has %s", what, wanted, stated);
    return stated && same;
}

/** "hann" and "hann@1" are one kernel; files are told by their name. */
static bool same_kernel(const char *a, const char *b)
{
    tg_kernel ka = {0}, kb = {0};
    bool same = !strcmp(a, b);
    if (!same && tg_kernel_read(a, &ka, NULL) == TG_OK && tg_kernel_read(b, &kb, NULL) == TG_OK)
        same = ka.apodisation && ka.apodisation == kb.apodisation && ka.cutoff == kb.cutoff;
    tg_kernel_free(&ka);
    tg_kernel_free(&kb);
    return same;
}

static bool agrees_number(const char *what, const char *unit, const tg_number *wanted, double stated, char why[WHY])
{
    char a[48], b[48];
    snprintf(a, sizeof a, "%.6g %s", wanted->v, unit);
    snprintf(b, sizeof b, "%.6g %s", stated, unit);
    /* files hold values in few digits: what prints alike is alike */
    return agrees(what, wanted->line ? a : NULL, isnan(stated) ? NULL : b, !strcmp(a, b), why);
}

/** A stack states its thickness by its step; one slice by its scan, or by ZSTEP in its file. */
static double slice_mm(const tg_image *image)
{
    if (image->scan.row_step_mm > 0) return image->scan.row_step_mm;
    return image->grid.n[2] > 1 ? image->grid.step_mm[2] : (double)NAN;
}

bool tg_specification_covers(const tg_specification *s, const tg_image *image, char why[WHY])
{
    const tg_conditions *c = &s->conditions;
    const char *kernel = image->kernel, *method = image->method;
    return agrees("kernel", c->kernel.v, kernel, c->kernel.v && kernel && same_kernel(c->kernel.v, kernel), why) &&
           agrees("method", c->method.v, method, c->method.v && method && !strcmp(c->method.v, method), why) &&
           agrees_number("tube voltage", "kV", &c->kv, image->facts.tube_kv.v, why) &&
           agrees_number("energy", "keV", &c->energy, image->facts.energy_kev.v, why) &&
           agrees_number("slice thickness", "mm", &c->slice, slice_mm(image), why);
}
