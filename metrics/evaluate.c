#include "metrics/evaluate.h"

#include "io/fits.h"
#include "io/memory.h"
#include "metrics/measure.h"
#include "phantoms/simulate.h"
#include "recon/kernel.h"
#include "recon/reconstruct.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/resource.h>

/** A part of the whole progress. */
typedef struct {
    const tg_progress *whole;
    double from, to;
} part;

static bool step_part(void *context, const char *what, double done)
{
    const part *p = context;
    return tg_progress_step(p->whole, what, p->from + (p->to - p->from) * done) == TG_OK;
}

/** Hand on what a step had to say: its failure to the caller, its warnings to the remarks. */
static void hand_on(const tg_error *own, const char *who, tg_error *remarks, tg_error *e)
{
    for (size_t i = 0; i < own->count && i < TG_MESSAGES; i++) {
        const tg_message *m = &own->message[i];
        if (m->warning)
            tg_warn(remarks, m->file, m->line, "%s%s%s", who ? who : "", who ? ": " : "", m->what);
        else
            tg_fail(e, own->code, m->file, m->line, "%s%s%s", who ? who : "", who ? ": " : "", m->what);
    }
}

static tg_code simulate(const tg_job *job, const tg_phantom *phantom, const tg_progress *progress, tg_sinogram *s,
                        tg_error *e)
{
    tg_code code = TG_OK;
    tg_scanner scanner = {0};
    tg_simulated report = {0};
    TG_TRY(tg_scanner_read(job->scanner.v, &scanner, e));
    if (job->photons.line) scanner.photons_per_ray = job->photons.v;
    if (job->seed.line) scanner.seed = job->seed.v;
    TG_TRY(tg_simulate(phantom, &scanner, progress, s, &report, e));
    if (report.zero_counts)
        tg_warn(e, job->scanner.v, 0, "%zu rays met no photon and were taken as half a photon; use more photons",
                report.zero_counts);
done:
    tg_scanner_free(&scanner);
    return code;
}

/** The named solid makes CT numbers: its mean in the image in 1/mm is the water value. What cannot be had leaves the
 *  image in 1/mm, with a warning.
 *  @param water_u  relative standard uncertainty of the value */
static tg_code scale_by_solid(tg_image *image, const tg_phantom *phantom, const char *solid,
                              const tg_progress *progress, double *water_u, tg_error *e)
{
    tg_code code = TG_OK;
    tg_target target = {0};
    tg_results found = {0};
    TG_TRY(tg_target_create(image, 1, phantom, progress, &target, e));
    TG_TRY(tg_measure_ct_number(&target, tg_phantom_find(phantom, solid), TG_BY_ANY, &found, e));
    const tg_result *r = found.result;
    if (!found.n_results || !(r->value > 0)) {
        const char *why = found.n_results && *r->why ? r->why : "its attenuation is not above zero";
        tg_warn(e, NULL, 0, "water: no CT numbers from '%s', the image stays in 1/mm: %s", solid, why);
        goto done;
    }
    double variance = 0;
    for (size_t i = 0; i < r->n_budget; i++)
        variance += r->budget[i].u * r->budget[i].u;
    *water_u = sqrt(variance) / r->value;
    tg_to_hu(image, r->value);
done:
    tg_results_free(&found);
    tg_target_free(&target);
    return code;
}

tg_code tg_evaluate_images(const tg_image *image, size_t n, const tg_phantom *phantom, const char *specification,
                           const tg_examine_options *options, const tg_progress *progress, tg_evaluated *item,
                           tg_error *e)
{
    tg_code code = TG_OK;
    tg_specification s = {0};
    tg_target target = {0};
    char why[200];
    bool judged = specification;
    if (specification) {
        TG_TRY(tg_specification_read(specification, phantom, &s, e));
        if (!(item->specification = tg_copy_text(s.name.v))) TG_TRY(tg_no_memory(e, 1, 1));
        for (size_t i = 0; i < n && judged; i++)
            judged = tg_specification_covers(&s, &image[i], why);
        if (!judged && !(item->unspecified = tg_copy_text(why))) TG_TRY(tg_no_memory(e, 1, 1));
    }
    TG_TRY(tg_target_create(image, n, phantom, progress, &target, e));
    TG_TRY(tg_examine(&target, judged ? &s : NULL, options, &item->results, &item->verdict, e));
    memcpy(item->shift_mm, target.shift_mm, sizeof item->shift_mm);
    item->turn_rad = target.turn_rad;
    item->turn_known = target.turn_known;
    snprintf(item->lost, sizeof item->lost, "%s", target.lost);
done:
    tg_target_free(&target);
    tg_specification_free(&s);
    return code;
}

