#include "metrics/place.h"

#include "io/memory.h"
#include "metrics/noise.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdio.h>

bool tg_place_valid(const tg_target *t, size_t pixel)
{
    for (size_t k = 0; k < t->n; k++) {
        const double v = (double)t->slice[k][pixel];
        if (!isfinite(v) || v <= t->image->least || v >= t->image->most) return false;
    }
    return true;
}

void tg_place_free(tg_place *p)
{
    tg_free(p->index);
    tg_free(p->slice_mean);
    *p = (tg_place){0};
}

/** Degrees of freedom that the SD of the whole body lends to that of a small region: noise varies smoothly with place,
 *  so its own pixels have the say as soon as there are a few independent ones. */
static const double lent_dof = 8;

static tg_code figures(const tg_target *t, size_t modes, tg_place *p, tg_error *e)
{
    const double slices = (double)t->n;
    tg_trend trend;
    tg_noise_worth worth;
    double c[TG_CUP], own = 0, square = 0;
    tg_code code = TG_OK;
    tg_trend_over(modes, p->index, p->n, t->grid.n[0], &trend);
    TG_TRY(TG_NEW(p->slice_mean, t->n, e));
    TG_TRY(tg_noise_weigh(&t->noise, &trend, p->index, p->n, &worth, e));

    for (size_t k = 0; k < t->n; k++) {
        own += tg_trend_remove(&trend, p->index, p->n, t->slice[k], NULL, NULL);
        if (t->n > 1) square += tg_trend_remove(&trend, p->index, p->n, t->slice[k], t->mean, NULL);
        for (size_t i = 0; i < p->n; i++)
            p->slice_mean[k] += (double)t->slice[k][p->index[i]];
        p->slice_mean[k] /= (double)p->n;
        p->mean += p->slice_mean[k] / slices;
    }
    p->single_sd = sqrt(own / (slices * worth.freedom));
    p->sd = t->n > 1 ? sqrt(square / ((slices - 1) * worth.freedom)) : p->single_sd;
    p->sd_dof = worth.sd_dof * fmax(slices - 1, 1);
    tg_trend_fit(&trend, p->index, p->n, t->mean, NULL, c);
    tg_trend_slope(&trend, c, p->slope);
    for (int a = 0; a < 2; a++)
        p->slope[a] /= t->grid.step_mm[a];

    const double lent = fmin(lent_dof, t->noise.dof), all = p->sd_dof + lent;
    const double variance = (p->sd_dof * p->sd * p->sd + lent * t->noise.sd * t->noise.sd) / all;
    p->u = sqrt(variance * worth.mean_variance / slices);
    p->dof = 1 / (1 / all + 1 / worth.mean_dof);
done:
    return code;
}

/** Was an end of a region's values cut off, as by an export with limits? Many of its pixels hold exactly the largest
 *  value (smallest for sign -1), far more than the next one, and nothing in the image goes beyond; or all are equal, in
 *  an image with noise. Values in steps as coarse as the noise tell nothing, nor do those of an image without. */
static bool cut_off(const tg_target *t, const tg_place *p, double sign, double *end)
{
    double last = -INFINITY, next = -INFINITY, step = INFINITY;
    const size_t all = p->n * t->n;
    size_t at_last = 0, at_next = 0, beyond = 0;
    for (size_t k = 0; k < t->n; k++) {
        for (size_t i = 0; i < p->n; i++) {
            const double v = sign * (double)t->slice[k][p->index[i]];
            if (v > last) {
                next = last;
                at_next = at_last;
                last = v;
                at_last = 0;
            } else if (v < last && v > next) {
                next = v;
                at_next = 0;
            }
            at_last += v >= last;
            at_next += v >= next && v < last;
        }
    }
    if (at_last < 5 || at_last <= all / 50 || at_last <= 2 * at_next) return false;
    for (size_t k = 0; k < t->n; k++) {
        for (size_t i = 0; i < tg_grid_slice(&t->grid); i++) {
            const double v = (double)t->slice[k][i], off = fabs(v - t->noise.level);
            beyond += sign * v > last;
            if (off > 0) step = fmin(step, off);
        }
    }
    *end = sign * last;
    return (!beyond || at_last == all) && t->noise.robust_sd > fmax(2 * step, 1e-4 * tg_noise_scale(t));
}

