#include "metrics/section.h"

#include <math.h>

void tg_pose_to_image(const tg_pose *pose, const double phantom_mm[2], double image_mm[2])
{
    const double c = cos(pose->turn_rad), s = sin(pose->turn_rad), x = phantom_mm[0], y = phantom_mm[1];
    image_mm[0] = c * x - s * y + pose->shift_mm[0];
    image_mm[1] = s * x + c * y + pose->shift_mm[1];
}

void tg_pose_to_phantom(const tg_pose *pose, const double image_mm[2], double phantom_mm[2])
{
    const double c = cos(pose->turn_rad), s = sin(pose->turn_rad);
    const double x = image_mm[0] - pose->shift_mm[0], y = image_mm[1] - pose->shift_mm[1];
    phantom_mm[0] = c * x + s * y;
    phantom_mm[1] = c * y - s * x;
}

bool tg_section_chord(const tg_solid *s, double z_mm, const double point_mm[2], double angle_rad, double t[2])
{
    const double point[3] = {point_mm[0], point_mm[1], z_mm}, direction[3] = {cos(angle_rad), sin(angle_rad), 0};
    return tg_solid_interval(s, point, direction, t);
}

bool tg_section_middle(const tg_solid *s, double z_mm, double middle_mm[2])
{
    /* centre of the section of the ellipsoid with the same half lengths, which the solid's own axes share */
    const double depth = z_mm - s->centre_mm[2];
    double own[3], sum = 0;
    for (int i = 0; i < 3; i++) {
        own[i] = s->half_mm[i] * s->half_mm[i] * s->turn[i][2];
        sum += own[i] * s->turn[i][2];
    }
    double m[2];
    for (int a = 0; a < 2; a++) {
        m[a] = s->centre_mm[a];
        for (int i = 0; i < 3; i++)
            m[a] += s->turn[i][a] * own[i] * depth / sum;
    }
    /* then the middle of chords, for solids that are no ellipsoids */
    for (int k = 0; k < 4; k++) {
        double t[2];
        if (!tg_section_chord(s, z_mm, m, k % 2 * 0.5 * M_PI, t)) return false;
        m[k % 2] += 0.5 * (t[0] + t[1]);
    }
    middle_mm[0] = m[0];
    middle_mm[1] = m[1];
    return true;
}

double tg_section_radius(const tg_solid *s, double z_mm, const double inside_mm[2], double angle_rad)
{
    double t[2];
    return tg_section_chord(s, z_mm, inside_mm, angle_rad, t) && t[0] <= 0 ? fmax(t[1], 0) : 0;
}

bool tg_section_circle(const tg_solid *s, double z_mm, double middle_mm[2], double *radius_mm)
{
    enum { DIRECTIONS = 360 };
    *radius_mm = 0;
    if (!tg_section_middle(s, z_mm, middle_mm)) return false;
    double least = INFINITY, most = 0;
    for (int k = 0; k < DIRECTIONS; k++) {
        const double r = tg_section_radius(s, z_mm, middle_mm, k * 2 * M_PI / DIRECTIONS);
        least = fmin(least, r);
        most = fmax(most, r);
    }
    const bool circle = most - least <= 4e-6 * most;
    /* a straight side between two directions comes nearer than both by this cosine at most */
    *radius_mm = circle ? 0.5 * (least + most) : least * cos(M_PI / DIRECTIONS);
    return circle;
}

double tg_section_area_mm2(const tg_solid *s, double z_mm)
{
    enum { DIRECTIONS = 720 };
    double middle[2], sum = 0;
    if (!tg_section_middle(s, z_mm, middle)) return 0;
    for (int k = 0; k < DIRECTIONS; k++) {
        const double r = tg_section_radius(s, z_mm, middle, k * 2 * M_PI / DIRECTIONS);
        sum += r * r;
    }
    return sum * M_PI / DIRECTIONS;
}

bool tg_section_same(const tg_phantom *p, double z_mm, double other_z_mm)
{
    for (size_t i = 0; i < p->n_solids; i++) {
        const tg_solid *s = &p->solid[i];
        double a[2], b[2];
        const bool here = tg_section_middle(s, z_mm, a), there = tg_section_middle(s, other_z_mm, b);
        if (here != there) return false;
        if (here && !(hypot(a[0] - b[0], a[1] - b[1]) < 1e-3)) return false;
        for (int k = 0; here && k < 8; k++) {
            const double angle = k * 0.25 * M_PI;
            const double change = tg_section_radius(s, z_mm, a, angle) - tg_section_radius(s, other_z_mm, b, angle);
            if (!(fabs(change) < 1e-3)) return false;
        }
    }
    return true;
}

/** Is one section the other, turned about a point? */
static bool turned(const tg_solid *s, const tg_solid *other, double z_mm, const double about_mm[2], double turn_rad)
{
    enum { DIRECTIONS = 24 };
    double a[2], b[2], at[2];
    if (s->material != other->material || !tg_section_middle(s, z_mm, a) || !tg_section_middle(other, z_mm, b))
        return false;
    const double from[2] = {a[0] - about_mm[0], a[1] - about_mm[1]};
    tg_pose_to_image(&(tg_pose){{about_mm[0], about_mm[1]}, turn_rad}, from, at);
    if (!(hypot(at[0] - b[0], at[1] - b[1]) < 1e-3)) return false;
    for (int k = 0; k < DIRECTIONS; k++) {
        const double angle = k * 2 * M_PI / DIRECTIONS + 0.1;
        const double change =
            tg_section_radius(s, z_mm, a, angle) - tg_section_radius(other, z_mm, b, angle + turn_rad);
        if (!(fabs(change) < 1e-3)) return false;
    }
    return true;
}

static bool symmetric(const tg_phantom *p, size_t first, size_t end, double z_mm, const double about_mm[2],
                      double turn_rad)
{
    double middle[2];
    for (size_t i = first; i < end; i++) {
        bool matched = !tg_section_middle(&p->solid[i], z_mm, middle);
        for (size_t j = first; j < end && !matched; j++)
            matched = turned(&p->solid[i], &p->solid[j], z_mm, about_mm, turn_rad);
        if (!matched) return false;
    }
    return true;
}

int tg_section_symmetry(const tg_phantom *p, size_t first, size_t end, double z_mm, const double about_mm[2])
{
    if (symmetric(p, first, end, z_mm, about_mm, 1)) return 0; /* no fraction of a turn: only rings allow it */
    for (int n = 36; n > 1; n--)
        if (symmetric(p, first, end, z_mm, about_mm, 2 * M_PI / n)) return n;
    return 1;
}
