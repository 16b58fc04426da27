#ifndef TG_SYNTHETIC_H
#define TG_SYNTHETIC_H
/* Slices whose truth is known: upright cylinders with a Gaussian spread, and Gaussian noise of a chosen power spectrum,
 * with a target filled in by hand (pose exact, no image processing), so that one measure can be tested by itself.
 *
 *     static const Synthetic_solid solid[] = {{"body", 0, 0, 50, 0}, {"rod", 25, 0, 8, 300}};
 *     Synthetic s = {.pixels = 160, .step_mm = 0.8, .fwhm_mm = 1.6, .slices = 1, .sd = 10,
 *                    .power = synthetic_hann, .cutoff_per_mm = 0.6, .solid = solid, .solids = 2, .seed = 1};
 *     Synthetic_case c;
 *     CK_OK(synthetic_make(&s, &c, &e));
 *     for (uint64_t draw = 0; draw < 300; draw++) {
 *         CK_OK(synthetic_draw(&s, draw, &c, &e));
 *         ... tg_measure_xyz(&c.target, solid, TG_BY_ANY, &results, &e) ...
 *     }
 *     synthetic_free(&c);
 */
#include "io/memory.h"
#include "metrics/noise.h"
#include "phantoms/random.h"

#include <gsl/gsl_fft_complex.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_sf_bessel.h>
#include <math.h>
#include <string.h>

typedef struct {
    const char *name;
    double x_mm, y_mm, radius_mm;
    double value; /* HU; outside every solid it is -1000 */
} Synthetic_solid;

typedef struct {
    size_t pixels; /* along a side; the middle of the field is x = y = 0 */
    double step_mm;
    double fwhm_mm; /* of the Gaussian spread; its MTF is exp(-(pi f fwhm)^2 / (4 ln 2)) */
    size_t slices;
    double sd;                                              /* of the noise of one slice; 0: none */
    double (*power)(double f_per_mm, double cutoff_per_mm); /* shape of the NPS; NULL: white */
    double cutoff_per_mm;                                   /* keep it at most 1 / (2 step_mm): no aliasing */
    const Synthetic_solid *solid;                           /* the first is the body */
    size_t solids;
    uint64_t seed;
} Synthetic;

typedef struct {
    tg_phantom phantom;
    tg_image image; /* all slices */
    double *truth;  /* {pixels, pixels} without noise */
    double *field;  /* workspace */
    tg_target target;
} Synthetic_case;

/** Noise of filtered back-projection with a Hann window, without interpolation: S ~ f A^2(f) (Kijewski, Judy 1987). */
static inline double synthetic_hann(double f_per_mm, double cutoff_per_mm)
{
    if (f_per_mm >= cutoff_per_mm) return 0;
    const double a = 0.5 + 0.5 * cos(M_PI * f_per_mm / cutoff_per_mm);
    return f_per_mm * a * a;
}

/** Share of a Gaussian spread of SD s around a point that falls into a disc whose centre is d away. */
static inline double synthetic_disc(double d_mm, double radius_mm, double s_mm,
                                    const gsl_integration_glfixed_table *rule)
{
    if (d_mm + 8 * s_mm < radius_mm) return 1;
    if (d_mm - 8 * s_mm > radius_mm) return 0;
    const double a = fmax(0, d_mm - 8 * s_mm), b = fmin(radius_mm, d_mm + 8 * s_mm), s2 = s_mm * s_mm;
    double sum = 0;
    for (size_t i = 0; i < rule->n; i++) {
        double r, w;
        gsl_integration_glfixed_point(a, b, i, &r, &w, rule);
        sum += w * r / s2 * exp(-(r - d_mm) * (r - d_mm) / (2 * s2)) * gsl_sf_bessel_I0_scaled(r * d_mm / s2);
    }
    return sum;
}

/** Two independent fields of noise with unit SD: the real and the imaginary part of a random spectrum's transform.
 *  @param field  {p, p, 2}, p a power of two */
static inline void synthetic_noise(const Synthetic *s, uint64_t draw, size_t p, double *field)
{
    tg_random random = tg_random_stream(s->seed, 0x53594E54, draw);
    double sum = 0;
    for (size_t iy = 0; iy < p; iy++)
        for (size_t ix = 0; ix < p; ix++) {
            const double fx = (double)(ix < p - ix ? ix : p - ix), fy = (double)(iy < p - iy ? iy : p - iy);
            const double f = hypot(fx, fy) / ((double)p * s->step_mm);
            const double power = s->power ? s->power(f, s->cutoff_per_mm) : 1, a = sqrt(power);
            field[2 * (iy * p + ix)] = a * tg_random_normal(&random);
            field[2 * (iy * p + ix) + 1] = a * tg_random_normal(&random);
            sum += power;
        }
    for (size_t i = 0; i < p; i++)
        gsl_fft_complex_radix2_forward(field + 2 * i * p, 1, p);
    for (size_t i = 0; i < p; i++)
        gsl_fft_complex_radix2_forward(field + 2 * i, p, p);
    for (size_t i = 0; i < 2 * p * p; i++)
        field[i] /= sqrt(sum);
}