/** Does more than noise stand in a region? Noise may vary over an image by a factor of two; a spread beyond that by
 *  chi-square (one false alarm in a thousand) and above 2 % of the body is something else. */
static bool disturbed(const tg_target *t, const tg_place *p)
{
    const double allowed = 2 * t->noise.robust_sd, dof = p->sd_dof / fmax((double)t->n - 1, 1);
    return p->single_sd > 0.02 * tg_noise_scale(t) &&
           !(gsl_cdf_chisq_Q(dof * pow(p->single_sd / allowed, 2), dof) > 1e-3);
}

tg_code tg_place_take(const tg_target *t, int solid, double clear_mm, size_t least, size_t modes, tg_place *p,
                      tg_error *e)
{
    tg_code code = TG_OK;
    size_t x0, x1, y0, y1, bad = 0;
    double end;
    if (p->why[0]) return TG_OK;
    if (!tg_region_bounds(&p->region, &t->grid, &x0, &x1, &y0, &y1)) {
        snprintf(p->why, sizeof p->why, "its region reaches beyond the field of the image");
        return TG_OK;
    }
    TG_TRY(tg_target_pixels(t, &p->region, solid, clear_mm, &p->index, &p->n, e));
    for (size_t i = 0; i < p->n; i++)
        bad += !tg_place_valid(t, p->index[i]);
    if (p->n < least)
        snprintf(p->why, sizeof p->why, "only %zu of its pixels are %.2g mm clear of other solids; it takes %zu", p->n,
                 clear_mm, least);
    else if (bad)
        snprintf(p->why, sizeof p->why, "%zu of its pixels are at the limit of the file's pixel values or have none",
                 bad);
    else if (!isfinite(t->noise.sd))
        snprintf(p->why, sizeof p->why, "the body has no uniform part that could tell the noise");
    else if ((p->clipped = cut_off(t, p, 1, &end) || cut_off(t, p, -1, &end)))
        snprintf(p->why, sizeof p->why, "clipped or masked: many of its pixels hold exactly %.6g %s", end,
                 tg_unit_text(t->unit));
    else
        TG_TRY(figures(t, modes, p, e));
    if (!p->why[0] && disturbed(t, p))
        snprintf(
            p->why, sizeof p->why,
            "the region is not uniform, its SD is %.3g %s: something stands in it that the description does not have",
            p->single_sd, tg_unit_text(t->unit));
done:
    return code;
}

bool tg_place_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm)
{
    return tg_target_circle(t, solid, centre_mm, radius_mm) || tg_target_inner_circle(t, solid, centre_mm, radius_mm);
}

/** Move a disc of the body to the place nearest to where it stands that is clear of everything. */
static void move_clear(const tg_target *t, tg_place *p)
{
    const tg_grid *g = &t->grid;
    const double needed = p->region.outer_mm + TG_CLEAR_SPREADS * t->spread_mm, *from = p->region.centre_mm;
    double best = INFINITY, best_mm[2] = {0};
    for (size_t i = 0; i < tg_grid_slice(g); i++) {
        const double x = tg_grid_mm(g, 0, (double)(i % g->n[0])), y = tg_grid_mm(g, 1, (double)(i / g->n[0]));
        const double d = hypot(x - from[0], y - from[1]);
        if (d < best && t->label[i] == t->body && (double)t->clear_mm[i] >= needed) {
            best = d;
            best_mm[0] = x;
            best_mm[1] = y;
        }
    }
    if (!isfinite(best)) {
        snprintf(p->why, sizeof p->why, "nowhere in the body is a disc of %.3g mm radius clear of other solids",
                 p->region.outer_mm);
    } else if (best > 0.75 * fmax(g->step_mm[0], g->step_mm[1])) { /* farther than the nearest pixel to its place */
        p->region.centre_mm[0] = best_mm[0];
        p->region.centre_mm[1] = best_mm[1];
        snprintf(p->note, sizeof p->note, "measured %.3g mm from the middle, where the body is clear of other solids",
                 best);
    }
}

