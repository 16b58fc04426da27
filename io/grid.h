#ifndef TG_GRID_H
#define TG_GRID_H
#include <stddef.h>

/** Where the pixels of an image are.
 *
 *      y ^            v[(iz n[1] + iy) n[0] + ix]
 *        |            x(ix) = first_mm[0] + ix step_mm[0]     (pixel CENTRES)
 *  iy=1  |  [2] [3]   row 0 has the smallest y, as in FITS; only writers of pictures flip
 *  iy=0  |  [0] [1]
 *        +-------> x  right-handed: x to the right, y up, z along the rotation axis towards the viewer;
 *                     the rotation axis is x = y = 0; angles are counter-clockwise from +x
 */
typedef struct {
    size_t n[3];        /* pixels along x, y, z; n[2] = 1: one slice */
    double step_mm[3];  /* > 0 */
    double first_mm[3]; /* centre of pixel 0 */
} tg_grid;

/** A square slice of pixels x pixels over field_mm x field_mm around a centre.
 *  @param centre_mm  {2} x, y of the middle of the field */
tg_grid tg_grid_square(size_t pixels, double field_mm, const double centre_mm[2]);

/** Coordinate of a fractional index along an axis, and back. [mm] */
double tg_grid_mm(const tg_grid *g, int axis, double index);
double tg_grid_index(const tg_grid *g, int axis, double mm);

/** Samples in one slice and in all. The grid's maker has checked that the products fit. */
size_t tg_grid_slice(const tg_grid *g);
size_t tg_grid_samples(const tg_grid *g);

#endif
