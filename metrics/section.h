#ifndef TG_SECTION_H
#define TG_SECTION_H
/** What a plane z = const cuts out of a solid, and how the phantom is laid into an image. Coordinates are those of the
 *  phantom unless they are said to be the image's. */
#include "phantoms/phantom.h"

/** image = turn(phantom) + shift */
typedef struct {
    double shift_mm[2], turn_rad;
} tg_pose;

void tg_pose_to_image(const tg_pose *pose, const double phantom_mm[2], double image_mm[2]);
void tg_pose_to_phantom(const tg_pose *pose, const double image_mm[2], double phantom_mm[2]);

/** A point in the middle of a section (its centre where it has one).  @return false: the plane misses the solid */
bool tg_section_middle(const tg_solid *s, double z_mm, double middle_mm[2]);

/** Where the line through a point along an angle is inside: t in (t[0], t[1]) mm.  @return false: nowhere */
bool tg_section_chord(const tg_solid *s, double z_mm, const double point_mm[2], double angle_rad, double t[2]);

/** Distance from a point inside to the outline along an angle [mm]; 0 where the point is not inside. */
double tg_section_radius(const tg_solid *s, double z_mm, const double inside_mm[2], double angle_rad);

/** Is the section a circle (within 4e-6 of its radius: a cylinder may tilt by a tenth of a degree)?
 *  @param radius_mm  the largest circle around the middle that fits, whether it is one or not; 0: no section */
bool tg_section_circle(const tg_solid *s, double z_mm, double middle_mm[2], double *radius_mm);

double tg_section_area_mm2(const tg_solid *s, double z_mm);

/** Do two planes cut the same outlines, within a micrometre, out of every solid? */
bool tg_section_same(const tg_phantom *p, double z_mm, double other_z_mm);

/** How many turns about a point leave the sections of some solids as they are (the same outlines in the same
 * materials): 1 none but the full one, n those by multiples of 2 pi / n, 0 any. n up to 36.
 *  @param first,end  the solids [first, end) */
int tg_section_symmetry(const tg_phantom *p, size_t first, size_t end, double z_mm, const double about_mm[2]);

#endif