static const char *specification_of(const tg_job *job, const tg_recipe *r)
{
    return r->specification.v ? r->specification.v : job->specification.v;
}

static tg_code evaluate_one(const tg_job *job, const tg_phantom *phantom, const tg_sinogram *s, const part *share,
                            tg_evaluated *item, tg_error *e)
{
    tg_code code = TG_OK;
    const double start = tg_seconds(), middle = 0.5 * (share->from + share->to);
    part making = {share->whole, share->from, middle}, measuring = {share->whole, middle, share->to};
    const tg_progress make = {step_part, &making}, measure = {step_part, &measuring};
    tg_examine_options options = {.water = job->water.v, .lp_per_mm = job->frequency_unit.v > 0.5};
    const char *name = item->recipe->name.v;
    const size_t bytes = strlen(name) + sizeof ".fits";
    TG_TRY(TG_NEW(item->image_name, bytes, e));
    snprintf(item->image_name, bytes, "%s.fits", name);
    TG_TRY(tg_reconstruct(s, item->recipe, &make, &item->image, e));
    if (options.water) TG_TRY(scale_by_solid(&item->image, phantom, options.water, NULL, &options.water_u, e));
    TG_TRY(
        tg_evaluate_images(&item->image, 1, phantom, specification_of(job, item->recipe), &options, &measure, item, e));
    item->seconds = tg_seconds() - start;
done:
    return code;
}

static tg_code add_kernel(tg_inputs *inputs, const tg_recipe *r, tg_error *e)
{
    tg_kernel kernel = {0};
    tg_code code = TG_OK;
    if (!r->kernel.v) return TG_OK;
    TG_TRY(tg_kernel_read(r->kernel.v, &kernel, e));
    if (!kernel.apodisation) TG_TRY(tg_inputs_add(inputs, r->kernel.v, e));
done:
    tg_kernel_free(&kernel);
    return code;
}

tg_code tg_job_inputs(const tg_job *job, tg_inputs *inputs, tg_error *e)
{
    tg_code code = TG_OK;
    const tg_recipe *recipe = job->reconstructions.v;
    TG_TRY(tg_inputs_add(inputs, job->path, e));
    TG_TRY(tg_inputs_add(inputs, job->phantom.v, e));
    TG_TRY(tg_inputs_add(inputs, job->scan.v ? job->scan.v : job->scanner.v, e));
    for (size_t i = 0; i < job->reconstructions.n; i++) {
        const char *specification = specification_of(job, &recipe[i]);
        if (specification) TG_TRY(tg_inputs_add(inputs, specification, e));
        TG_TRY(add_kernel(inputs, &recipe[i], e));
    }
done:
    return code;
}

