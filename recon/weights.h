#ifndef TG_WEIGHTS_H
#define TG_WEIGHTS_H
#include "io/scan.h"

/** The share of the half turn that each view stands for: half of the gaps to both neighbours, angles taken modulo 180
 *  degrees (parallel) or 360 degrees (fans, halved because every ray is then measured twice). The shares add up to pi
 *  for any order, irregular steps, several turns, and views repeated at the end.
 *
 *  A gap above four times the usual one and 2 degrees, or above 45 degrees, is refused: the scan lacks views; one above
 *  three times the usual draws a warning.
 *  @param weight_rad  {views} written
 *  @return TG_OK, TG_INPUT, TG_MACHINE */
tg_code tg_angle_weights(const tg_scan *scan, double *weight_rad, tg_error *e);

#endif
