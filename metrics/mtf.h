#ifndef TG_MTF_H
#define TG_MTF_H
/** The modulation transfer function (MTF) as a ratio of two linear sums over the pixels v_j of the mean image,
 *
 *      MTF(f) = sum_j k_j(f) v_j / (B(f) sum_j k_j(0) v_j),
 *
 *  where the kernel k is that of a point (point.c) or of a circular edge (edge.c) and B is what the size of the object
 *  itself does. Nothing is binned, smoothed or differenced, so none of that has to be corrected for, and the noise of a
 *  figure follows exactly, correlations included: a frequency at a level is a linear sum of pixels, too, as long as its
 *  relative uncertainty is small. A smooth kernel that ends inside the band of the pixels makes the sum over pixels
 *  equal to the integral over the plane (Poisson's formula); a spread beyond that band is the pixels' aliasing. */
#include "metrics/target.h"

/** What the size of an object does to its spectrum: the modulation that is left. @param f_per_mm >= 0 */
double tg_mtf_disc(double diameter_mm, double f_per_mm); /* section of a wire: 2 J1(x) / x, x = pi d f */
double tg_mtf_ball(double diameter_mm, double f_per_mm); /* projection of a bead: 3 (sin x - x cos x) / x^3 */

/** Flat top of a taper, then a raised cosine down to 0 (Tukey 1967).  @param slope  its derivative; may be NULL */
double tg_taper(double x, double flat, double end, double *slope);

/** A frequency at a level; NaN with a why. */
typedef struct {
    double f_per_mm;
    double u_noise, dof;         /* random standard uncertainty */
    double u_method, u_sampling; /* standard uncertainties of kind B */
    char why[200];
} tg_mtf_level;

enum { TG_MTF_HALF, TG_MTF_TENTH, TG_MTF_LEVELS, TG_MTF_POINTS = 129 };
extern const double tg_mtf_level_of[TG_MTF_LEVELS]; /* 0.5, 0.1 */

typedef struct {
    tg_mtf_level level[TG_MTF_LEVELS];
    size_t n; /* points of the curve, the first at f = 0; 0: none could be had */
    double f_per_mm[TG_MTF_POINTS], modulation[TG_MTF_POINTS];
    tg_region region; /* where it was measured */
} tg_mtf;

/** By the image of a thin cylinder or a small sphere. @return TG_OK (with or without a why), TG_MACHINE */
tg_code tg_mtf_by_point(const tg_target *t, int solid, tg_mtf *out, tg_error *e);
/** By the image of the edge of a round solid. @return TG_OK (with or without a why), TG_MACHINE */
tg_code tg_mtf_by_edge(const tg_target *t, int solid, tg_mtf *out, tg_error *e);

/** No figure at either level. printf-like */
void tg_mtf_refuse(tg_mtf *out, const char *format, ...) __attribute__((format(printf, 2, 3)));

enum { TG_SPREAD_TERMS = 4 };

/** Pixels around an object and the kernel that makes their spectrum. */
typedef struct tg_spread {
    size_t n, room;
    size_t *index;            /* {n} flat indices into a slice */
    double *r_mm;             /* {n} distance from the centre of the object */
    double *phi_rad;          /* {n} direction from there */
    double *share;            /* {n} the pixel's share of the integral: an area, perhaps over the circumference */
    double *net;              /* {n} the mean image without its background */
    size_t knots;             /* of the sum over pixels of share times net, gathered by distance */
    double *profile;          /* {knots} */
    double least_mm, knot_mm; /* distance of the first, and between two */
    size_t terms;             /* of the background, found by least squares over the pixels where its `fit` is not 0 */
    double *fit;              /* {n, TG_SPREAD_TERMS} regressors */
    double *model;            /* {n, TG_SPREAD_TERMS} what a coefficient adds to the background of a pixel */
    size_t fitted;            /* pixels that the fit saw */
    double rest;              /* sum of their squared residuals */
    double inverse[TG_SPREAD_TERMS * TG_SPREAD_TERMS];
    double (*kernel)(const struct tg_spread *s, double r_mm, double f_per_mm);
    double radius_mm;                                  /* of the edge; 0: a point */
    double flat_mm, end_mm;                            /* of the taper around point or edge */
    double width_mm;                                   /* full width at half maximum of the spread, as known so far */
    double (*object)(double size_mm, double f_per_mm); /* B; NULL: 1 */
    double size_mm;
} tg_spread;

/** Room for the pixels of a grid at distances from least_mm to most_mm; nothing in it yet. */
tg_code tg_spread_create(const tg_grid *g, double least_mm, double most_mm, tg_spread *s, tg_error *e);
void tg_spread_free(tg_spread *s);

/** Fit and subtract the background of all pixels gathered. @return false: too few pixels for it */
bool tg_spread_settle(tg_spread *s, const float *mean);

/** sum_j kernel(r_j, f) share_j net_j */
double tg_spread_sum(const tg_spread *s, double f_per_mm);

/** Standard uncertainty that the noise gives to a sum over the pixels, sum_j w_j net_j, the fit of the background taken
 *  along.  @param w  {n} changed  @param dof  its degrees of freedom */
double tg_spread_noise(const tg_target *t, const tg_spread *s, double *w, double *dof);

/** Curve and frequencies at the levels, without uncertainties; a why where the object's total does not stand out of the
 *  noise by ten standard uncertainties: a ratio to it is linear in the noise only then.
 *  @param width_mm  in: s->width_mm; changed when the curve shows another width by more than a twentieth: pixels and
 *                   taper should then be chosen anew */
tg_code tg_spread_curve(const tg_target *t, const tg_spread *s, double *width_mm, tg_mtf *out, tg_error *e);

/** Uncertainties of the frequencies, once the region is known; those too uncertain for a linear law get a why. */
tg_code tg_spread_uncertainty(const tg_target *t, const tg_spread *s, tg_mtf *out, tg_error *e);

/** Where the middle of a thin or small solid stands, by the maximum of its product with a Gaussian as wide as its
 * image: a centre of weight that noise far out does not move.
 *  @param centre_mm  {2} of the image  @param u_noise,dof,u_sampling  standard uncertainties along one axis [mm]
 *  @param why  {200} why it could not be found; "" when it was */
tg_code tg_point_find(const tg_target *t, int solid, double centre_mm[2], double *u_noise, double *dof,
                      double *u_sampling, char why[200], tg_error *e);

/** Is this pixel a number inside the range of the file's pixel type, in every slice? Else the reason goes to `out`. */
bool tg_mtf_usable(const tg_target *t, size_t index, tg_mtf *out);

/** Something that stands where only a solid and what surrounds it should be: a pixel, or a solid too thin for one. */
typedef struct {
    double r_mm, phi_rad; /* from the centre */
    int solid;            /* TG_NO_SOLID: the outside */
} tg_intruder;

/** Intruders around a circle of radius_mm up to to_mm from its centre and from from_mm on.
 *  @param list  {*n} tg_free */
tg_code tg_mtf_intruders(const tg_target *t, int solid, const double centre_mm[2], double radius_mm, double from_mm,
                         double to_mm, tg_intruder **list, size_t *n, tg_error *e);

/** Its name, for people. */
const char *tg_intruder_name(const tg_target *t, const tg_intruder *i);

#endif