tg_code tg_evaluate(const tg_job *job, const tg_progress *progress, tg_evaluation *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_phantom phantom = {0};
    tg_sinogram s = {0};
    const tg_recipe *recipe = job->reconstructions.v;
    const size_t n = job->reconstructions.n;
    tg_error own = {0};
    const char *who = NULL; /* the reconstruction that `own` speaks of */
    const double start = tg_seconds(), share = 1.0 / (double)(n + 1);
    part scanning = {progress, 0, share};
    const tg_progress scan = {step_part, &scanning};
    *out = (tg_evaluation){.job = job};

    TG_TRY(tg_phantom_read(job->phantom.v, &phantom, &own));
    if (!(out->phantom_name = tg_copy_text(phantom.name.v))) TG_TRY(tg_no_memory(&own, 1, 1));
    TG_TRY(tg_job_inputs(job, &out->inputs, &own));
    if (job->scan.v)
        TG_TRY(tg_fits_read_sinogram(job->scan.v, &s, &own));
    else
        TG_TRY(simulate(job, &phantom, &scan, &s, &own));
    if (job->water.v) s.facts.mu_water_per_mm = (tg_number){(double)NAN, 0};
    out->seconds_scan = tg_seconds() - start;

    TG_TRY(TG_NEW(out->item, n, &own));
    out->n = n;
    for (size_t i = 0; i < n; i++) {
        hand_on(&own, who, &out->remarks, e);
        own = (tg_error){0};
        who = recipe[i].name.v;
        const part mine = {progress, (double)(i + 1) * share, (double)(i + 2) * share};
        out->item[i].recipe = &recipe[i];
        TG_TRY(evaluate_one(job, &phantom, &s, &mine, &out->item[i], &own));
        out->verdict = tg_worst(out->verdict, out->item[i].verdict);
    }
    struct rusage use;
    if (!getrusage(RUSAGE_SELF, &use)) out->peak_mib = (double)use.ru_maxrss / 1024;
done:
    hand_on(&own, who, &out->remarks, e);
    tg_sinogram_free(&s);
    tg_phantom_free(&phantom);
    if (code != TG_OK) tg_evaluation_free(out);
    return code;
}

void tg_evaluation_free(tg_evaluation *ev)
{
    for (size_t i = 0; i < ev->n; i++) {
        tg_evaluated *item = &ev->item[i];
        tg_free(item->image_name);
        tg_free(item->specification);
        tg_free(item->unspecified);
        tg_image_free(&item->image);
        tg_results_free(&item->results);
    }
    tg_free(ev->item);
    tg_free(ev->phantom_name);
    tg_inputs_free(&ev->inputs);
    *ev = (tg_evaluation){0};
}

/** Updates of a pixel by a view, line integrals of a solid, and pixels measured that one core does in a second. */
enum { UPDATES_A_SECOND = 120000000, LINES_A_SECOND = 20000000, PIXELS_A_SECOND = 150000 };

tg_code tg_evaluate_estimate(const tg_job *job, double *seconds, double *mib, tg_error *e)
{
    tg_code code = TG_OK;
    tg_phantom phantom = {0};
    tg_scanner scanner = {0};
    tg_sinogram s = {0};
    const tg_recipe *recipe = job->reconstructions.v;
    double pixels = 0;
    TG_TRY(tg_phantom_read(job->phantom.v, &phantom, e));
    if (job->scan.v)
        TG_TRY(tg_fits_read_sinogram(job->scan.v, &s, e));
    else
        TG_TRY(tg_scanner_read(job->scanner.v, &scanner, e));
    const tg_scan *scan = job->scan.v ? &s.scan : &scanner.scan;
    for (size_t i = 0; i < job->reconstructions.n; i++) {
        tg_grid grid;
        TG_TRY(tg_recipe_grid(&recipe[i], scan, &grid, e));
        pixels += (double)tg_grid_samples(&grid);
    }
    const double rays = (double)scan->channels * (double)scan->views * (double)scan->rows;
    const double lines = rays * scanner.subrays * (double)phantom.n_solids;
    *seconds = lines / LINES_A_SECOND + pixels * ((double)scan->views / UPDATES_A_SECOND + 1. / PIXELS_A_SECOND);
    /* samples, a filtered copy of them, every image, and four bytes, two and four a pixel for a target's maps */
    *mib = (8 * rays + 14 * pixels) / 1048576;
done:
    tg_sinogram_free(&s);
    tg_scanner_free(&scanner);
    tg_phantom_free(&phantom);
    return code;
}

tg_code tg_verdict_code(tg_verdict verdict)
{
    return verdict == TG_FAIL ? TG_FAILS : verdict == TG_INCONCLUSIVE ? TG_OPEN : TG_OK;
}
