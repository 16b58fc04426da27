#ifndef TG_CONTOUR_H
#define TG_CONTOUR_H
/** Where the outline of a solid is in an image: crossings of half of the local step, fitted by its section's shape. */
#include "io/grid.h"
#include "metrics/section.h"

/** What to look for. */
typedef struct {
    const tg_solid *solid;
    double z_mm;
    double middle_mm[2]; /* of its section, in the phantom */
    double width_mm;     /* how far inside and outside of the outline the levels are taken */
    double spread_mm;    /* full width at half maximum of the spread, as far as it is known */
    bool round;          /* the section is a circle */
    bool turns;          /* fit the turn, too */
    const float *image;  /* {grid} */
    const tg_grid *grid;
} tg_contour_model;

/** An outline as it was found; in: where to start. */
typedef struct {
    double centre_mm[2];                     /* in the image, of the middle of the section */
    double turn_rad;                         /* of the phantom */
    double scale;                            /* measured size over nominal size */
    double centre_u_mm, turn_u_rad, scale_u; /* standard uncertainties, from the scatter of the crossings */
    double dof;                              /* behind them */
    double scatter_mm;                       /* SD of the crossings about the fit, outliers apart */
    double jitter_mm;       /* the same from neighbouring directions alone: noise, without what the shape is off by */
    double inside, outside; /* levels beside the outline, median over the directions */
    double seen;            /* part of the directions in which the outline was found */
    double gap_rad;         /* widest run of directions without */
} tg_contour;

/** Fit the shape of a section to points of the image: centre, scale and turn (where the model turns), by Gauss-Newton
 *  on the distances along the outline's normal with Tukey's weights (Beaton and Tukey 1974), so that cut-outs and
 *  strangers do not pull.
 *  @param point_mm {n} in the order of their directions, NaN where there is none  @param scratch {2 n}
 *  @param o  in: where to start; out: centre, scale, turn, their uncertainties, scatter, seen and gap
 *  @return false: too few points, or no fit */
bool tg_contour_fit(const tg_contour_model *m, const double (*point_mm)[2], size_t n, double *scratch, tg_contour *o);

/** Find the outline from a start within half of width_mm of it. Each direction is an arc whose profile is averaged; the
 *  crossing is the first one of half of the local step on the way from outside to inside.
 *  @param found  false: there is no such outline; o is then of no use
 *  @return TG_OK or TG_MACHINE */
tg_code tg_contour_find(const tg_contour_model *m, tg_contour *o, bool *found, tg_error *e);

/** Full width at half maximum of the spread across a found outline [mm], from the pixels beside it (each at its own
 *  distance), at least 1.2 pixels; NaN when the edge does not stand out. */
tg_code tg_contour_spread(const tg_contour_model *m, const tg_contour *o, double *spread_mm, tg_error *e);

#endif
