#include "io/command.h"
#include "io/fits.h"
#include "io/output.h"
#include "recon/reconstruct.h"

#include <stdio.h>

static const char *field_text(const tg_grid *g, char text[64])
{
    snprintf(text, 64, "%zu x %zu x %zu pixels of %.4g mm", g->n[0], g->n[1], g->n[2], g->step_mm[0]);
    return text;
}

/** --check: the grid, and memory and time from those of a coarse image of one slice. */
static tg_code estimate(const tg_sinogram *s, const tg_recipe *r, tg_error *e)
{
    tg_code code = TG_OK;
    tg_image sample = {0};
    tg_grid grid;
    char text[64];
    tg_sinogram slice = *s;
    tg_recipe coarse = *r;
    slice.scan.rows = 1;
    if (coarse.pixels.v > 128) coarse.pixels.v = 128;
    TG_TRY(tg_recipe_grid(r, &s->scan, &grid, e));
    const double start = tg_seconds();
    TG_TRY(tg_reconstruct(&slice, &coarse, NULL, &sample, e));
    const double finer = (double)tg_grid_slice(&grid) / (double)tg_grid_slice(&sample.grid);
    const double rays = (double)s->scan.views * (double)s->scan.channels, pixels = (double)tg_grid_samples(&grid);
    /* the scan, one filtered slice of at least twice its length, the image */
    const double bytes = 4 * (rays * ((double)s->scan.rows + 2.2) + pixels);
    printf("%s, %.1f MB in memory, %.1f MB in the file, at most about %.1f s\n", field_text(&grid, text), bytes / 1e6,
           4 * pixels / 1e6, (tg_seconds() - start) * finer * (double)s->scan.rows);
done:
    tg_image_free(&sample);
    return code;
}

static tg_code reconstruct(const tg_call *call, const tg_sinogram *s, const tg_recipe *r, tg_error *e)
{
    tg_code code = TG_OK;
    tg_image image = {0};
    tg_inputs inputs = {0};
    char parameters[512], text[64];
    TG_TRY(tg_inputs_add(&inputs, call->operand[0], e));
    TG_TRY(tg_reconstruct(s, r, call->progress, &image, e));
    tg_fields_text(tg_recipe_fields, r, parameters, sizeof parameters);
    const tg_provenance made = {"reconstruct", parameters, &inputs};
    TG_TRY(tg_fits_write_image(call->output, &image, &made, e));
    printf("%s: %s with %s, %s, in %s\n", call->output, image.method, image.kernel, field_text(&image.grid, text),
           tg_unit_text(image.unit));
done:
    tg_inputs_free(&inputs);
    tg_image_free(&image);
    return code;
}

static tg_code run(tg_call *call, const void *options, tg_error *e)
{
    const tg_recipe *r = options;
    tg_sinogram s = {0};
    tg_error own = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_recipe_check(r, NULL, e));
    if (call->output) TG_TRY(tg_output_allowed(call->output, call->force, call->operand, 1, e));
    TG_TRY(tg_fits_read_sinogram(call->operand[0], &s, e));
    code = call->check ? estimate(&s, r, &own) : reconstruct(call, &s, r, &own);
    tg_hand_on(&own, own.code == TG_MACHINE ? NULL : call->operand[0], e); /* what a scan cannot give is said of it */
done:
    tg_sinogram_free(&s);
    return code;
}

const tg_command tg_reconstruct_command = {
    .name = "reconstruct",
    .operands = "SINO.fits",
    .what = "reconstruct an image from a scan's line integrals",
    .example = "tomogauge reconstruct rods.fits --kernel hann@0.8 --pixels 512 --field 250 -o rods-hann.fits",
    .fields = tg_recipe_fields,
    .size = sizeof(tg_recipe),
    .least = 1,
    .most = 1,
    .output = "IMAGE.fits",
    .output_required = true,
    .run = run,
};
