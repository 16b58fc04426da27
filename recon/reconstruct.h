#ifndef TG_RECONSTRUCT_H
#define TG_RECONSTRUCT_H
#include "io/image.h"
#include "io/progress.h"
#include "io/sinogram.h"
#include "recon/recipe.h"

/** One method of reconstruction.
 *  @param image  zeroed pixels on the recipe's grid, with a copy of the scan in which the recipe's axis channel stands;
 *                the method writes 1/mm */
typedef tg_code tg_method(const tg_sinogram *s, const tg_recipe *r, tg_image *image, const tg_progress *progress,
                          tg_error *e);

/** Sinogram and recipe to image, one slice per row, in HU when the water value is known (recipe, then scan), else 1/mm.
 *  Bit-identical for any number of threads.
 *  @param image  created here; its facts and scan are copies of the sinogram's
 *  @return TG_OK, TG_INPUT, TG_MACHINE, TG_STOPPED */
tg_code tg_reconstruct(const tg_sinogram *s, const tg_recipe *r, const tg_progress *progress, tg_image *image,
                       tg_error *e);

/** What the table of keys cannot know: is there such a kernel? Told with its key and line.
 *  @param file  the description they stand in; NULL: they are options
 *  @return TG_OK, TG_INPUT, TG_USAGE for options, TG_MACHINE */
tg_code tg_recipe_check(const tg_recipe *r, const char *file, tg_error *e);

/** Turn an image in 1/mm to HU in place: 1000 (mu - mu_water) / mu_water. */
void tg_to_hu(tg_image *image, double mu_water_per_mm);

#endif
