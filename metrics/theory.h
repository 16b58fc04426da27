#ifndef TG_THEORY_H
#define TG_THEORY_H
#include "io/image.h"
#include "recon/kernel.h"

/** What the theory of filtered back-projection with linear interpolation expects of an image, from its scan, facts and
 *  kernel alone. Frequencies in 1/mm. Answers NaN where the image does not say enough: another method, an unknown scan,
 *  a kernel file that is not there, HU without the water value. */
typedef struct {
    bool known;           /* else no answer */
    tg_kernel kernel;     /* owned */
    double tau_mm;        /* pitch at the axis */
    double end;           /* fraction of Nyquist where the response ends, at most 1 */
    double aperture_mm;   /* NaN: unknown */
    double focal_spot_mm; /* at the axis; 0: a point, or unknown */
    double views_rad2;    /* sum of the squared shares of the half turn: pi^2 / M for M even views */
    double unit_per_mu;   /* 1, or HU per 1/mm; NaN: unknown */
} tg_theory;

/** Read from an image what its theory needs. */
void tg_theory_learn(const tg_image *image, tg_theory *theory);
void tg_theory_free(tg_theory *theory);

/** MTF on the axis, 1 at 0: window, interpolation, aperture, and the focal spot where it is known (Kak and Slaney 1988,
 *  ch. 3). 0 above the Nyquist frequency; NaN when the aperture is unknown. */
double tg_theory_mtf(const tg_theory *theory, double f_per_mm);

/** Frequency where that first falls to a level; NaN when it does not below the end of the window or Nyquist. */
double tg_theory_mtf_frequency(const tg_theory *theory, double level);

/** NPS of one slice [unit^2 mm^2] for a variance of line integrals (Kijewski and Judy 1987): with the repetition of the
 *  ramp above Nyquist that interpolation lets through, without pixel aliasing; for fans near the axis. */
double tg_theory_nps(const tg_theory *theory, double line_variance, double f_per_mm);

/** SD of one slice in the image's unit near the axis (ten channels off it or more), for a variance of line integrals
 *  behind the object: the integral of that NPS (Chesler, Riederer and Pelc 1977). */
double tg_theory_sd(const tg_theory *theory, double line_variance);

#endif
