#ifndef TG_NOISE_H
#define TG_NOISE_H
#include "metrics/target.h"
#include "metrics/trend.h"

/** Noise of a target's slices: from their differences to the mean where there are at least two, else from the uniform
 *  part of the body (three spread widths from everything else) after a smooth trend is removed, with what that took
 *  from the low frequencies put back. The autocorrelation is a sum over pairs of pixels over their number, kept as it
 *  is up to the size of the regions of a body and tapered to 0 beyond (Blackman and Tukey 1958).
 *  Where there is no uniform part the answer is TG_OK, with sd NaN and pixels that know nothing of each other. */
tg_code tg_noise_learn(const tg_target *t, tg_noise *noise, tg_error *e);
void tg_noise_free(tg_noise *noise);

/** The pixels of the body that only noise and a smooth trend tell apart: three spread widths from everything else and
 *  within the limits of the file's pixel type.  @param index  {*n} flat indices into a slice, tg_free */
tg_code tg_noise_pixels(const tg_target *t, size_t **index, size_t *n, tg_error *e);

/** What the body stands out by from nothing: about 1000 HU, or its attenuation. A measure of what matters. */
double tg_noise_scale(const tg_target *t);

/** Variance of the line integrals through a point of the image that the phantom and the image's photons let expect,
 * mean over directions: exp(p) / N. NaN where the image does not tell energy and photons. */
double tg_noise_line_variance(const tg_target *t, const double at_mm[2]);

/** Variance of a weighted sum of pixels for noise of unit SD, correlations included:
 *  sum_ij w_i w_j C(i - j).  @param index {n} flat indices into a slice of width nx  @param weight {n}, NULL: 1/n each
 */
double tg_noise_mean_variance(const tg_noise *noise, size_t nx, const size_t *index, const double *weight, size_t n);

/** Effective number of independent pixels behind the SD of a region: n^2 / sum_ij C^2(i - j).
 *  NaN when there is no memory, as for the variance. */
double tg_noise_independent(const tg_noise *noise, size_t nx, const size_t *index, size_t n);

/** What the pixels of a region are worth against noise of unit SD, correlations included. */
typedef struct {
    double mean_variance; /* of their plain mean */
    double mean_dof;      /* degrees of freedom with which the texture tells that variance; INFINITY: known exactly */
    double freedom;       /* expected sum of squares around a trend fitted to them (n - modes for white noise) */
    double sd_dof;        /* degrees of freedom of the SD from that sum */
} tg_noise_worth;

/** @param trend  made over the same pixels  @param out  written on success */
tg_code tg_noise_weigh(const tg_noise *noise, const tg_trend *trend, const size_t *index, size_t n, tg_noise_worth *out,
                       tg_error *e);

#endif
