#ifndef TG_TARGET_H
#define TG_TARGET_H
/** A target is what every measure looks at: the slices of one phantom, where the phantom stands in them, how wide the
 *  spread is and how the noise hangs together. */
#include "io/image.h"
#include "io/progress.h"
#include "metrics/result.h"
#include "metrics/theory.h"
#include "phantoms/phantom.h"

#include <stdint.h>

/** The noise of one slice: a stationary texture (autocorrelation) whose strength may vary with place. */
typedef struct {
    size_t half;             /* lags -half..half pixels along each axis */
    double *autocorrelation; /* {2 half + 1, 2 half + 1} rows along y; 1 at lag 0; owned */
    double sd;               /* of the uniform part of the body, in the image's unit */
    double dof;              /* effective degrees of freedom of sd */
    double level, robust_sd; /* of the uniform part of the body in the first slice, by medians: structure counts, what
                                stands in a small part of it does not */
    double pixels;           /* behind the texture, all slices together; 0: it is known exactly */
} tg_noise;

typedef struct {
    const tg_phantom *phantom;
    tg_unit unit;
    const tg_image *image; /* the first image: its scan, facts, kernel, limits */
    tg_grid grid;          /* of one slice */
    const float **slice;   /* {n} planes of the grid, borrowed from the images; the array is owned */
    size_t n;
    float *mean; /* mean of the slices, owned */
    double z_mm; /* of the section of the phantom that is measured */
    /* where the phantom stands: world = turn(phantom) + shift */
    double shift_mm[2], turn_rad;
    double shift_u_mm, turn_u_rad; /* standard uncertainties */
    bool turn_known;               /* false: the pattern has no rotation, turn_rad is 0 */
    int body;                      /* the solid that is the phantom's body: the first one */
    double spread_mm;              /* full width at half maximum of the spread at the body's edge */
    int16_t *label;                /* {grid} the solid at each pixel, TG_NO_SOLID outside, owned */
    float *clear_mm;               /* {grid} distance to the nearest pixel of another solid, owned */
    tg_noise noise;
    tg_theory theory; /* what is to be expected of these slices */
    char lost[200];   /* why the phantom could not be found; "" when it was */
} tg_target;

/** May another image be pooled with the first: grid, unit, method and kernel? @param file  that it came from, or NULL
 */
tg_code tg_target_repeats(const tg_image *first, const tg_image *other, const char *file, tg_error *e);

/** Find the phantom in its images and learn spread and noise.
 *  Shift to a tenth of a pixel within 30 mm of its place, any rotation where the pattern has one. When it cannot be
 * found the target is still valid, `lost` says why, and every measure answers null with that why.
 *  @param image  {n} images that repeat the first, borrowed for the life of the target; all slices that lie inside the
 *                phantom are pooled, with a warning about those left out (empty ones, too) and about one that does
 *                not agree with the others
 *  @return TG_OK, TG_INPUT (no repeats), TG_MACHINE, TG_STOPPED */
tg_code tg_target_create(const tg_image *image, size_t n, const tg_phantom *phantom, const tg_progress *progress,
                         tg_target *out, tg_error *e);
void tg_target_free(tg_target *t);

/** Where a point of the phantom stands in the image, and back. {2} [mm] */
void tg_target_to_image(const tg_target *t, const double phantom_mm[2], double image_mm[2]);
void tg_target_to_phantom(const tg_target *t, const double image_mm[2], double phantom_mm[2]);

/** The circle that a solid cuts in the measured section (image coordinates).
 *  @return false: the section is no circle, or the solid does not reach it */
bool tg_target_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm);

/** What is around a circle of the image: the solid at most of the places two pixels outside of it; TG_NO_SOLID. */
int tg_target_around(const tg_target *t, const double centre_mm[2], double radius_mm);

/** Largest circle around the middle of a solid's section that stays inside it, for solids of any shape: for regions. */
bool tg_target_inner_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm);

/** Pixels of a region that belong to one solid and keep a distance from all others.
 *  @param clear_mm   distance from every other solid; the outline of `solid` itself counts too
 *  @param index      {*n} flat indices into a slice, tg_free
 *  @return TG_OK with *n = 0 when nothing is left; TG_MACHINE */
tg_code tg_target_pixels(const tg_target *t, const tg_region *region, int solid, double clear_mm, size_t **index,
                         size_t *n, tg_error *e);

#endif
