#include "metrics/result.h"

#include "io/memory.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

tg_result *tg_results_add(tg_results *r, const char *measure, const char *where, const char *unit)
{
    tg_result *added = tg_append(&r->result, &r->n_results, sizeof *added);
    if (!added) return NULL;
    *added = (tg_result){.measure = measure,
                         .unit = unit,
                         .value = NAN,
                         .uncertainty = NAN,
                         .uncertainty_noise = NAN,
                         .nominal = NAN,
                         .low = NAN,
                         .high = NAN,
                         .predicted = NAN};
    snprintf(added->where, sizeof added->where, "%s", where);
    return added;
}

tg_curve *tg_results_add_curve(tg_results *r, const char *measure, const char *where, const char *x_unit,
                               const char *y_unit, size_t n, bool predicted)
{
    tg_curve c = {.measure = measure, .x_unit = x_unit, .y_unit = y_unit, .n = n};
    snprintf(c.where, sizeof c.where, "%s", where);
    c.x = tg_alloc(n, sizeof *c.x);
    c.y = tg_alloc(n, sizeof *c.y);
    c.predicted = predicted ? tg_alloc(n, sizeof *c.predicted) : NULL;
    const bool whole = c.x && c.y && (c.predicted || !predicted);
    tg_curve *added = whole ? tg_append(&r->curve, &r->n_curves, sizeof *added) : NULL;
    if (added) {
        *added = c;
    } else {
        tg_free(c.x);
        tg_free(c.y);
        tg_free(c.predicted);
    }
    return added;
}

static bool same_region(const tg_region *a, const tg_region *b)
{
    return a->outline == b->outline && a->centre_mm[0] == b->centre_mm[0] && a->centre_mm[1] == b->centre_mm[1] &&
           a->inner_mm == b->inner_mm && a->outer_mm == b->outer_mm && a->half_mm[0] == b->half_mm[0] &&
           a->half_mm[1] == b->half_mm[1] && a->turn_rad == b->turn_rad && !strcmp(a->label, b->label);
}

tg_code tg_results_add_region(tg_results *r, const tg_region *region, tg_error *e)
{
    for (size_t i = 0; i < r->n_regions; i++)
        if (same_region(&r->region[i], region)) return TG_OK;
    tg_region *added = tg_append(&r->region, &r->n_regions, sizeof *added);
    if (!added) return tg_no_memory(e, r->n_regions + 1, sizeof *added);
    *added = *region;
    return TG_OK;
}

void tg_results_free(tg_results *r)
{
    for (size_t i = 0; i < r->n_curves; i++) {
        tg_free(r->curve[i].x);
        tg_free(r->curve[i].y);
        tg_free(r->curve[i].predicted);
    }
    tg_free(r->result);
    tg_free(r->curve);
    tg_free(r->region);
    *r = (tg_results){0};
}

/** Welch-Satterthwaite, from the sums of u_i^2 and of u_i^4 / dof_i. */
static double effective(double sum, double fourth)
{
    return fourth > 0 ? sum * sum / fourth : (double)INFINITY;
}

/** Sum of squares of the lines of one source (NULL: all), and its degrees of freedom. */
static double variance(const tg_result *r, const char *source, double *dof)
{
    double sum = 0, fourth = 0;
    for (size_t i = 0; i < r->n_budget; i++) {
        const tg_budget *b = &r->budget[i];
        if (source && strcmp(b->source, source)) continue;
        sum += b->u * b->u;
        fourth += pow(b->u, 4) / b->dof;
    }
    *dof = effective(sum, fourth);
    return sum;
}

enum { MANY = 1000000 }; /* degrees of freedom: as good as all */

/** The t quantile takes real degrees of freedom: JCGM 100 G.4.1 leaves it open to interpolate or to truncate, and only
 *  the first covers 95 %. */
static double student(double dof)
{
    return dof < MANY ? gsl_cdf_tdist_Pinv(0.975, dof) : gsl_cdf_ugaussian_Pinv(0.975);
}

/** One degree of freedom is the least that has a meaning. */
static double expanded(double sum, double dof, double (*k)(double dof))
{
    return k(fmin(fmax(dof, 1), MANY)) * sqrt(sum);
}

void tg_result_budget(tg_result *r, const char *source, double u, double dof)
{
    if (!(u > 0)) return;
    if (r->n_budget < TG_BUDGET) {
        r->budget[r->n_budget++] = (tg_budget){source, u, dof};
        return;
    }
    /* a full table loses names, never uncertainty */
    tg_budget *last = &r->budget[TG_BUDGET - 1];
    const double a = last->u * last->u, b = u * u;
    *last = (tg_budget){"other", sqrt(a + b), effective(a + b, a * a / last->dof + b * b / dof)};
}

void tg_result_combine_by(tg_result *r, double (*k)(double dof))
{
    double dof;
    double sum = variance(r, "noise", &dof);
    r->uncertainty_noise = expanded(sum, dof, k);
    sum = variance(r, NULL, &dof);
    /* a second line may raise the degrees of freedom, and so lower k: the whole is still no less than its part */
    r->uncertainty = fmax(expanded(sum, dof, k), r->uncertainty_noise);
}

void tg_result_combine(tg_result *r)
{
    tg_result_combine_by(r, student);
}

void tg_result_null(tg_result *r, const char *format, ...)
{
    va_list args;
    va_start(args, format);
    vsnprintf(r->why, sizeof r->why, format, args);
    va_end(args);
    r->value = r->uncertainty = r->uncertainty_noise = NAN;
}
