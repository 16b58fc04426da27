#include "recon/backproject.h"

#include "io/memory.h"

#include <math.h>
#include <string.h>

enum { SPAN = 256 }; /* pixels of a row that are worked on together, in the nearest cache */

/* A ray through the middle of an outermost channel is on the detector, whichever way it is rounded. */
static const double slack_channels = 1e-6;

struct tg_backprojector {
    tg_geometry geometry;
    size_t channels, views, stride;
    double zero, per_mm; /* channel = zero + coordinate * per_mm */
    double per_rad;      /* of an equiangular fan: channel = zero + gamma * per_rad */
    double source_axis_mm;
    double low[2], high[2]; /* direction (sin, cos) of the rays of the first and last channel of a fan */
    tg_grid grid;
    double (*turn)[2]; /* {views} cos, sin */
};

/* Pixels of a span, x = x0 + i step, on one row y. */
typedef struct {
    double x0_mm, step_mm, y_mm;
    int n;
} span;

tg_code tg_backprojector_create(const tg_scan *scan, const tg_grid *grid, size_t stride, tg_backprojector **out,
                                tg_error *e)
{
    tg_code code = TG_OK;
    tg_backprojector *b = NULL;
    TG_TRY(TG_NEW(b, 1, e));
    *b = (tg_backprojector){.geometry = scan->geometry,
                            .channels = scan->channels,
                            .views = scan->views,
                            .stride = stride,
                            .zero = scan->channel_zero,
                            .per_mm = 1 / tg_scan_pitch_mm(scan),
                            .per_rad = 1 / scan->channel_step,
                            .source_axis_mm = scan->source_axis_mm,
                            .grid = *grid};
    const double low = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, -slack_channels));
    const double high = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, (double)scan->channels - 1 + slack_channels));
    b->low[0] = sin(low), b->low[1] = cos(low);
    b->high[0] = sin(high), b->high[1] = cos(high);
    TG_TRY(TG_NEW(b->turn, b->views, e));
    for (size_t i = 0; i < b->views; i++) {
        b->turn[i][0] = cos(scan->angle_rad[i]);
        b->turn[i][1] = sin(scan->angle_rad[i]);
    }
done:
    if (code == TG_OK)
        *out = b;
    else
        tg_backprojector_free(b);
    return code;
}

void tg_backprojector_free(tg_backprojector *b)
{
    if (!b) return;
    tg_free(b->turn);
    tg_free(b);
}

/* Keep those pixels i of [*from, *to) with a + b i >= 0. */
static void cut(double a, double b, int *from, int *to)
{
    const double at = -a / b; /* where the sign changes; not finite or NaN for b = 0 */
    if (b > 0) {
        if (at > *from) *from = at < *to ? (int)ceil(at) : *to;
    } else if (b < 0) {
        if (at < *to - 1) *to = at >= *from ? (int)at + 1 : *from;
    } else if (a < 0) {
        *to = *from;
    }
}

/* The row at a channel, linear between two; clamped, as slack and rounding may have left the outermost ones. */
static inline float sample(const float *row, double channel, double last)
{
    channel = channel > 0 ? channel : 0;
    channel = channel < last ? channel : last;
    const int below = (int)channel;
    return row[below] + (float)(channel - below) * (row[below + 1] - row[below]);
}

static void add_parallel(const tg_backprojector *b, const double turn[2], const span *s, const float *restrict row,
                         float *restrict sum)
{
    const double last = (double)b->channels - 1;
    const double first = b->zero + (s->x0_mm * turn[0] + s->y_mm * turn[1]) * b->per_mm;
    const double step = s->step_mm * turn[0] * b->per_mm;
    int from = 0, to = s->n;
    cut(first + slack_channels, step, &from, &to);
    cut(last + slack_channels - first, -step, &from, &to);
    for (int i = from; i < to; i++)
        sum[i] += sample(row, first + i * step, last);
}

/* Sideways and forward distance from the source of the first pixel of a span, and their steps. */
typedef struct {
    double t, dt, d, dd;
} sight;

