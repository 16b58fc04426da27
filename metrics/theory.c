#include "metrics/theory.h"

#include "io/memory.h"
#include "recon/kernel.h"
#include "recon/weights.h"

#include <math.h>
#include <string.h>

/* An image's reconstruction in numbers. */
typedef struct {
    tg_kernel kernel;
    double tau_mm;        /* pitch at the axis */
    double end;           /* fraction of Nyquist where the response ends, at most 1 */
    double aperture_mm;   /* NaN: unknown */
    double focal_spot_mm; /* at the axis; 0: a point, or unknown */
    double views_rad2;    /* sum of the squared shares of the half turn: pi^2 / M for M even views */
    double unit_per_mu;   /* 1, or HU per 1/mm; NaN: unknown */
} model;

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

/* @return false: the image does not say enough; else release the kernel */
static bool understand(const tg_image *image, model *m)
{
    const tg_scan *scan = &image->scan;
    const tg_facts *facts = &image->facts;
    if (!scan->channels || !image->kernel || !image->method || strcmp(image->method, "fbp") != 0) return false;
    *m = (model){.tau_mm = tg_scan_pitch_mm(scan), .aperture_mm = facts->aperture_mm.v};
    m->unit_per_mu = image->unit == TG_HU ? 1000 / facts->mu_water_per_mm.v : 1;
    if (scan->geometry != TG_PARALLEL && facts->focal_spot_mm.v > 0)
        m->focal_spot_mm = facts->focal_spot_mm.v * (1 - scan->source_axis_mm / scan->source_detector_mm);
    if (sum_of_squares(scan, &m->views_rad2) != TG_OK || tg_kernel_read(image->kernel, &m->kernel, NULL) != TG_OK)
        return false;
    m->end = fmin(tg_kernel_end(&m->kernel), 1);
    return true;
}

static double sinc(double x)
{
    return x != 0 ? sin(M_PI * x) / (M_PI * x) : 1;
}

static double response(const model *m, double f_per_mm)
{
    const double fraction = 2 * f_per_mm * m->tau_mm;
    return fraction <= m->end ? tg_kernel_response(&m->kernel, fraction) : 0;
}

static double mtf(const model *m, double f_per_mm)
{
    return fabs(response(m, f_per_mm) / tg_kernel_response(&m->kernel, 0) * pow(sinc(f_per_mm * m->tau_mm), 2) *
                sinc(f_per_mm * m->aperture_mm) * sinc(f_per_mm * m->focal_spot_mm));
}

static double mtf_frequency(const model *m, double level)
{
    enum { STEPS = 1000, HALVINGS = 40 };
    const double step = m->end / (2 * m->tau_mm) / STEPS;
    for (int i = 1; i <= STEPS; i++) {
        double low = (i - 1) * step, high = i * step;
        if (!(mtf(m, low) > level && mtf(m, high) <= level)) continue;
        for (int k = 0; k < HALVINGS; k++) {
            const double middle = 0.5 * (low + high);
            *(mtf(m, middle) > level ? &low : &high) = middle;
        }
        return high;
    }
    return NAN;
}

static double nps(const model *m, double line_variance, double f_per_mm)
{
    if (!(f_per_mm > 0)) return f_per_mm == 0 ? 0 : NAN;
    /* the spectrum of the filtered samples repeats every 1 / tau; interpolation multiplies it by sinc^4 */
    const double rho = fabs(f_per_mm - round(f_per_mm * m->tau_mm) / m->tau_mm);
    const double filtered = rho * response(m, rho);
    return m->unit_per_mu * m->unit_per_mu * m->views_rad2 / M_PI * m->tau_mm * line_variance * filtered * filtered *
           pow(sinc(f_per_mm * m->tau_mm), 4) / f_per_mm;
}

/* All repetitions of the spectrum together: sum_k sinc^4(u + k) = (2 + cos 2 pi u) / 3. */
static double sd(const model *m, double line_variance)
{
    enum { CELLS = 4096 };
    const double du = 0.5 * m->end / CELLS;
    double sum = 0;
    for (int i = 0; i < CELLS; i++) {
        const double u = (i + 0.5) * du, filtered = u * response(m, u / m->tau_mm);
        sum += filtered * filtered * (2 + cos(2 * M_PI * u)) / 3 * du;
    }
    return m->unit_per_mu * sqrt(2 * sum * m->views_rad2 * line_variance) / m->tau_mm;
}

double tg_theory_mtf(const tg_image *image, double f_per_mm)
{
    model m = {0};
    double answer = NAN;
    if (understand(image, &m)) answer = mtf(&m, f_per_mm);
    tg_kernel_free(&m.kernel);
    return answer;
}

double tg_theory_mtf_frequency(const tg_image *image, double level)
{
    model m = {0};
    double answer = NAN;
    if (understand(image, &m)) answer = mtf_frequency(&m, level);
    tg_kernel_free(&m.kernel);
    return answer;
}

double tg_theory_nps(const tg_image *image, double line_variance, double f_per_mm)
{
    model m = {0};
    double answer = NAN;
    if (understand(image, &m)) answer = nps(&m, line_variance, f_per_mm);
    tg_kernel_free(&m.kernel);
    return answer;
}

double tg_theory_sd(const tg_image *image, double line_variance)
{
    model m = {0};
    double answer = NAN;
    if (understand(image, &m)) answer = sd(&m, line_variance);
    tg_kernel_free(&m.kernel);
    return answer;
}
