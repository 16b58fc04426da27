#ifndef TG_PLACE_H
#define TG_PLACE_H
/** Where a measure looks, and what the pixels there say. */
#include "metrics/target.h"
#include "metrics/trend.h"

enum {
    TG_LEAST_PIXELS = 100, /* of a region of the body: IEC 61223-3-5 */
    TG_LEAST_ROD = 9       /* of a region of a smaller solid: three for its plane, and some to tell its noise */
};

/** Spread widths that a region keeps from every other solid. */
#define TG_CLEAR_SPREADS 3.0

/** A region, its pixels and what every measure of a mean or an SD needs to know of them. */
typedef struct {
    tg_region region;
    size_t *index; /* {n} flat indices into a slice, owned */
    size_t n;
    double *slice_mean; /* {slices} mean over the pixels of each, owned */
    double mean;        /* over pixels and slices */
    double slope[2];    /* of the mean slice along x and y [unit / mm] */
    double sd, sd_dof;  /* of one slice, told by these pixels: around a trend, from differences where slices allow */
    double single_sd;   /* of one slice around a trend by itself: structure counts */
    double u, dof;      /* standard uncertainty of the mean by noise */
    bool clipped;       /* why: many pixels hold one value */
    char note[200];     /* moved from its place, and why; "" */
    char why[200];      /* why there is nothing to be had from it; "" */
} tg_place;

/** Does a pixel hold a number within the limits of the file's pixel type, in every slice? */
bool tg_place_valid(const tg_target *t, size_t pixel);

/** Take the pixels of place->region that belong to a solid and stay clear of others, and their figures.
 *  Fills `why` where that cannot be had; does nothing where it is filled already.
 *  @param clear_mm  from other solids and from the outline of this one  @param least  pixels needed
 *  @param modes     of the trend that the SD leaves out
 *  @return TG_OK or TG_MACHINE */
tg_code tg_place_take(const tg_target *t, int solid, double clear_mm, size_t least, size_t modes, tg_place *place,
                      tg_error *e);
void tg_place_free(tg_place *place);

/** Disc for the mean of a solid. Of a body: around its middle, a tenth of its diameter and at least 100 pixels
 *  (IEC 61223-3-5), at the nearest clear place where an insert is in the way. Of anything else: the inner 60 % of its
 *  radius or what is three spread widths inside its outline, whichever is less. */
tg_code tg_place_mean(const tg_target *t, int solid, tg_place *place, tg_error *e);

/** Middle and radius of a solid's section, of a circle inside where it is none. False: not in this section. */
bool tg_place_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm);

/** Standard uncertainty of a mean from where its region stands. */
double tg_place_position_u(const tg_target *t, const tg_place *place);

/** Budget line "slices" of a mean, or of the difference of two: what the slices scatter beyond their noise, where that
 *  is told from chance (F test, 1 %).  @param other  NULL: none */
void tg_place_budget_slices(const tg_target *t, const tg_place *place, const tg_place *other, tg_result *r);

/** Half width of the 95 % interval of an SD, relative to it: the smallest c for which s (1 - c) .. s (1 + c) covers
 *  sigma with 95 % when s^2 dof / sigma^2 is distributed as chi-square. */
double tg_place_sd_expanded(double dof);

/** A new result; null with the target's own reason when the phantom is lost (and then place work is not needed). */
tg_code tg_place_result(const tg_target *t, const char *measure, const char *where, const char *unit, tg_results *out,
                        tg_result **r, tg_error *e);

#endif
