#include "phantoms/solid.h"

#include <math.h>

static void to_own(const tg_solid *s, const double world[3], double own[3])
{
    for (int i = 0; i < 3; i++)
        own[i] = s->turn[i][0] * world[0] + s->turn[i][1] * world[1] + s->turn[i][2] * world[2];
}

/** Cut t to |p + t d| < half. A ray in the face itself belongs to the lower face only, so that two solids that share a
 *  face neither both own it nor both leave it out. */
static bool cut_slab(double p, double d, double half, double t[2])
{
    if (d == 0) return p >= -half && p < half;
    const double a = (-half - p) / d, b = (half - p) / d;
    t[0] = fmax(t[0], fmin(a, b));
    t[1] = fmin(t[1], fmax(a, b));
    return t[0] < t[1];
}

/** Cut t to the unit disc around p + t d (n = 2) or the unit ball (n = 3), p and d in units of the radii.
 *  1 - k^2 from the cross product keeps its digits however far p is and however slowly the ray approaches. */
static bool cut_round(const double *p, const double *d, int n, double t[2])
{
    double dd = d[0] * d[0] + d[1] * d[1], pd = p[0] * d[0] + p[1] * d[1];
    double cross = p[0] * d[1] - p[1] * d[0];
    double k2 = cross * cross; /* squared distance of the ray from the middle, times dd */
    if (n == 3) {
        dd += d[2] * d[2];
        pd += p[2] * d[2];
        cross = p[1] * d[2] - p[2] * d[1];
        k2 += cross * cross;
        cross = p[2] * d[0] - p[0] * d[2];
        k2 += cross * cross;
    }
    if (dd == 0) return p[0] * p[0] + p[1] * p[1] < 1; /* along the axis of a cylinder */
    const double k = sqrt(k2 / dd);
    if (!(k < 1)) return false;
    const double middle = -pd / dd, half = sqrt((1 - k) * (1 + k) / dd);
    t[0] = fmax(t[0], middle - half);
    t[1] = fmin(t[1], middle + half);
    return t[0] < t[1];
}

/** Cut t, already inside the ends, to x^2 + y^2 < (m + s z)^2: the mantle of a cone.
 *  Between the ends m + s z >= 0, so only one of the two nappes counts and the interval is one piece. */
static bool cut_mantle(const tg_solid *solid, const double p[3], const double d[3], double t[2])
{
    const double s = solid->half_mm[0] * (solid->taper - 1) / (2 * solid->half_mm[2]);
    const double r = solid->half_mm[0] * (1 + solid->taper) / 2 + s * p[2], dr = s * d[2]; /* radius along the ray */
    const double a = d[0] * d[0] + d[1] * d[1] - dr * dr;
    const double b = p[0] * d[0] + p[1] * d[1] - r * dr;
    const double c = p[0] * p[0] + p[1] * p[1] - r * r;
    if (a == 0 && b == 0) return c < 0; /* along the mantle, or along the axis of a cone that does not taper */
    /* b^2 - a c from cross products (Lagrange's identity), which keep their digits near the tip */
    const double xr = p[0] * dr - r * d[0], yr = p[1] * dr - r * d[1], xy = p[0] * d[1] - p[1] * d[0];
    double square = xr * xr + yr * yr - xy * xy;
    if (a < 0) square = fmax(square, 0); /* such a ray always meets the mantle, at the tip at least */
    if (!(square >= 0)) return false;
    const double q = -(b + copysign(sqrt(square), b)); /* both roots without cancellation; fmin, fmax pass over 0 / 0 */
    const double low = fmin(q / a, c / q), high = fmax(q / a, c / q);
    if (a >= 0) { /* across the cone: between the roots, one of them infinite when a = 0 */
        t[0] = fmax(t[0], low);
        t[1] = fmin(t[1], high);
    } else if (dr > 0) { /* along it, the radius growing: beyond the upper root */
        t[0] = fmax(t[0], high);
    } else {
        t[1] = fmin(t[1], low);
    }
    return t[0] < t[1];
}

/** Cut t to n . (p + t d) < 0. */
static bool cut_plane(double np, double nd, double t[2])
{
    if (nd == 0) return np <= 0;
    if (nd > 0)
        t[1] = fmin(t[1], -np / nd);
    else
        t[0] = fmax(t[0], -np / nd);
    return t[0] < t[1];
}

