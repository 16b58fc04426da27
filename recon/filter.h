#ifndef TG_FILTER_H
#define TG_FILTER_H
/** The filter of filtered back-projection, the same for all geometries once a fan's row is weighted with cos(gamma):
 *
 *      q(n) = w cos(gamma_n) p(n)  convolved with  tau h(n),   tau the pitch at the axis
 *
 *  h is the band-limited ramp sampled in space, so that nothing is lost at zero frequency; the kernel's window
 *  multiplies its spectrum (Kak and Slaney 1988, ch. 3). */
#include "io/scan.h"
#include "recon/kernel.h"

/** Tap n of the ramp filter [1/mm2]: 1/(4 tau^2) at 0, 0 at other even n, -1/(pi n tau)^2 at odd n; times
 *  (gamma / sin gamma)^2, gamma = n step, for equiangular fans. */
double tg_ramp_tap_per_mm2(const tg_scan *scan, size_t n);

typedef struct tg_filter tg_filter;

/** Plan the filter of a scan's rows, padded to at least twice the channels.
 *  @param filter  set on success
 *  @return TG_OK, TG_INPUT (a fan of 90 degrees or more to a side), TG_MACHINE */
tg_code tg_filter_create(const tg_scan *scan, const tg_kernel *kernel, tg_filter **filter, tg_error *e);
void tg_filter_free(tg_filter *filter);

/** Floats from one filtered row to the next; at least twice the channels. */
size_t tg_filter_stride(const tg_filter *filter);

/** Filter the views of one slice, in parallel.
 *  @param weight    {views} factor w of each view
 *  @param line      {views, channels} line integrals [1]
 *  @param filtered  {views, stride} from tg_alloc: channels values [weight / mm] a row, and behind them the filter's
 *                   tail */
void tg_filter_apply(const tg_filter *filter, const double *weight, const float *line, float *filtered);

#endif
