#include "io/region.h"

#include <math.h>

bool tg_region_holds(const tg_region *r, double x_mm, double y_mm)
{
    const double x = x_mm - r->centre_mm[0], y = y_mm - r->centre_mm[1];
    if (r->outline == TG_BOX) {
        const double c = cos(r->turn_rad), s = sin(r->turn_rad);
        return fabs(c * x + s * y) <= r->half_mm[0] && fabs(c * y - s * x) <= r->half_mm[1];
    }
    const double d2 = x * x + y * y;
    return d2 <= r->outer_mm * r->outer_mm && d2 >= r->inner_mm * r->inner_mm;
}

bool tg_region_bounds(const tg_region *r, const tg_grid *g, size_t *x0, size_t *x1, size_t *y0, size_t *y1)
{
    size_t *const from[2] = {x0, y0}, *const to[2] = {x1, y1};
    const double c = fabs(cos(r->turn_rad)), s = fabs(sin(r->turn_rad));
    bool inside = true;
    for (int a = 0; a < 2; a++) {
        const double half = r->outline == TG_BOX ? c * r->half_mm[a] + s * r->half_mm[1 - a] : r->outer_mm;
        const double low = ceil(tg_grid_index(g, a, r->centre_mm[a] - half));
        const double high = floor(tg_grid_index(g, a, r->centre_mm[a] + half));
        const double last = (double)g->n[a] - 1;
        inside = inside && low >= 0 && high <= last;
        *from[a] = (size_t)fmin(fmax(low, 0), last + 1);
        *to[a] = (size_t)fmin(fmax(high + 1, (double)*from[a]), last + 1);
    }
    return inside;
}