static double length2(const double a[3])
{
    return a[0] * a[0] + a[1] * a[1] + a[2] * a[2];
}

bool tg_solid_interval(const tg_solid *s, const double point_mm[3], const double direction[3], double t[2])
{
    /* count from the point of the ray nearest to the solid's centre: a wire half a metre away keeps its digits */
    double world[3], p[3], d[3], u[3], v[3], nearest = 0;
    for (int i = 0; i < 3; i++)
        nearest -= (point_mm[i] - s->centre_mm[i]) * direction[i];
    for (int i = 0; i < 3; i++)
        world[i] = point_mm[i] - s->centre_mm[i] + nearest * direction[i];
    if (length2(world) > length2(s->half_mm) * fmax(1, s->taper * s->taper)) return false; /* past the ball around it */
    to_own(s, world, p);
    to_own(s, direction, d);
    for (int i = 0; i < 3; i++) {
        u[i] = p[i] / s->half_mm[i];
        v[i] = d[i] / s->half_mm[i];
    }
    double in[2] = {-INFINITY, INFINITY};
    bool hit = false;
    switch (s->shape) {
    case TG_CYLINDER:
    case TG_ELLIPTIC_CYLINDER: hit = cut_round(u, v, 2, in) && cut_slab(u[2], v[2], 1, in); break;
    case TG_ELLIPSOID:
    case TG_SPHERE: hit = cut_round(u, v, 3, in); break;
    case TG_CONE: hit = cut_slab(u[2], v[2], 1, in) && cut_mantle(s, p, d, in); break;
    case TG_WEDGE:
        if (!cut_plane(u[0] + u[2], v[0] + v[2], in)) break; /* fall through */
    case TG_SOLID_BOX:
        hit = cut_slab(u[0], v[0], 1, in) && cut_slab(u[1], v[1], 1, in) && cut_slab(u[2], v[2], 1, in);
        break;
    }
    if (!hit) return false;
    t[0] = nearest + in[0];
    t[1] = nearest + in[1];
    return true;
}

bool tg_solid_holds(const tg_solid *s, const double point_mm[3])
{
    const double world[3] = {point_mm[0] - s->centre_mm[0], point_mm[1] - s->centre_mm[1],
                             point_mm[2] - s->centre_mm[2]};
    double u[3];
    to_own(s, world, u);
    for (int i = 0; i < 3; i++)
        u[i] /= s->half_mm[i];
    const double round = u[0] * u[0] + u[1] * u[1];
    const bool ends = fabs(u[2]) <= 1, sides = fabs(u[0]) <= 1 && fabs(u[1]) <= 1;
    switch (s->shape) {
    case TG_CYLINDER:
    case TG_ELLIPTIC_CYLINDER: return ends && round <= 1;
    case TG_ELLIPSOID:
    case TG_SPHERE: return round + u[2] * u[2] <= 1;
    case TG_CONE: {
        const double r = (1 + s->taper + (s->taper - 1) * u[2]) / 2;
        return ends && round <= r * r;
    }
    case TG_SOLID_BOX: return ends && sides;
    case TG_WEDGE: return ends && sides && u[0] + u[2] <= 0;
    }
    return false;
}

static void cross(const double a[3], const double b[3], double out[3])
{
    for (int i = 0; i < 3; i++)
        out[i] = a[(i + 1) % 3] * b[(i + 2) % 3] - a[(i + 2) % 3] * b[(i + 1) % 3];
}

void tg_solid_turn(tg_solid *s, const double axis[3], double turn_rad)
{
    const double n = sqrt(length2(axis)), z[3] = {axis[0] / n, axis[1] / n, axis[2] / n};
    double x[3], y[3];
    cross(z, (const double[3]){1, 0, 0}, y);
    if (length2(y) < 1e-24) { /* the axis is the world x: start from the world y */
        cross(z, (const double[3]){0, 1, 0}, y);
    }
    const double m = sqrt(length2(y));
    for (int i = 0; i < 3; i++)
        y[i] /= m;
    cross(y, z, x);
    const double c = cos(turn_rad), w = sin(turn_rad);
    for (int i = 0; i < 3; i++) {
        s->turn[0][i] = c * x[i] + w * y[i];
        s->turn[1][i] = c * y[i] - w * x[i];
        s->turn[2][i] = z[i];
    }
}
