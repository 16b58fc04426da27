#include "metrics/theory.h"

#include "io/memory.h"
#include "recon/weights.h"

#include <math.h>
#include <string.h>

static tg_code sum_of_squares(const tg_scan *scan, double *sum)
{
    tg_code code = TG_OK;
    double *share_rad;
    TG_TRY(TG_NEW(share_rad, scan->views, NULL));
    TG_TRY(tg_angle_weights(scan, share_rad, NULL));
    *sum = 0;
    for (size_t i = 0; i < scan->views; i++)
        *sum += share_rad[i] * share_rad[i];
done:
    tg_free(share_rad);
    return code;
}

void tg_theory_learn(const tg_image *image, tg_theory *theory)
{
    const tg_scan *scan = &image->scan;
    const tg_facts *facts = &image->facts;
    *theory = (tg_theory){0};
    if (!scan->channels || !image->kernel || !image->method || strcmp(image->method, "fbp") != 0) return;
    theory->tau_mm = tg_scan_pitch_mm(scan);
    theory->aperture_mm = facts->aperture_mm.v;
    theory->unit_per_mu = image->unit == TG_HU ? 1000 / facts->mu_water_per_mm.v : 1;
    if (scan->geometry != TG_PARALLEL && facts->focal_spot_mm.v > 0)
        theory->focal_spot_mm = facts->focal_spot_mm.v * (1 - scan->source_axis_mm / scan->source_detector_mm);
    if (sum_of_squares(scan, &theory->views_rad2) != TG_OK ||
        tg_kernel_read(image->kernel, &theory->kernel, NULL) != TG_OK)
        return;
    theory->end = fmin(tg_kernel_end(&theory->kernel), 1);
    theory->known = true;
}

void tg_theory_free(tg_theory *theory)
{
    tg_kernel_free(&theory->kernel);
    *theory = (tg_theory){0};
}

static double sinc(double x)
{
    return x != 0 ? sin(M_PI * x) / (M_PI * x) : 1;
}

static double response(const tg_theory *t, double f_per_mm)
{
    const double fraction = 2 * f_per_mm * t->tau_mm;
    return fraction <= t->end ? tg_kernel_response(&t->kernel, fraction) : 0;
}

double tg_theory_mtf(const tg_theory *t, double f_per_mm)
{
    if (!t->known) return NAN;
    return fabs(response(t, f_per_mm) / tg_kernel_response(&t->kernel, 0) * pow(sinc(f_per_mm * t->tau_mm), 2) *
                sinc(f_per_mm * t->aperture_mm) * sinc(f_per_mm * t->focal_spot_mm));
}

double tg_theory_mtf_frequency(const tg_theory *t, double level)
{
    enum { STEPS = 1000, HALVINGS = 40 };
    if (!t->known) return NAN;
    const double step = t->end / (2 * t->tau_mm) / STEPS;
    for (int i = 1; i <= STEPS; i++) {
        double low = (i - 1) * step, high = i * step;
        if (!(tg_theory_mtf(t, low) > level && tg_theory_mtf(t, high) <= level)) continue;
        for (int k = 0; k < HALVINGS; k++) {
            const double middle = 0.5 * (low + high);
            *(tg_theory_mtf(t, middle) > level ? &low : &high) = middle;
        }
        return high;
    }
    return NAN;
}

double tg_theory_nps(const tg_theory *t, double line_variance, double f_per_mm)
{
    if (!t->known) return NAN;
    if (!(f_per_mm > 0)) return f_per_mm == 0 ? 0 : NAN;
    /* the spectrum of the filtered samples repeats every 1 / tau; interpolation multiplies it by sinc^4 */
    const double rho = fabs(f_per_mm - round(f_per_mm * t->tau_mm) / t->tau_mm);
    const double filtered = rho * response(t, rho);
    return t->unit_per_mu * t->unit_per_mu * t->views_rad2 / M_PI * t->tau_mm * line_variance * filtered * filtered *
           pow(sinc(f_per_mm * t->tau_mm), 4) / f_per_mm;
}

/* All repetitions of the spectrum together: sum_k sinc^4(u + k) = (2 + cos 2 pi u) / 3. */
double tg_theory_sd(const tg_theory *t, double line_variance)
{
    enum { CELLS = 4096 };
    const double du = 0.5 * t->end / CELLS;
    double sum = 0;
    if (!t->known) return NAN;
    for (int i = 0; i < CELLS; i++) {
        const double u = (i + 0.5) * du, filtered = u * response(t, u / t->tau_mm);
        sum += filtered * filtered * (2 + cos(2 * M_PI * u)) / 3 * du;
    }
    return t->unit_per_mu * sqrt(2 * sum * t->views_rad2 * line_variance) / t->tau_mm;
}
