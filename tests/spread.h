#ifndef TG_TEST_SPREAD_H
#define TG_TEST_SPREAD_H
/* Synthetic slices whose discs have any rotationally symmetric spread, given by its MTF: the profile of a disc of
 * radius R is the Hankel integral 2 pi R Int m(f) J1(2 pi R f) J0(2 pi r f) df, taken by Gauss-Legendre quadrature. */
#include "synthetic.h"

#include <gsl/gsl_spline.h>

typedef double Modulation(double f_per_mm, double scale_mm);

/** exp(-(pi f w)^2 / (4 ln 2)) for a full width at half maximum of w */
static inline double spread_gauss(double f, double width_mm)
{
    return exp(-pow(M_PI * f * width_mm, 2) / (4 * log(2)));
}

static inline double spread_sinc(double x)
{
    return x < 1e-9 ? 1 : sin(M_PI * x) / (M_PI * x);
}

/** Back-projection at a pitch: window, linear interpolation, aperture of one pitch (Kak and Slaney 1988, ch. 3). */
static inline double spread_hann(double f, double pitch_mm)
{
    const double u = f * pitch_mm;
    return u >= 0.5 ? 0 : (0.5 + 0.5 * cos(2 * M_PI * u)) * pow(spread_sinc(u), 3);
}

static inline double spread_cosine(double f, double pitch_mm)
{
    const double u = f * pitch_mm;
    return u >= 0.5 ? 0 : cos(M_PI * u) * pow(spread_sinc(u), 3);
}

static inline double spread_shepp_logan(double f, double pitch_mm)
{
    const double u = f * pitch_mm;
    return u >= 0.5 ? 0 : spread_sinc(u) * pow(spread_sinc(u), 3);
}

/** Frequency where a modulation falls to a level. */
static inline double spread_level(Modulation *m, double scale_mm, double level)
{
    double a = 0, b = 3 / scale_mm;
    for (int i = 0; i < 100; i++) {
        const double f = 0.5 * (a + b);
        *(m(f, scale_mm) > level ? &a : &b) = f;
    }
    return 0.5 * (a + b);
}

/** Profile of a disc of unit height at a distance from its centre. */
static inline double spread_profile(Modulation *m, double scale_mm, double radius_mm, double r_mm,
                                    const gsl_integration_glfixed_table *rule)
{
    double top = 0.5 / scale_mm, sum = 0;
    while (m(top, scale_mm) > 1e-12)
        top *= 1.1;
    for (size_t i = 0; i < rule->n; i++) {
        double f, w;
        gsl_integration_glfixed_point(0, top, i, &f, &w, rule);
        sum += w * m(f, scale_mm) * j1(2 * M_PI * radius_mm * f) * j0(2 * M_PI * r_mm * f);
    }
    return 2 * M_PI * radius_mm * sum;
}

/** Paint the slices of a case anew with this spread (fwhm_mm of the description should be near it). */
static inline tg_code spread_paint(const Synthetic *s, Modulation *m, double scale_mm, Synthetic_case *c, tg_error *e)
{
    enum { KNOTS = 1200 };
    tg_code code = TG_OK;
    const size_t plane = s->pixels * s->pixels;
    const double reach = 14 * s->fwhm_mm;
    double *r = NULL, *g = NULL;
    gsl_spline *spline = gsl_spline_alloc(gsl_interp_cspline, KNOTS);
    gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(400);
    TG_TRY(TG_NEW(r, KNOTS, e));
    TG_TRY(TG_NEW(g, KNOTS, e));
    for (size_t i = 0; i < plane; i++)
        c->truth[i] = -1000;
    for (size_t k = 0; k < s->solids; k++) {
        const Synthetic_solid *o = &s->solid[k];
        const double step = o->value - (k ? s->solid[0].value : -1000);
        const double from = fmax(0, o->radius_mm - reach), to = o->radius_mm + reach;
        for (size_t i = 0; i < KNOTS; i++) {
            r[i] = from + (to - from) * (double)i / (KNOTS - 1);
            g[i] = spread_profile(m, scale_mm, o->radius_mm, r[i], rule);
        }
        gsl_spline_init(spline, r, g, KNOTS);
        for (size_t i = 0; i < plane; i++) {
            const double d = hypot(tg_grid_mm(&c->image.grid, 0, (double)(i % s->pixels)) - o->x_mm,
                                   tg_grid_mm(&c->image.grid, 1, (double)(i / s->pixels)) - o->y_mm);
            c->truth[i] += step * (d < from ? 1 : d > to ? 0 : gsl_spline_eval(spline, d, NULL));
        }
    }
    for (size_t i = 0; i < plane; i++)
        c->target.mean[i] = (float)c->truth[i];
    for (size_t i = 0; i < s->slices * plane; i++)
        c->image.v[i] = (float)c->truth[i % plane];
done:
    gsl_integration_glfixed_table_free(rule);
    gsl_spline_free(spline);
    tg_free(r);
    tg_free(g);
    return code;
}

#endif
