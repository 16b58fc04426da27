#include "recon/weights.h"

#include "io/memory.h"

#include <math.h>
#include <stdlib.h>

typedef struct {
    double angle;
    size_t view;
} placed;

static int by_angle(const void *a, const void *b)
{
    const placed *p = a, *q = b;
    if (p->angle != q->angle) return p->angle < q->angle ? -1 : 1;
    return p->view < q->view ? -1 : 1;
}

static int by_size(const void *a, const void *b)
{
    const double p = *(const double *)a, q = *(const double *)b;
    return (p > q) - (p < q);
}

/* The median of the gaps between different directions: opposed or repeated views leave gaps of rounding only. */
static double usual_gap(const double *gap, size_t n, double *sorted)
{
    const double same_rad = 1e-6;
    size_t kept = 0;
    for (size_t i = 0; i < n; i++)
        if (gap[i] > same_rad) sorted[kept++] = gap[i];
    qsort(sorted, kept, sizeof *sorted, by_size);
    return sorted[kept / 2];
}

static tg_code check_gap(const tg_scan *scan, double from_rad, double gap_rad, double usual_rad, tg_error *e)
{
    if (gap_rad <= 3 * usual_rad && gap_rad <= 45 * TG_DEGREE) return TG_OK;
    const bool parallel = scan->geometry == TG_PARALLEL;
    const double from = from_rad / TG_DEGREE, to = (from_rad + gap_rad) / TG_DEGREE;
    if (gap_rad > 45 * TG_DEGREE || gap_rad > fmax(2 * TG_DEGREE, 4 * usual_rad))
        return tg_fail(e, TG_INPUT, NULL, 0,
                       "no view between %.4g and %.4g degrees; a %s scan needs views all over %d degrees", from, to,
                       parallel ? "parallel" : "fan-beam", parallel ? 180 : 360);
    tg_warn(e, NULL, 0, "views are missing between %.4g and %.4g degrees; their neighbours fill in", from, to);
    return TG_OK;
}

tg_code tg_angle_weights(const tg_scan *scan, double *weight_rad, tg_error *e)
{
    const double turn = scan->geometry == TG_PARALLEL ? M_PI : 2 * M_PI;
    const size_t n = scan->views;
    tg_code code = TG_OK;
    placed *view = NULL;
    double *gap = NULL, *sorted = NULL;
    TG_TRY(TG_NEW(view, n, e));
    TG_TRY(TG_NEW(gap, n, e));
    TG_TRY(TG_NEW(sorted, n, e));
    for (size_t i = 0; i < n; i++)
        view[i] = (placed){scan->angle_rad[i] - turn * floor(scan->angle_rad[i] / turn), i};
    qsort(view, n, sizeof *view, by_angle);
    size_t widest = 0;
    for (size_t i = 0; i < n; i++) { /* gap[i] lies behind view[i] */
        gap[i] = i + 1 < n ? view[i + 1].angle - view[i].angle : view[0].angle + turn - view[i].angle;
        if (gap[i] > gap[widest]) widest = i;
    }
    TG_TRY(check_gap(scan, view[widest].angle, gap[widest], usual_gap(gap, n, sorted), e));
    for (size_t i = 0; i < n; i++)
        weight_rad[view[i].view] = 0.5 * (gap[i] + gap[i ? i - 1 : n - 1]) * (M_PI / turn);
done:
    tg_free(view);
    tg_free(gap);
    tg_free(sorted);
    return code;
}
