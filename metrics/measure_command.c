#include "io/command.h"
#include "io/fits.h"
#include "io/memory.h"
#include "io/output.h"
#include "metrics/results_file.h"
#include "metrics/target.h"

#include <stdio.h>
#include <string.h>

typedef struct {
    tg_text phantom, spec;
    tg_number unit;
} measure_options;

static const tg_field fields[] = {
    TG_ROW(measure_options, "phantom", TG_PATH, phantom, .what = "description of what the images show",
           .required = true),
    TG_ROW(measure_options, "spec", TG_PATH, spec, .what = "specification to judge by; without it nothing is judged"),
    TG_ROW(measure_options, "unit", TG_CHOICE, unit, .words = "lp/cm lp/mm", .standard = "lp/cm",
           .what = "unit of spatial frequencies"),
    {0},
};

/** An image taken twice would look as if it had no noise.
 *  @param before  inputs, of which the images begin at `from`, before this one was added */
static tg_code check_copy(const char *path, const tg_inputs *in, size_t from, size_t before, tg_error *e)
{
    if (in->n == before) return tg_fail(e, TG_INPUT, path, 0, "is named twice; repeats are images of other scans");
    for (size_t i = from; i < before; i++)
        if (!strcmp(in->input[i].sum, in->input[before].sum))
            return tg_fail(e, TG_INPUT, path, 0, "holds the same pixels as %s; repeats are images of other scans",
                           in->input[i].path);
    return TG_OK;
}

/** Everything that is read, in the order of the results' list of inputs. */
static tg_code read_all(const tg_call *call, const measure_options *o, tg_phantom *phantom, tg_image *image,
                        tg_inputs *inputs, tg_error *e)
{
    tg_code code = TG_OK;
    TG_TRY(tg_phantom_read(o->phantom.v, phantom, e));
    TG_TRY(tg_inputs_add(inputs, o->phantom.v, e));
    if (o->spec.v) TG_TRY(tg_inputs_add(inputs, o->spec.v, e));
    const size_t from = inputs->n;
    for (int i = 0; i < call->n; i++) {
        const char *path = call->operand[i];
        const size_t before = inputs->n;
        TG_TRY(tg_fits_read_image(path, &image[i], e));
        TG_TRY(tg_target_repeats(&image[0], &image[i], path, e));
        TG_TRY(tg_inputs_add(inputs, path, e));
        TG_TRY(check_copy(path, inputs, from, before, e));
    }
done:
    return code;
}

static tg_code may_write(const tg_call *call, const tg_inputs *inputs, tg_error *e)
{
    const char **paths;
    if (!call->output) return TG_OK;
    tg_code code = TG_NEW(paths, inputs->n, e);
    for (size_t i = 0; paths && i < inputs->n; i++)
        paths[i] = inputs->input[i].path;
    if (code == TG_OK) code = tg_output_allowed(call->output, call->force, paths, inputs->n, e);
    tg_free(paths);
    return code;
}

/** "a.fits", "a.fits and 2 more" */
static tg_code name_images(const tg_call *call, tg_text *name, tg_error *e)
{
    const size_t bytes = strlen(call->operand[0]) + 32;
    const tg_code code = TG_NEW(name->v, bytes, e);
    if (code != TG_OK) return code;
    snprintf(name->v, bytes, "%s", call->operand[0]);
    if (call->n > 1) snprintf(name->v + strlen(name->v), 32, " and %d more", call->n - 1);
    return code;
}

static tg_code report(const tg_call *call, const tg_evaluation *ev, tg_error *e)
{
    char *text = NULL;
    tg_code code = TG_OK;
    if (call->output) {
        tg_json *j = tg_results_json(ev);
        code = tg_json_write(call->output, j, e);
        tg_json_free(j);
    }
    if (code == TG_OK) code = tg_results_text(ev, &text, e);
    if (code == TG_OK) fputs(text, stdout);
    tg_free(text);
    return code;
}

static tg_code run(tg_call *call, const void *options, tg_error *e)
{
    const measure_options *o = options;
    const tg_examine_options say = {.lp_per_mm = o->unit.v > 0.5};
    tg_code code = TG_OK;
    tg_phantom phantom = {0};
    tg_image *image = NULL;
    tg_evaluation ev = {0};
    tg_specification specification = {0};
    const size_t n = (size_t)call->n;
    tg_recipe shown = {0};
    TG_TRY(name_images(call, &shown.name, e));
    TG_TRY(TG_NEW(image, n, e));
    TG_TRY(TG_NEW(ev.item, 1, e));
    ev.n = 1;
    ev.item->recipe = &shown;
    TG_TRY(read_all(call, o, &phantom, image, &ev.inputs, e));
    TG_TRY(may_write(call, &ev.inputs, e));
    if (call->check) {
        if (o->spec.v) TG_TRY(tg_specification_read(o->spec.v, &phantom, &specification, e));
        printf("%d image%s, all inputs are in order\n", call->n, call->n == 1 ? "" : "s");
        goto done;
    }
    if (!(ev.phantom_name = tg_copy_text(phantom.name.v))) TG_TRY(tg_no_memory(e, 1, 1));
    TG_TRY(tg_evaluate_images(image, n, &phantom, o->spec.v, &say, call->progress, ev.item, e));
    ev.verdict = ev.item->verdict;
    ev.item->image = image[0]; /* the target is gone: the first image says how they were made */
    image[0] = (tg_image){0};
    TG_TRY(report(call, &ev, e));
    call->verdict = tg_verdict_code(ev.verdict);
done:
    for (size_t i = 0; image && i < n; i++)
        tg_image_free(&image[i]);
    tg_free(image);
    tg_free(shown.name.v);
    tg_specification_free(&specification);
    tg_evaluation_free(&ev);
    tg_phantom_free(&phantom);
    return code;
}

const tg_command tg_measure_command = {
    .name = "measure",
    .operands = "IMAGE...",
    .what = "find a phantom in its images, measure all that it allows and judge by a specification",
    .example = "tomogauge measure build/demo/standard.fits --phantom phantoms/rods-disc.yaml -o build/results.json",
    .fields = fields,
    .size = sizeof(measure_options),
    .least = 1,
    .most = 1000,
    .output = "RESULTS.json",
    .run = run,
};
