#ifndef TG_LABEL_H
#define TG_LABEL_H
#include "io/grid.h"
#include "metrics/section.h"

#include <stdint.h>

/** The solid at each pixel of a slice of the phantom. A pixel belongs to the solid at its centre; a wire or foil
 *  thinner than a pixel marks the pixels that it runs through, so that none is lost.
 *  @param label  {grid} written: index of the solid, or TG_NO_SOLID */
void tg_label_paint(const tg_phantom *p, double z_mm, const tg_pose *pose, const tg_grid *grid, int16_t *label);

/** Exact Euclidean distance from each pixel to the nearest pixel of another label, INFINITY where there is none
 *  (Felzenszwalb and Huttenlocher 2012, run by run).
 *  @param clear_mm  {grid} written */
tg_code tg_label_clear(const int16_t *label, const tg_grid *grid, float *clear_mm, tg_error *e);

#endif
