#ifndef TG_LOCATE_H
#define TG_LOCATE_H
/** Where a phantom stands in a slice. */
#include "io/image.h"
#include "metrics/contour.h"

typedef struct {
    tg_pose pose;
    double shift_u_mm, turn_u_rad; /* standard uncertainties */
    bool turn_known;
    double spread_mm; /* full width at half maximum of the spread at the body's edge */
    char lost[200];   /* why it could not be found, "" when it was */
} tg_located;

/** Find a phantom by the outline of its first solid, then its turn by the pattern of the others.
 *  @param image  its grid and facts; slice {grid} is what is looked at
 *  @return TG_OK (lost or not), TG_INPUT (a material without a value), TG_MACHINE */
tg_code tg_locate(const tg_image *image, const float *slice, const tg_phantom *phantom, double z_mm, tg_located *out,
                  tg_error *e);

/** The energy that attenuation is looked up at: the scan's, or half of the tube voltage (common practice), or 70 keV.
 */
double tg_locate_energy_kev(const tg_facts *facts);

/** Find the turn of a phantom whose outline is known: the polar image of the slice against that of the phantom, by the
 *  correlation over the angle.
 *  @param m,o  the body and its outline as found  @param mu  {n_materials} attenuation of the materials
 *  @param out  turn_known, pose.turn_rad, turn_u_rad and lost are written */
tg_code tg_locate_turn(const tg_contour_model *m, const tg_contour *o, const tg_phantom *phantom, const double *mu,
                       tg_located *out, tg_error *e);

#endif
