#ifndef TG_TREND_H
#define TG_TREND_H
#include <stddef.h>

/** How many smooth surfaces a trend has: 1, then x and y, then x^2, xy and y^2, then r^4. */
enum { TG_CONSTANT = 1, TG_PLANE = 3, TG_QUADRATIC = 6, TG_CUP = 7 };

/** Smooth surfaces over a set of pixels, made orthonormal over that set: their coefficients are plain sums, and what a
 *  surface takes away from noise is the variance of one such sum. */
typedef struct {
    size_t modes, nx;
    double origin[2], scale;     /* of the coordinates [pixel] */
    double mode[TG_CUP][TG_CUP]; /* each as a sum of the powers above; all 0: the set cannot tell it from others */
} tg_trend;

/** @param modes  TG_CONSTANT, TG_PLANE, TG_QUADRATIC or TG_CUP  @param index  {n} flat indices into a slice of width nx
 */
void tg_trend_over(size_t modes, const size_t *index, size_t n, size_t nx, tg_trend *trend);

/** One surface over a set of pixels.  @param value  {n} written */
void tg_trend_mode(const tg_trend *trend, size_t k, const size_t *index, size_t n, double *value);

/** Least squares over the same set.  @param v  slice  @param minus  slice that is subtracted first, or NULL
 *  @param coefficient  {modes} written */
void tg_trend_fit(const tg_trend *trend, const size_t *index, size_t n, const float *v, const float *minus,
                  double *coefficient);

/** What a fit leaves over.  @param residual  {n} written, or NULL  @return sum of squares */
double tg_trend_remove(const tg_trend *trend, const size_t *index, size_t n, const float *v, const float *minus,
                       double *residual);

/** Slope of a fitted surface along x and y at the middle of the set. {2} [unit / pixel] */
void tg_trend_slope(const tg_trend *trend, const double *coefficient, double slope[2]);

#endif
