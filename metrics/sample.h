#ifndef TG_SAMPLE_H
#define TG_SAMPLE_H
#include "io/grid.h"

/** A slice between its pixels: cubic convolution (Keys 1981), which leaves edges where they are.
 *  @param slice {grid}  @return NaN off the grid (less than a pixel from its border) and beside pixels without value */
double tg_sample(const float *slice, const tg_grid *grid, const double at_mm[2]);

#endif
