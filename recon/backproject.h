#ifndef TG_BACKPROJECT_H
#define TG_BACKPROJECT_H
#include "io/grid.h"
#include "io/scan.h"

typedef struct tg_backprojector tg_backprojector;

/** Plan the back-projection of filtered rows onto the slices of a grid.
 *  @param stride  floats from one filtered row to the next, > channels
 *  @param out     set on success
 *  @return TG_OK or TG_MACHINE */
tg_code tg_backprojector_create(const tg_scan *scan, const tg_grid *grid, size_t stride, tg_backprojector **out,
                                tg_error *e);
void tg_backprojector_free(tg_backprojector *b);

/** Sum over all views of the filtered row where the view sees each pixel's centre, linear between channels, times
 *  (R / distance)^2 for fans: distance to the source for equiangular rows, along the central ray for equispaced ones
 *  (Kak and Slaney 1988, ch. 3). A ray off the detector, or a pixel at or behind the source, adds nothing.
 *  Bit-identical for any number of threads.
 *  @param filtered  {views, stride} finite; the channels and one more value of a row are read
 *  @param y,rows    rows [y, y + rows) of the grid are written
 *  @param slice     {ny, nx} */
void tg_backproject_rows(const tg_backprojector *b, const float *filtered, size_t y, size_t rows, float *slice);

#endif
