#include "metrics/sample.h"

#include <math.h>

/** Weights of the four pixels about a place t in [0, 1) between the middle two. */
static void weights(double t, double w[4])
{
    w[0] = t * (-0.5 + t * (1 - 0.5 * t));
    w[1] = 1 + t * t * (-2.5 + 1.5 * t);
    w[2] = t * (0.5 + t * (2 - 1.5 * t));
    w[3] = t * t * (-0.5 + 0.5 * t);
}

double tg_sample(const float *slice, const tg_grid *grid, const double at_mm[2])
{
    const double x = tg_grid_index(grid, 0, at_mm[0]), y = tg_grid_index(grid, 1, at_mm[1]);
    if (!(x >= 1 && y >= 1 && x < (double)grid->n[0] - 2 && y < (double)grid->n[1] - 2)) return NAN;
    const size_t ix = (size_t)x, iy = (size_t)y;
    double wx[4], wy[4], sum = 0;
    weights(x - (double)ix, wx);
    weights(y - (double)iy, wy);
    for (size_t j = 0; j < 4; j++) {
        const float *row = slice + (iy + j - 1) * grid->n[0] + ix - 1;
        sum +=
            wy[j] * (wx[0] * (double)row[0] + wx[1] * (double)row[1] + wx[2] * (double)row[2] + wx[3] * (double)row[3]);
    }
    return sum;
}
