#include "phantoms/simulate.h"

#include "io/memory.h"
#include "phantoms/random.h"

#include <math.h>

enum { PHOTON_NOISE = 1 }; /* purpose of a random stream */

/** What every ray of a simulation needs. */
typedef struct {
    const tg_phantom *phantom;
    const tg_scanner *scanner;
    const double *mu_per_mm; /* {materials} */
} beam;

/** The line integral of one thin ray. */
static double line_integral(const beam *b, const double point[3], const double direction[3])
{
    double mm[TG_MOST_SOLIDS], sum = 0;
    tg_phantom_paths(b->phantom, point, direction, mm);
    for (size_t m = 0; m < b->phantom->n_materials; m++)
        sum += b->mu_per_mm[m] * mm[m];
    return sum;
}

/** What one channel sees in one view without noise: the mid-point rule over sub-rays across its aperture. Profiles of
 *  solids have square-root edges, on which rules of higher order gain nothing; equal steps keep the sub-rays of an
 *  aperture of one pitch evenly spread over the whole detector. */
static double channel_value(const beam *b, double angle_rad, double z_mm, double channel)
{
    const tg_scanner *s = b->scanner;
    const int n = s->aperture > 0 ? s->subrays : 1;
    double p[TG_MOST_SUBRAYS], least = INFINITY, sum = 0;
    for (int k = 0; k < n; k++) {
        double point[3], direction[3];
        tg_scan_ray(&s->scan, angle_rad, channel + s->aperture * ((k + 0.5) / n - 0.5), point, direction);
        point[2] = z_mm;
        direction[2] = 0;
        p[k] = line_integral(b, point, direction);
        least = fmin(least, p[k]);
    }
    for (int k = 0; k < n; k++)
        sum += s->average_lines ? p[k] : exp(least - p[k]); /* relative to the brightest: nothing underflows */
    return s->average_lines ? sum / n : least - log(sum / n);
}

/** Replace line integrals of one view by those of a Poisson number of photons.  @return channels without a photon */
static size_t add_noise(float *p, size_t channels, double photons, tg_random stream)
{
    size_t none = 0;
    for (size_t i = 0; i < channels; i++) {
        const double n = tg_random_poisson(&stream, photons * exp(-(double)p[i]));
        none += n == 0;
        p[i] = (float)-log((n == 0 ? 0.5 : n) / photons);
    }
    return none;
}

/** How far a solid reaches from the rotation axis at most [mm]: exact for upright ones. */
static double reach_mm(const tg_solid *s)
{
    const bool flat = s->shape == TG_SOLID_BOX || s->shape == TG_WEDGE;
    const double across = flat ? hypot(s->half_mm[0], s->half_mm[1]) : fmax(s->half_mm[0], s->half_mm[1]);
    return hypot(s->centre_mm[0], s->centre_mm[1]) + across * fmax(1, s->taper) +
           s->half_mm[2] * hypot(s->turn[2][0], s->turn[2][1]);
}

/** Smallest width of a solid in the plane of the scan, as far as it is not cut aslant [mm]. */
static double width_mm(const tg_solid *s)
{
    double least = INFINITY;
    for (int i = 0; i < 3; i++)
        if (hypot(s->turn[i][0], s->turn[i][1]) > 0.5) least = fmin(least, 2 * s->half_mm[i]);
    return least;
}

/** The phantom stands clear of the source; warnings where the scan sees less than its body, or sub-rays step over what
 *  is in it. */
static tg_code check_fit(const tg_phantom *p, const tg_scanner *s, tg_error *e)
{
    const double aperture_mm = s->aperture * tg_scan_pitch_mm(&s->scan);
    const double field_mm = tg_scan_field_radius_mm(&s->scan), body_mm = reach_mm(&p->solid[0]);
    if (body_mm > field_mm)
        tg_warn(
            e, p->path, p->solid[0].line,
            "'%s' reaches %.1f mm from the axis and the scanner sees %.1f mm: what is cut off makes all values wrong",
            p->solid[0].name.v, body_mm, field_mm);
    for (size_t i = 0; i < p->n_solids; i++) {
        const tg_solid *solid = &p->solid[i];
        if (s->scan.geometry != TG_PARALLEL && reach_mm(solid) > s->scan.source_axis_mm)
            return tg_fail(e, TG_INPUT, p->path, solid->line,
                           "'%s' reaches %.1f mm from the axis, beyond the source at %g mm", solid->name.v,
                           reach_mm(solid), s->scan.source_axis_mm);
        if (aperture_mm > s->subrays * width_mm(solid))
            tg_warn(
                e, p->path, solid->line,
                "'%s' is %g mm thin and can fall between sub-rays; the scanner's subrays: %.0f or more would meet it",
                solid->name.v, width_mm(solid), ceil(aperture_mm / width_mm(solid)));
    }
    return TG_OK;
}

