#include "io/command.h"
#include "io/fits.h"
#include "io/output.h"
#include "phantoms/simulate.h"

#include <math.h>
#include <stdio.h>

/** What stands on the command line instead of in the scanner's description. */
typedef struct {
    tg_number photons, seed, energy;
} options;

static const tg_field fields[] = {
    TG_ROW(options, "photons", TG_NUMBER, photons,
           .what = "photons per channel and view without object, instead of the scanner's", .low = 1e-3, .high = 1e15),
    TG_ROW(options, "seed", TG_INTEGER, seed, .what = "seed of the noise, instead of the scanner's", .low = 0,
           .high = 0x1p53),
    TG_ROW(options, "energy", TG_NUMBER, energy, .unit = "keV", .what = "photon energy, instead of the scanner's",
           .low = 1, .high = 1000),
    {0},
};

static void override(const options *o, tg_scanner *s)
{
    if (o->photons.line) s->photons_per_ray = o->photons.v;
    if (o->seed.line) s->seed = o->seed.v;
    if (o->energy.line) s->energy_kev = o->energy.v;
}

/** --check: the size of the scan, and its time from that of a few views. */
static tg_code estimate(const tg_phantom *p, const tg_scanner *s, tg_error *e)
{
    enum { FEW = 16 };
    tg_code code = TG_OK;
    tg_sinogram sample = {0};
    tg_scanner few = *s;
    few.scan.rows = 1;
    if (few.scan.views > FEW) few.scan.views = FEW;
    const double start = tg_seconds();
    TG_TRY(tg_simulate(p, &few, NULL, &sample, NULL, e));
    const double views = (double)s->scan.rows * (double)s->scan.views;
    const double bytes = 4 * views * (double)s->scan.channels;
    printf("%zu x %zu x %zu samples (slices, views, channels), %.1f MB in memory and in the file, about %.1f s\n",
           s->scan.rows, s->scan.views, s->scan.channels, bytes / 1e6,
           (tg_seconds() - start) * views / (double)few.scan.views);
done:
    tg_sinogram_free(&sample);
    return code;
}

static tg_code simulate(const tg_call *call, const options *o, const tg_phantom *p, const tg_scanner *s, tg_error *e)
{
    tg_code code = TG_OK;
    tg_sinogram made = {0};
    tg_simulated simulated;
    tg_inputs inputs = {0};
    char parameters[512];
    TG_TRY(tg_inputs_add(&inputs, call->operand[0], e));
    TG_TRY(tg_inputs_add(&inputs, call->operand[1], e));
    TG_TRY(tg_simulate(p, s, call->progress, &made, &simulated, e));
    tg_fields_text(fields, o, parameters, sizeof parameters);
    const tg_provenance how = {"simulate", parameters, &inputs};
    TG_TRY(tg_fits_write_sinogram(call->output, &made, &how, e));
    if (simulated.zero_counts)
        tg_warn(e, call->output, 0,
                "%zu rays had no photon at all and count as half a photon; more photons would be needed",
                simulated.zero_counts);
    printf("%s: %s by %s, %zu x %zu x %zu samples (slices, views, channels) at %g keV", call->output, p->name.v,
           s->name.v, s->scan.rows, s->scan.views, s->scan.channels, s->energy_kev);
    if (isnan(s->photons_per_ray))
        printf(", no noise\n");
    else
        printf(", %g photons per ray, seed %.0f\n", s->photons_per_ray, s->seed);
done:
    tg_inputs_free(&inputs);
    tg_sinogram_free(&made);
    return code;
}

static tg_code run(tg_call *call, const void *given, tg_error *e)
{
    const options *o = given;
    tg_phantom p = {0};
    tg_scanner s = {0};
    const tg_code phantom = tg_phantom_read(call->operand[0], &p, e),
                  scanner = tg_scanner_read(call->operand[1], &s, e);
    tg_code code = phantom != TG_OK ? phantom : scanner; /* errors of both files are told */
    if (code == TG_OK && call->output) code = tg_output_allowed(call->output, call->force, call->operand, 2, e);
    if (code == TG_OK) {
        override(o, &s);
        code = call->check ? estimate(&p, &s, e) : simulate(call, o, &p, &s, e);
    }
    tg_phantom_free(&p);
    tg_scanner_free(&s);
    return code;
}

const tg_command tg_simulate_command = {
    .name = "simulate",
    .operands = "PHANTOM.yaml SCANNER.yaml",
    .what = "scan a phantom: exact line integrals, and photon noise when photons are given",
    .example =
        "tomogauge simulate phantoms/rods-disc.yaml phantoms/scanner-fan-equiangular.yaml --photons 1e6 -o rods.fits",
    .fields = fields,
    .size = sizeof(options),
    .least = 2,
    .most = 2,
    .output = "SINO.fits",
    .output_required = true,
    .run = run,
};
