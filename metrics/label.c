#include "metrics/label.h"

#include "io/memory.h"

#include <math.h>

/** Pixels of one grid line inside (from, to) [pixels], or the nearest one when no centre is inside. */
static bool pixels_inside(double from, double to, size_t n, size_t *first, size_t *end)
{
    double a = ceil(from), b = floor(to);
    if (a > b) a = b = round(0.5 * (from + to));
    if (b < 0 || a > (double)n - 1) return false;
    *first = (size_t)fmax(a, 0);
    *end = (size_t)fmin(b, (double)n - 1) + 1;
    return true;
}

/** Paint along the lines of one axis (0: rows, 1: columns). */
static void paint_lines(const tg_solid *s, int16_t value, double z_mm, const tg_pose *pose, const tg_grid *g, int axis,
                        int16_t *label)
{
    const size_t stride = axis == 0 ? 1 : g->n[0], across = axis == 0 ? g->n[0] : 1;
    const double angle = axis * 0.5 * M_PI - pose->turn_rad;
    for (size_t line = 0; line < g->n[1 - axis]; line++) {
        double start[2], point[2], t[2];
        size_t first, end;
        start[axis] = g->first_mm[axis];
        start[1 - axis] = tg_grid_mm(g, 1 - axis, (double)line);
        tg_pose_to_phantom(pose, start, point);
        if (!tg_section_chord(s, z_mm, point, angle, t)) continue;
        if (!pixels_inside(t[0] / g->step_mm[axis], t[1] / g->step_mm[axis], g->n[axis], &first, &end)) continue;
        for (size_t i = first; i < end; i++)
            label[line * across + i * stride] = value;
    }
}

void tg_label_paint(const tg_phantom *p, double z_mm, const tg_pose *pose, const tg_grid *grid, int16_t *label)
{
    for (size_t i = 0; i < tg_grid_slice(grid); i++)
        label[i] = TG_NO_SOLID;
    for (size_t i = 0; i < p->n_solids; i++) {
        double middle[2], at[2];
        if (!tg_section_middle(&p->solid[i], z_mm, middle)) continue;
        for (int axis = 0; axis < 2; axis++)
            paint_lines(&p->solid[i], (int16_t)i, z_mm, pose, grid, axis, label);
        /* a wire may slip between the lines of both axes */
        tg_pose_to_image(pose, middle, at);
        const double x = round(tg_grid_index(grid, 0, at[0])), y = round(tg_grid_index(grid, 1, at[1]));
        if (x >= 0 && y >= 0 && x < (double)grid->n[0] && y < (double)grid->n[1])
            label[(size_t)y * grid->n[0] + (size_t)x] = (int16_t)i;
    }
}

/** Squared distance along a row to the nearest other label. */
static void clear_along_row(const int16_t *label, size_t n, double step_mm, float *square)
{
    double since = INFINITY;
    for (size_t i = 0; i < n; i++) {
        since = i && label[i] != label[i - 1] ? step_mm : since + step_mm;
        square[i] = (float)(since * since);
    }
    since = INFINITY;
    for (size_t i = n; i-- > 0;) {
        since = i + 1 < n && label[i] != label[i + 1] ? step_mm : since + step_mm;
        square[i] = fminf(square[i], (float)(since * since));
    }
}

/** The parabolas whose lower envelope is the distance along a column. */
typedef struct {
    double *at, *height, *from; /* {n + 2}: vertex, its value, where it becomes the lowest */
    size_t n;
} envelope;

static void add_parabola(envelope *v, double at, double height)
{
    if (isinf(height)) return;
    double from = -INFINITY;
    while (v->n) {
        const size_t k = v->n - 1;
        from = 0.5 * (at + v->at[k] + (height - v->height[k]) / (at - v->at[k]));
        if (from > v->from[k]) break;
        v->n--;
        from = -INFINITY;
    }
    v->at[v->n] = at;
    v->height[v->n] = height;
    v->from[v->n++] = from;
}

/** Squared distances within rows to distances in the plane, for one run of equal labels [a, b) of a column: the
 *  pixels next to its ends have another label, and so the distance 0. */
static void clear_run(size_t a, size_t b, size_t n, size_t stride, double step_mm, float *square, envelope *v)
{
    v->n = 0;
    if (a > 0) add_parabola(v, ((double)a - 1) * step_mm, 0);
    for (size_t i = a; i < b; i++)
        add_parabola(v, (double)i * step_mm, (double)square[i * stride]);
    if (b < n) add_parabola(v, (double)b * step_mm, 0);
    size_t k = 0;
    for (size_t i = a; i < b; i++) {
        const double y = (double)i * step_mm;
        while (k + 1 < v->n && v->from[k + 1] <= y)
            k++;
        square[i * stride] = v->n ? (float)sqrt((y - v->at[k]) * (y - v->at[k]) + v->height[k]) : (float)INFINITY;
    }
}

tg_code tg_label_clear(const int16_t *label, const tg_grid *grid, float *clear_mm, tg_error *e)
{
    tg_code code = TG_OK;
    const size_t nx = grid->n[0], ny = grid->n[1];
    envelope v = {0};
    TG_TRY(TG_NEW(v.at, ny + 2, e));
    TG_TRY(TG_NEW(v.height, ny + 2, e));
    TG_TRY(TG_NEW(v.from, ny + 2, e));
    for (size_t y = 0; y < ny; y++)
        clear_along_row(label + y * nx, nx, grid->step_mm[0], clear_mm + y * nx);
    for (size_t x = 0; x < nx; x++) {
        for (size_t a = 0, b; a < ny; a = b) {
            for (b = a + 1; b < ny && label[b * nx + x] == label[a * nx + x];)
                b++;
            clear_run(a, b, ny, nx, grid->step_mm[1], clear_mm + x, &v);
        }
    }
done:
    tg_free(v.at);
    tg_free(v.height);
    tg_free(v.from);
    return code;
}
