#ifndef TG_THEORY_H
#define TG_THEORY_H
#include "io/image.h"

/** What the theory of filtered back-projection expects of an image, from its scan, facts and kernel alone.
 *  Answers NaN where the image does not say enough (another method, unknown scan, a kernel file that is not there). */

/** MTF at a frequency [1/mm] on the axis: window, linear interpolation, aperture (Kak and Slaney 1988, ch. 3). */
double tg_theory_mtf(const tg_image *image, double f_per_mm);
/** Frequency where that falls to a level; NaN when it never does below the interpolation's first zero. */
double tg_theory_mtf_frequency(const tg_image *image, double level);
/** NPS of one slice [unit^2 mm^2] for a variance of line integrals (Kijewski and Judy 1987), without pixel aliasing. */
double tg_theory_nps(const tg_image *image, double line_variance, double f_per_mm);
/** SD of one slice in the image's unit on the axis, for a variance of line integrals behind the object. */
double tg_theory_sd(const tg_image *image, double line_variance);

#endif