static sight look(const tg_backprojector *b, const double turn[2], const span *s, int *from, int *to)
{
    const sight v = {s->x0_mm * turn[0] + s->y_mm * turn[1], s->step_mm * turn[0],
                     b->source_axis_mm + s->x0_mm * turn[1] - s->y_mm * turn[0], s->step_mm * turn[1]};
    const double least_mm = 1e-6 * b->source_axis_mm;
    cut(v.d - least_mm, v.dd, from, to);
    cut(v.t * b->low[1] - v.d * b->low[0], v.dt * b->low[1] - v.dd * b->low[0], from, to);
    cut(v.d * b->high[0] - v.t * b->high[1], v.dd * b->high[0] - v.dt * b->high[1], from, to);
    return v;
}

static void add_equispaced(const tg_backprojector *b, const double turn[2], const span *s, const float *restrict row,
                           float *restrict sum)
{
    int from = 0, to = s->n;
    const sight v = look(b, turn, s, &from, &to);
    const double last = (double)b->channels - 1;
    for (int i = from; i < to; i++) {
        const double nearness = b->source_axis_mm / (v.d + i * v.dd);
        const double channel = b->zero + (v.t + i * v.dt) * nearness * b->per_mm;
        sum[i] += (float)(nearness * nearness) * sample(row, channel, last);
    }
}

/* atan on [-1, 1] by its Chebyshev series 2 sum (-1)^k q^(2k+1) / (2k+1) T_(2k+1), q = sqrt(2) - 1, written as a
 * polynomial: no branch, so that it is computed for several pixels at once. Twelve terms: the error is below 3e-11. */
static inline double arctangent(double x)
{
    static const double c[] = {0.9999999993492958,    -0.33333326328696045, 0.19999775029961883,
                               -0.14282329296523577,  0.11082190622719891,  -0.08935089359854283,
                               0.07127307417969098,   -0.05224427890497339, 0.031930507733696954,
                               -0.014509255269694403, 0.004208865654009072, -0.000572956039263969};
    const double x2 = x * x;
    double sum = c[11];
    for (int k = 10; k >= 0; k--)
        sum = sum * x2 + c[k];
    return sum * x;
}

static void add_equiangular(const tg_backprojector *b, const double turn[2], const span *s, const float *restrict row,
                            float *restrict sum)
{
    int from = 0, to = s->n;
    const sight v = look(b, turn, s, &from, &to);
    const double last = (double)b->channels - 1, r2 = b->source_axis_mm * b->source_axis_mm;
    double channel[SPAN];
    float weight[SPAN];
    for (int i = from; i < to; i++) {
        const double t = v.t + i * v.dt, d = v.d + i * v.dd, l2 = t * t + d * d;
        channel[i] = b->zero + 2 * arctangent(t / (sqrt(l2) + d)) * b->per_rad;
        weight[i] = (float)(r2 / l2);
    }
    for (int i = from; i < to; i++)
        /* cppcheck-suppress uninitvar ; the loop above has filled what this one reads */
        sum[i] += weight[i] * sample(row, channel[i], last);
}

void tg_backproject_rows(const tg_backprojector *b, const float *filtered, size_t y, size_t rows, float *slice)
{
    static void (*const add[])(const tg_backprojector *, const double *, const span *, const float *, float *) = {
        [TG_PARALLEL] = add_parallel, [TG_FAN_EQUIANGULAR] = add_equiangular, [TG_FAN_EQUISPACED] = add_equispaced};
    const size_t nx = b->grid.n[0];
#pragma omp parallel for schedule(dynamic)
    for (size_t row = y; row < y + rows; row++)
        for (size_t x = 0; x < nx; x += SPAN) {
            const span s = {tg_grid_mm(&b->grid, 0, (double)x), b->grid.step_mm[0],
                            tg_grid_mm(&b->grid, 1, (double)row), nx - x < SPAN ? (int)(nx - x) : SPAN};
            float sum[SPAN] = {0};
            for (size_t view = 0; view < b->views; view++)
                add[b->geometry](b, b->turn[view], &s, filtered + view * b->stride, sum);
            memcpy(slice + row * nx + x, sum, (size_t)s.n * sizeof *sum);
        }
}
