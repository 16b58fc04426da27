#ifndef TG_NOISE_H
#define TG_NOISE_H
#include "metrics/target.h"

#include <stdint.h>

/** Noise of a target's slices: from the differences of slices where there are at least two, else from the uniform
 *  part of the body after a smooth trend is removed (and the loss by that removal put back). */
tg_code tg_noise_learn(const tg_target *t, tg_noise *noise, tg_error *e);
void tg_noise_free(tg_noise *noise);

/** Variance of a weighted sum of pixels for noise of unit SD, correlations included:
 *  sum_ij w_i w_j C(i - j).  @param index {n} flat indices into a slice of width nx  @param weight {n}, NULL: 1/n each
 */
double tg_noise_mean_variance(const tg_noise *noise, size_t nx, const size_t *index, const double *weight, size_t n);

/** Effective number of independent pixels behind the SD of a region: n^2 / sum_ij C^2(i - j). */
double tg_noise_independent(const tg_noise *noise, size_t nx, const size_t *index, size_t n);

/** A field of noise with this texture and unit SD: a plan for patches of one size, then any number of draws.
 *  Pure function of seed and draw. */
typedef struct tg_noise_plan tg_noise_plan;
tg_code tg_noise_plan_create(const tg_noise *noise, size_t nx, size_t ny, tg_noise_plan **plan, tg_error *e);
void tg_noise_draw(const tg_noise_plan *plan, uint64_t seed, uint64_t draw, float *patch /* {ny, nx} */);
void tg_noise_plan_free(tg_noise_plan *plan);

#endif