tg_code tg_place_mean(const tg_target *t, int solid, tg_place *p, tg_error *e)
{
    const bool body = solid == t->body;
    const double clear = TG_CLEAR_SPREADS * t->spread_mm, step = fmax(t->grid.step_mm[0], t->grid.step_mm[1]);
    double radius;
    *p = (tg_place){.region = {.outline = TG_DISC}};
    snprintf(p->region.label, sizeof p->region.label, "%.50s%s", t->phantom->solid[solid].name.v,
             body ? " centre" : "");
    if (!tg_place_circle(t, solid, p->region.centre_mm, &radius)) {
        snprintf(p->why, sizeof p->why, "it does not reach the section that is measured");
    } else if (body) {
        p->region.outer_mm = fmax(0.1 * radius, 6 * step); /* a disc of 6 pixels radius holds at least 100 */
        move_clear(t, p);
    } else {
        p->region.outer_mm = fmin(0.6 * radius, radius - clear);
        if (!(p->region.outer_mm > 0))
            snprintf(p->why, sizeof p->why, "its radius of %.3g mm leaves nothing three spread widths (%.3g mm) inside",
                     radius, clear);
    }
    return tg_place_take(t, solid, clear, body ? TG_LEAST_PIXELS : TG_LEAST_ROD, TG_PLANE, p, e);
}

double tg_place_position_u(const tg_target *t, const tg_place *p)
{
    const double x = p->region.centre_mm[0] - t->shift_mm[0], y = p->region.centre_mm[1] - t->shift_mm[1];
    const double turned = t->turn_known ? t->turn_u_rad * (p->slope[1] * x - p->slope[0] * y) : 0;
    return hypot(t->shift_u_mm * hypot(p->slope[0], p->slope[1]), turned);
}

void tg_place_budget_slices(const tg_target *t, const tg_place *place, const tg_place *other, tg_result *r)
{
    const double n = (double)t->n, mean = place->mean - (other ? other->mean : 0);
    const double noise = place->u * place->u + (other ? other->u * other->u : 0);
    double scatter = 0;
    if (t->n < 2) return;
    for (size_t k = 0; k < t->n; k++)
        scatter += pow(place->slice_mean[k] - (other ? other->slice_mean[k] : 0) - mean, 2) / ((n - 1) * n);
    const double dof = other ? fmin(place->dof, other->dof) : place->dof;
    if (scatter > noise && !(noise > 0 && gsl_cdf_fdist_Q(scatter / noise, n - 1, dof) > 0.01))
        tg_result_budget(r, "slices", sqrt(scatter - noise), n - 1);
}

double tg_place_sd_expanded(double dof)
{
    double low = 0, high = 1e3;
    for (int i = 0; i < 60; i++) { /* coverage grows with c */
        const double c = 0.5 * (low + high);
        const double above = c < 1 ? gsl_cdf_chisq_P(dof / ((1 - c) * (1 - c)), dof) : 1;
        if (above - gsl_cdf_chisq_P(dof / ((1 + c) * (1 + c)), dof) < 0.95)
            low = c;
        else
            high = c;
    }
    return high;
}

tg_code tg_place_result(const tg_target *t, const char *measure, const char *where, const char *unit, tg_results *out,
                        tg_result **r, tg_error *e)
{
    *r = tg_results_add(out, measure, where, unit);
    if (!*r) return tg_no_memory(e, out->n_results + 1, sizeof **r);
    if (t->lost[0]) tg_result_null(*r, "%s", t->lost);
    return TG_OK;
}
