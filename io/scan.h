#ifndef TG_SCAN_H
#define TG_SCAN_H
/** How a scan looks at the object. Radians and mm, 0-based, signs normalised: this is the only drawing of it.
 *
 *  Parallel ray (theta, s):  x cos(theta) + y sin(theta) = s.
 *  Fan ray (beta, gamma):    the parallel ray theta = beta + gamma, s = R sin(gamma), R = source_axis_mm.
 *
 *          S  source of view beta at R (-sin beta, cos beta)
 *         /|\
 *        / | \       gamma counts towards +t, t = x cos(beta) + y sin(beta);
 *       /  |  \      l = -x sin(beta) + y cos(beta); a point is seen under gamma = atan2(t, R - l)
 *      /   o   \     o the rotation axis
 *     /    |    \
 *    ------+------>  channels, at D = source_detector_mm; flat detector: gamma = atan(u / D)
 */
#include "io/fields.h"

#define TG_DEGREE 0.017453292519943295 /* rad */

typedef enum { TG_PARALLEL, TG_FAN_EQUIANGULAR, TG_FAN_EQUISPACED } tg_geometry;
#define TG_GEOMETRIES "parallel fan-equiangular fan-equispaced" /* in the order of the enum */

typedef struct {
    tg_geometry geometry;
    double source_axis_mm, source_detector_mm; /* 0 for parallel */
    size_t channels, views, rows;              /* channels 0: no scan is known (images) */
    double channel_step; /* > 0; parallel: mm at the axis; equiangular: rad; equispaced: mm at the detector */
    double channel_zero; /* 0-based fractional channel met by the ray through the axis */
    double row_step_mm;  /* of a stack of slices, at the axis */
    double row_zero;     /* 0-based fractional row of z = 0 */
    double *angle_rad;   /* {views}, owned; theta or beta of each view, any order */
} tg_scan;

void tg_scan_free(tg_scan *scan);
tg_code tg_scan_copy(const tg_scan *scan, tg_scan *copy, tg_error *e);

/** Distance of neighbouring rays at the axis [mm]; Nyquist frequency always means 1 / (2 tg_scan_pitch_mm). */
double tg_scan_pitch_mm(const tg_scan *scan);

/** Coordinate of a fractional channel: s [mm], gamma [rad] or u [mm at the detector]. */
double tg_scan_coordinate(const tg_scan *scan, double channel);

/** Fan angle gamma [rad] of a coordinate; 0 for parallel. */
double tg_scan_fan_angle(const tg_scan *scan, double coordinate);

/** The ray of a fractional channel in the view at angle_rad: a point {2} [mm] and a unit direction {2}.
 *  For fans the point is the source; for parallel it is the foot of the axis on the ray. */
void tg_scan_ray(const tg_scan *scan, double angle_rad, double channel, double point_mm[2], double direction[2]);

/** Radius [mm] around the axis that every view sees whole: the field of view. */
double tg_scan_field_radius_mm(const tg_scan *scan);

/** What is known of a scan beyond its geometry; a number is NaN, a text NULL when unknown.
 *  tg_fact_fields names the keyword of each in a file. */
typedef struct {
    tg_number tube_kv, energy_kev;
    tg_number photons_per_ray; /* per channel and view, without object */
    tg_number aperture_mm;     /* width of a channel's aperture, scaled to the axis */
    tg_number focal_spot_mm;   /* width of the focal spot, at the source */
    tg_number mu_water_per_mm; /* 1/mm: makes HU */
    tg_number seed;
    tg_text phantom, scanner;
} tg_facts;

extern const tg_field tg_fact_fields[];
tg_code tg_facts_copy(const tg_facts *facts, tg_facts *copy, tg_error *e);

#endif