static inline void synthetic_free(Synthetic_case *c)
{
    for (size_t i = 0; i < c->phantom.n_materials; i++)
        tg_free(c->phantom.material[i].name.v);
    for (size_t i = 0; i < c->phantom.n_solids; i++)
        tg_free(c->phantom.solid[i].name.v);
    tg_free(c->phantom.material);
    tg_free(c->phantom.solid);
    tg_image_free(&c->image);
    tg_free(c->truth);
    tg_free(c->field);
    tg_free(c->target.slice);
    tg_free(c->target.mean);
    tg_free(c->target.label);
    tg_free(c->target.clear_mm);
    tg_noise_free(&c->target.noise);
    *c = (Synthetic_case){0};
}

/** Fill the slices with noise (another draw: other noise) and learn it, as for a real target. */
static inline tg_code synthetic_draw(const Synthetic *s, uint64_t draw, Synthetic_case *c, tg_error *e)
{
    const size_t plane = s->pixels * s->pixels;
    size_t p = 1;
    while (p < s->pixels)
        p *= 2;
    memset(c->target.mean, 0, plane * sizeof *c->target.mean);
    for (size_t k = 0; k < s->slices; k++) {
        if (s->sd > 0 && k % 2 == 0) synthetic_noise(s, draw << 16 | k, p, c->field);
        float *v = c->image.v + k * plane;
        for (size_t i = 0; i < plane; i++) {
            const double noise = s->sd * c->field[2 * (i / s->pixels * p + i % s->pixels) + k % 2];
            v[i] = (float)(c->truth[i] + noise);
            c->target.mean[i] += v[i] / (float)s->slices;
        }
    }
    tg_noise_free(&c->target.noise);
    return tg_noise_learn(&c->target, &c->target.noise, e);
}

/** Phantom, slices without noise and target of a description. */
static inline tg_code synthetic_make(const Synthetic *s, Synthetic_case *c, tg_error *e)
{
    tg_code code = TG_OK;
    const double spread = s->fwhm_mm / sqrt(8 * log(2));
    const size_t plane = s->pixels * s->pixels;
    tg_target *t = &c->target;
    gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(64);
    size_t p = 1;
    while (p < s->pixels)
        p *= 2;

    *c = (Synthetic_case){.phantom = {.n_materials = s->solids, .n_solids = s->solids}};
    TG_TRY(TG_NEW(c->phantom.material, s->solids, e));
    TG_TRY(TG_NEW(c->phantom.solid, s->solids, e));
    for (size_t i = 0; i < s->solids; i++) {
        const Synthetic_solid *from = &s->solid[i];
        c->phantom.material[i] =
            (tg_material){.name = {.v = tg_copy_text(from->name)}, .mu_per_mm = NAN, .hu = from->value};
        c->phantom.solid[i] = (tg_solid){.name = {.v = tg_copy_text(from->name)},
                                         .shape = TG_CYLINDER,
                                         .material = i,
                                         .centre_mm = {from->x_mm, from->y_mm, 0},
                                         .turn = {{1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
                                         .half_mm = {from->radius_mm, from->radius_mm, 100}};
    }

    const double middle = -0.5 * s->step_mm * (double)(s->pixels - 1);
    const tg_grid grid = {.n = {s->pixels, s->pixels, s->slices},
                          .step_mm = {s->step_mm, s->step_mm, 1},
                          .first_mm = {middle, middle, -0.5 * (double)(s->slices - 1)}};
    TG_TRY(tg_image_create(&grid, TG_HU, &c->image, e));
    *t = (tg_target){.phantom = &c->phantom,
                     .unit = TG_HU,
                     .image = &c->image,
                     .grid = grid,
                     .n = s->slices,
                     .turn_known = true,
                     .spread_mm = s->fwhm_mm};
    t->grid.n[2] = 1;
    t->grid.first_mm[2] = 0;
    TG_TRY(TG_NEW(t->slice, s->slices, e));
    TG_TRY(TG_NEW(t->mean, plane, e));
    TG_TRY(TG_NEW(t->label, plane, e));
    TG_TRY(TG_NEW(t->clear_mm, plane, e));
    TG_TRY(TG_NEW(c->truth, plane, e));
    TG_TRY(TG_NEW(c->field, 2 * p * p, e));

    for (size_t i = 0; i < plane; i++) {
        const double x = tg_grid_mm(&grid, 0, (double)(i % s->pixels));
        const double y = tg_grid_mm(&grid, 1, (double)(i / s->pixels));
        double value = -1000, clear = INFINITY;
        t->label[i] = TG_NO_SOLID;
        for (size_t k = 0; k < s->solids; k++) { /* each solid adds its contrast to what it displaces: the body */
            const Synthetic_solid *o = &s->solid[k];
            const double d = hypot(x - o->x_mm, y - o->y_mm), under = k ? s->solid[0].value : -1000;
            value += (o->value - under) * synthetic_disc(d, o->radius_mm, spread, rule);
            if (d <= o->radius_mm) t->label[i] = (int16_t)k;
            clear = fmin(clear, fabs(d - o->radius_mm));
        }
        c->truth[i] = value;
        c->image.v[i] = t->mean[i] = (float)value;
        t->clear_mm[i] = (float)clear;
    }
    for (size_t k = 0; k < s->slices; k++) {
        if (k) memcpy(c->image.v + k * plane, c->image.v, plane * sizeof(float));
        t->slice[k] = c->image.v + k * plane;
    }
done:
    gsl_integration_glfixed_table_free(rule);
    if (code != TG_OK) synthetic_free(c);
    return code;
}

#endif
