#include "metrics/job.h"

#include "io/fits.h"
#include "io/memory.h"
#include "io/yaml.h"
#include "recon/reconstruct.h"

#include <stdio.h>
#include <string.h>

static const tg_field own_recipe_fields[] = {
    TG_LINE_AT(tg_recipe),
    TG_ROW(tg_recipe, "name", TG_TEXT, name, .what = "its name in tables and of its files", .required = true),
    TG_ROW(tg_recipe, "specification", TG_PATH, specification, .what = "the specification it answers to"),
};

static const tg_field own_fields[] = {
    TG_ROW(tg_job, "job", TG_TEXT, name, .what = "its name", .required = true),
    TG_ROW(tg_job, "phantom", TG_PATH, phantom, .what = "description of what was scanned", .required = true),
    TG_ROW(tg_job, "scan", TG_PATH, scan, .what = "the scan, a FITS file"),
    TG_ROW(tg_job, "scanner", TG_PATH, scanner, .what = "description of the scanner to simulate with"),
    TG_ROW(tg_job, "photons", TG_NUMBER, photons, .low = TG_ABOVE_ZERO, .high = 1e15,
           .what = "photons per channel and view without object, instead of the scanner's"),
    TG_ROW(tg_job, "seed", TG_INTEGER, seed, .low = 0, .high = 9007199254740992,
           .what = "seed of the noise, instead of the scanner's"),
    TG_ROW(tg_job, "water", TG_TEXT, water, .what = "solid whose mean defines CT number 0"),
    TG_ROW(tg_job, "specification", TG_PATH, specification,
           .what = "the specification of every reconstruction without its own"),
    TG_ROW(tg_job, "frequency-unit", TG_CHOICE, frequency_unit, .words = "lp/cm lp/mm", .standard = "lp/cm",
           .what = "unit of spatial frequencies"),
    TG_ROW(tg_job, "note", TG_TEXT, note, .what = "words for the page: who, what for"),
};

enum { OWN = sizeof own_fields / sizeof *own_fields, MOST_ROWS = 48 };

/** The rows of a job: a recipe's are its options and what only a job has. The last row points to the recipe's. */
typedef struct {
    tg_field job[OWN + 2], recipe[MOST_ROWS];
} tables;

static void make_tables(tables *t)
{
    size_t n = sizeof own_recipe_fields / sizeof *own_recipe_fields;
    *t = (tables){0};
    memcpy(t->recipe, own_recipe_fields, sizeof own_recipe_fields);
    for (const tg_field *f = tg_recipe_fields; f->key && n < MOST_ROWS - 1; f++)
        if (f->kind != TG_LINE) t->recipe[n++] = *f;
    memcpy(t->job, own_fields, sizeof own_fields);
    t->job[OWN] =
        (tg_field)TG_ROW(tg_job, "reconstructions", TG_LIST, reconstructions, .item = t->recipe,
                         .item_size = sizeof(tg_recipe), .what = "every reconstruction to make", .required = true);
}

/** A kernel file is named relative to the job, as every path in a description is. */
static tg_code resolve_kernel(const char *job, tg_text *kernel, tg_error *e)
{
    const char *slash = strrchr(job, '/');
    if (!kernel->v || *kernel->v == '/' || !slash) return TG_OK;
    const size_t folder = (size_t)(slash - job) + 1, bytes = folder + strlen(kernel->v) + 1;
    char *path = tg_alloc(bytes, 1);
    if (!path) return tg_no_memory(e, bytes, 1);
    snprintf(path, bytes, "%.*s%s", (int)folder, job, kernel->v);
    FILE *file = fopen(path, "r");
    if (!file) { /* the name of a window, or an error that the kernel's reader puts better */
        tg_free(path);
        return TG_OK;
    }
    fclose(file);
    tg_free(kernel->v);
    kernel->v = path;
    return TG_OK;
}

