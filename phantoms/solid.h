#ifndef TG_SOLID_H
#define TG_SOLID_H
#include "io/fields.h"

typedef enum { TG_CYLINDER, TG_ELLIPTIC_CYLINDER, TG_ELLIPSOID, TG_SPHERE, TG_SOLID_BOX, TG_CONE, TG_WEDGE } tg_shape;
#define TG_SHAPES "cylinder elliptic-cylinder ellipsoid sphere box cone wedge" /* in the order of the enum */

/** A convex solid in its own axes: one quadric cut by half-spaces. half_mm are the half lengths along the own axes
 *  (radii for round ones). A cone's radius shrinks linearly from half_mm[0] at its lower end to taper half_mm[0] at the
 *  upper. A wedge is the half of its box below the plane from its upper edge at -x to its lower edge at +x. */
typedef struct {
    tg_text name;
    tg_shape shape;
    size_t material; /* index in the phantom */
    double centre_mm[3];
    double turn[3][3]; /* rows: the own x, y, z axes in world coordinates */
    double half_mm[3];
    double taper; /* of a cone */
    int line;     /* in the description */
} tg_solid;

/** Where a ray is inside: point + t direction for t in (t[0], t[1]).
 *  @param point_mm,direction  {3}; direction of unit length, so t is in mm
 *  @return false: the ray misses, or only touches */
bool tg_solid_interval(const tg_solid *s, const double point_mm[3], const double direction[3], double t[2]);

/** Is a point inside (surface included)? */
bool tg_solid_holds(const tg_solid *s, const double point_mm[3]);

/** Set the own axes from the direction of the own z axis and a turn about it.
 *  The own x axis starts as the world x axis projected across `axis` (world y where they are parallel).
 *  @param axis  {3} not null, any length */
void tg_solid_turn(tg_solid *s, const double axis[3], double turn_rad);

#endif
