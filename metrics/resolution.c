/* The measures mtf50 and mtf10. */
#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/mtf.h"
#include "metrics/place.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/** By its edge, unless an export cut the values off: the foot of the edge would be there, its top not. */
static tg_code measure_edge(const tg_target *t, int solid, tg_mtf *mtf, tg_error *e)
{
    tg_place place = {0};
    tg_code code = tg_place_mean(t, solid, &place, e);
    if (code == TG_OK && place.clipped)
        tg_mtf_refuse(mtf, "%s", place.why);
    else if (code == TG_OK)
        code = tg_mtf_by_edge(t, solid, mtf, e);
    tg_place_free(&place);
    return code;
}

static tg_code measure_curve(const tg_target *t, int solid, tg_by by, tg_mtf *mtf, tg_error *e)
{
    double centre_mm[2], radius_mm = INFINITY;
    tg_target_circle(t, solid, centre_mm, &radius_mm);
    if (by == TG_BY_ANY) by = 2 * radius_mm < t->spread_mm ? TG_BY_WIRE : TG_BY_EDGE;
    return by == TG_BY_WIRE ? tg_mtf_by_point(t, solid, mtf, e) : measure_edge(t, solid, mtf, e);
}

static tg_code add_curve(const tg_target *t, const char *where, const tg_mtf *mtf, tg_results *out, tg_error *e)
{
    const bool predicted = isfinite(tg_theory_mtf(&t->theory, 0));
    tg_curve *c = tg_results_add_curve(out, "mtf", where, "1/mm", "", mtf->n, predicted);
    if (!c) return tg_no_memory(e, 3 * mtf->n, sizeof *c->x);
    memcpy(c->x, mtf->f_per_mm, mtf->n * sizeof *c->x);
    memcpy(c->y, mtf->modulation, mtf->n * sizeof *c->y);
    for (size_t i = 0; predicted && i < mtf->n; i++)
        c->predicted[i] = tg_theory_mtf(&t->theory, c->x[i]);
    return TG_OK;
}

static tg_code add_level(const tg_target *t, const char *where, const tg_mtf *mtf, int level, tg_results *out,
                         tg_error *e)
{
    static const char *const measures[TG_MTF_LEVELS] = {"mtf50", "mtf10"};
    const tg_mtf_level *l = &mtf->level[level];
    tg_result *r = tg_results_add(out, measures[level], where, "1/mm");
    if (!r) return tg_no_memory(e, 1, sizeof *r);
    r->predicted = tg_theory_mtf_frequency(&t->theory, tg_mtf_level_of[level]);
    if (isnan(l->f_per_mm)) {
        tg_result_null(r, "%s", l->why);
        return TG_OK;
    }
    r->value = l->f_per_mm;
    tg_result_budget(r, "noise", l->u_noise, l->dof);
    tg_result_budget(r, "method", l->u_method, INFINITY);
    tg_result_budget(r, "sampling", l->u_sampling, INFINITY);
    tg_result_combine(r);
    return TG_OK;
}

tg_code tg_measure_mtf(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_mtf mtf = {0};
    const char *where = t->phantom->solid[solid].name.v;
    if (*t->lost)
        tg_mtf_refuse(&mtf, "%s", t->lost);
    else
        TG_TRY(measure_curve(t, solid, by, &mtf, e));
    for (int level = 0; level < TG_MTF_LEVELS; level++)
        TG_TRY(add_level(t, where, &mtf, level, out, e));
    if (mtf.n) {
        TG_TRY(add_curve(t, where, &mtf, out, e));
        snprintf(mtf.region.label, sizeof mtf.region.label, "%s", where);
        TG_TRY(tg_results_add_region(out, &mtf.region, e));
    }
done:
    return code;
}