/** A name becomes the name of files. */
static tg_code check_name(const tg_job *job, size_t at, tg_error *e)
{
    static const char allowed[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_.@+";
    const tg_recipe *all = job->reconstructions.v, *r = &all[at];
    const size_t length = strlen(r->name.v);
    if (!length || length > 100 || *r->name.v == '.' || strspn(r->name.v, allowed) != length)
        return tg_fail(e, TG_INPUT, job->path, r->name.line,
                       "name: '%s' cannot be the name of a file; use letters, digits and - _ . @ +",
                       tg_show(r->name.v).text);
    for (size_t i = 0; i < at; i++)
        if (!strcmp(all[i].name.v, r->name.v))
            return tg_fail(e, TG_INPUT, job->path, r->name.line, "name: '%s' is taken by line %d; give each its own",
                           r->name.v, all[i].name.line);
    return TG_OK;
}

static tg_code check_specification(const char *path, const tg_phantom *phantom, tg_error *e)
{
    tg_specification s;
    if (!path) return TG_OK;
    const tg_code code = tg_specification_read(path, phantom, &s, e);
    if (code == TG_OK) tg_specification_free(&s);
    return code;
}

/** Several reconstructions may answer to one file: its errors are told once. */
static bool specification_seen(const tg_job *job, size_t at)
{
    const tg_recipe *all = job->reconstructions.v;
    const char *path = all[at].specification.v;
    bool seen = path && job->specification.v && !strcmp(path, job->specification.v);
    for (size_t i = 0; path && i < at; i++)
        seen = seen || (all[i].specification.v && !strcmp(path, all[i].specification.v));
    return seen;
}

static tg_code check_scan(const tg_job *job, tg_error *e)
{
    tg_code code = TG_OK;
    if (!job->scan.v == !job->scanner.v)
        return tg_fail(e, TG_INPUT, job->path, job->scan.line,
                       "scan, scanner: name one of them, a scan that was measured or a scanner to simulate with");
    if (job->scanner.v) {
        tg_scanner s;
        code = tg_scanner_read(job->scanner.v, &s, e);
        if (code == TG_OK) tg_scanner_free(&s);
        return code;
    }
    tg_fits_kind kind;
    code = tg_fits_what(job->scan.v, &kind, e);
    if (code == TG_OK && kind != TG_FITS_SINOGRAM)
        code =
            tg_fail(e, TG_INPUT, job->path, job->scan.line, "scan: '%s' holds no sinogram", tg_show(job->scan.v).text);
    const tg_number *const only_simulated[] = {&job->photons, &job->seed};
    for (size_t i = 0; i < 2; i++)
        if (only_simulated[i]->line)
            tg_note(&code, tg_fail(e, TG_INPUT, job->path, only_simulated[i]->line,
                                   "%s: belongs to a simulation and the scan is a file; leave it out",
                                   i ? "seed" : "photons"));
    return code;
}

static tg_code check_recipe(tg_job *job, size_t at, const tg_phantom *phantom, tg_error *e)
{
    tg_recipe *r = (tg_recipe *)job->reconstructions.v + at;
    tg_code code = resolve_kernel(job->path, &r->kernel, e);
    tg_note(&code, check_name(job, at, e));
    tg_note(&code, tg_recipe_check(r, job->path, e));
    if (!specification_seen(job, at)) tg_note(&code, check_specification(r->specification.v, phantom, e));
    if (job->water.v && r->mu_water_per_mm.line)
        tg_note(&code,
                tg_fail(e, TG_INPUT, job->path, r->mu_water_per_mm.line,
                        "water: the solid of line %d defines CT number 0 already; keep one of them", job->water.line));
    return code;
}

tg_code tg_job_read(const char *path, tg_job *job, tg_error *e)
{
    tables t;
    make_tables(&t);
    tg_phantom phantom = {0};
    tg_code code = TG_OK;
    *job = (tg_job){0};
    TG_TRY(tg_yaml_read(path, t.job, job, e));
    if (!(job->path = tg_copy_text(path))) TG_TRY(tg_no_memory(e, strlen(path), 1));
    const tg_code known = tg_phantom_read(job->phantom.v, &phantom, e);
    const tg_phantom *p = known == TG_OK ? &phantom : NULL;
    tg_note(&code, known);
    tg_note(&code, check_scan(job, e));
    if (p && job->water.v && tg_phantom_find(p, job->water.v) == TG_NO_SOLID)
        tg_note(&code, tg_solid_unknown(p, "water", &job->water, path, e));
    tg_note(&code, check_specification(job->specification.v, p, e));
    if (!job->reconstructions.n)
        tg_note(&code, tg_fail(e, TG_INPUT, path, job->reconstructions.line, "reconstructions: name at least one"));
    for (size_t i = 0; i < job->reconstructions.n; i++)
        tg_note(&code, check_recipe(job, i, p, e));
done:
    tg_phantom_free(&phantom);
    if (code != TG_OK) tg_job_free(job);
    return code;
}

void tg_job_free(tg_job *job)
{
    tables t;
    make_tables(&t);
    tg_free(job->path);
    tg_fields_free(t.job, job);
    *job = (tg_job){0};
}
