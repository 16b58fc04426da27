#ifndef TG_PRESENCE_H
#define TG_PRESENCE_H
/** Whether the image shows what the description lets stand out. */
#include "metrics/target.h"

typedef enum { TG_UNTOLD, TG_STANDS, TG_MISSING } tg_presence;

/** Does a solid stand out at its place? Median of the inner half of its radius against that of a ring around it.
 *  TG_UNTOLD: no circle, below two spread widths in radius, no room for the ring, or nothing that should stand out:
 *  a step below ten standard uncertainties, or below 5 % of the body where the image does not tell its energy.
 *  TG_MISSING: the step is below five standard uncertainties, or below both 1 % of the body and a quarter of what it
 *  should be. A rod of another material stands where its own step is there.
 *  @return TG_OK, TG_INPUT (a material without a value), TG_MACHINE */
tg_code tg_presence_find(const tg_target *t, int solid, tg_presence *out, tg_error *e);

/** Why the phantom is not the one of the description: most of the solids that should stand out, two at least, do not.
 *  @param lost  written when that is so */
tg_code tg_presence_doubt(const tg_target *t, char lost[200], tg_error *e);

#endif
