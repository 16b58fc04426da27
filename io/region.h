#ifndef TG_REGION_H
#define TG_REGION_H
#include "io/grid.h"

#include <stdbool.h>

typedef enum { TG_DISC, TG_RING, TG_BOX } tg_outline;

/** A region of a slice; a pixel belongs to it when its centre does. */
typedef struct {
    tg_outline outline;
    double centre_mm[2];
    double inner_mm, outer_mm; /* radii; inner_mm 0 for a disc */
    double half_mm[2];         /* of a box */
    double turn_rad;           /* of a box */
    char label[64];            /* "ptfe-rod", "body right" */
} tg_region;

bool tg_region_holds(const tg_region *r, double x_mm, double y_mm);

/** Rows and columns [x0, x1) x [y0, y1) of the grid that can hold the region. False: part of it is off the grid. */
bool tg_region_bounds(const tg_region *r, const tg_grid *g, size_t *x0, size_t *x1, size_t *y0, size_t *y1);

#endif
