#ifndef TG_SLICES_H
#define TG_SLICES_H
/** Whether slices that are pooled belong together. */
#include "metrics/target.h"

/** Does a slice hold anything: two different values? A dead one does not. @param v {n} */
bool tg_slice_shows(const float *v, size_t n);

/** Which of {n} images a slice is a part of, for people: "slice 3 of image 2". */
void tg_slice_name(const tg_image *image, size_t n, const float *slice, char name[64]);

/** Hold mean and noise of each slice, over the uniform part of the body, against the median of all: a warning names a
 *  slice whose mean is off by 4 HU (0.4 % of the body in 1/mm; what is commonly allowed for water) and five standard
 *  uncertainties, or whose noise by a factor of 1.5 and five standard uncertainties.
 *  @param image  {n} that the slices of the target were borrowed from  @return TG_OK or TG_MACHINE */
tg_code tg_slices_compare(const tg_target *t, const tg_image *image, size_t n, tg_error *e);

#endif
