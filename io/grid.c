#include "io/grid.h"

tg_grid tg_grid_square(size_t pixels, double field_mm, const double centre_mm[2])
{
    const double step = field_mm / (double)pixels, half = 0.5 * step * ((double)pixels - 1);
    return (tg_grid){{pixels, pixels, 1}, {step, step, step}, {centre_mm[0] - half, centre_mm[1] - half, 0}};
}

double tg_grid_mm(const tg_grid *g, int axis, double index)
{
    return g->first_mm[axis] + index * g->step_mm[axis];
}

double tg_grid_index(const tg_grid *g, int axis, double mm)
{
    return (mm - g->first_mm[axis]) / g->step_mm[axis];
}

size_t tg_grid_slice(const tg_grid *g)
{
    return g->n[0] * g->n[1];
}

size_t tg_grid_samples(const tg_grid *g)
{
    return g->n[0] * g->n[1] * g->n[2];
}