static tg_code set_text(tg_text *t, const char *value, tg_error *e)
{
    if (!value) return TG_OK;
    t->v = tg_copy_text(value);
    t->line = 1;
    return t->v ? TG_OK : tg_no_memory(e, 1, 1);
}

/* Attenuations alone are the same at every energy, and CT numbers mean nothing among them. */
static bool speaks_of_water(const tg_phantom *p)
{
    bool speaks = false;
    for (size_t i = 0; i < p->n_materials; i++)
        speaks = speaks || isnan(p->material[i].mu_per_mm);
    return speaks;
}

static tg_code set_facts(const tg_phantom *p, const tg_scanner *s, tg_facts *f, tg_error *e)
{
    tg_code code = TG_OK;
    f->energy_kev = (tg_number){s->energy_kev, 1};
    if (!isnan(s->photons_per_ray)) {
        f->photons_per_ray = (tg_number){s->photons_per_ray, 1};
        f->seed = (tg_number){s->seed, 1};
    }
    if (s->aperture > 0) f->aperture_mm = (tg_number){s->aperture * tg_scan_pitch_mm(&s->scan), 1};
    if (speaks_of_water(p)) {
        TG_TRY(tg_water_mu(s->energy_kev, &f->mu_water_per_mm.v, e));
        f->mu_water_per_mm.line = 1;
    }
    TG_TRY(set_text(&f->phantom, p->name.v, e));
    TG_TRY(set_text(&f->scanner, s->name.v, e));
done:
    return code;
}

/** Views [first, behind) of all slices.  @return rays without a photon */
static size_t simulate_views(const beam *b, size_t first, size_t behind, float *v)
{
    const tg_scanner *s = b->scanner;
    const size_t channels = s->scan.channels;
    size_t none = 0;
#pragma omp parallel for schedule(dynamic) reduction(+ : none)
    for (size_t i = first; i < behind; i++) {
        const double angle_rad = s->scan.angle_rad[i % s->scan.views];
        const double z_mm = ((double)(i / s->scan.views) - s->scan.row_zero) * s->scan.row_step_mm;
        float *view = v + i * channels;
        for (size_t c = 0; c < channels; c++)
            view[c] = (float)channel_value(b, angle_rad, z_mm, (double)c);
        if (!isnan(s->photons_per_ray))
            none += add_noise(view, channels, s->photons_per_ray, tg_random_stream((uint64_t)s->seed, PHOTON_NOISE, i));
    }
    return none;
}

tg_code tg_simulate(const tg_phantom *p, const tg_scanner *s, const tg_progress *progress, tg_sinogram *out,
                    tg_simulated *simulated, tg_error *e)
{
    tg_code code = TG_OK;
    tg_sinogram made = {0};
    double mu_per_mm[TG_MOST_SOLIDS], took_s = 0;
    const beam b = {p, s, mu_per_mm};
    const size_t views = s->scan.rows * s->scan.views;
    size_t none = 0, step = 0;
    TG_TRY(check_fit(p, s, e));
    TG_TRY(tg_phantom_mu(p, s->energy_kev, mu_per_mm, e));
    TG_TRY(tg_sinogram_create(&s->scan, &made, e));
    TG_TRY(set_facts(p, s, &made.facts, e));
    for (size_t first = 0; first < views; first += step) {
        const double start = tg_seconds();
        TG_TRY(tg_progress_step(progress, "simulating", (double)first / (double)views));
        step = tg_progress_items(step, took_s);
        if (step > views - first) step = views - first;
        none += simulate_views(&b, first, first + step, made.v);
        took_s = tg_seconds() - start;
    }
    TG_TRY(tg_progress_step(progress, "simulating", 1));
    *out = made;
    if (simulated) simulated->zero_counts = none;
done:
    if (code != TG_OK) tg_sinogram_free(&made);
    return code;
}
