/* The measures mtf50 and mtf10. */
#include "io/memory.h"
#include "metrics/measure.h"
#include "metrics/mtf.h"
#include "metrics/theory.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static tg_code measure_mtf(const tg_target *t, int solid, tg_by by, tg_mtf *mtf, tg_error *e)
{
    double centre_mm[2], radius_mm = INFINITY;
    tg_target_circle(t, solid, centre_mm, &radius_mm);
    if (by == TG_BY_ANY) by = 2 * radius_mm < t->spread_mm ? TG_BY_WIRE : TG_BY_EDGE;
    return by == TG_BY_WIRE ? tg_mtf_by_point(t, solid, mtf, e) : tg_mtf_by_edge(t, solid, mtf, e);
}

/** The curve goes with whichever of the two measures comes first. */
static tg_code add_curve(const tg_target *t, const char *where, const tg_mtf *mtf, tg_results *out, tg_error *e)
{
    for (size_t i = 0; i < out->n_curves; i++)
        if (!strcmp(out->curve[i].measure, "mtf") && !strcmp(out->curve[i].where, where)) return TG_OK;
    const bool predicted = isfinite(tg_theory_mtf(t->image, 0));
    tg_curve *c = tg_results_add_curve(out, "mtf", where, "1/mm", "", mtf->n, predicted);
    if (!c) return tg_no_memory(e, 3 * mtf->n, sizeof *c->x);
    memcpy(c->x, mtf->f_per_mm, mtf->n * sizeof *c->x);
    memcpy(c->y, mtf->modulation, mtf->n * sizeof *c->y);
    for (size_t i = 0; predicted && i < mtf->n; i++)
        c->predicted[i] = tg_theory_mtf(t->image, c->x[i]);
    return TG_OK;
}

static tg_code add_level(const tg_target *t, int solid, tg_by by, const char *measure, int level, tg_results *out,
                         tg_error *e)
{
    tg_code code = TG_OK;
    tg_mtf mtf = {0};
    const char *where = t->phantom->solid[solid].name.v;
    if (*t->lost)
        tg_mtf_refuse(&mtf, "%s", t->lost);
    else
        TG_TRY(measure_mtf(t, solid, by, &mtf, e));
    const tg_mtf_level *l = &mtf.level[level];
    tg_result *r = tg_results_add(out, measure, where, "1/mm");
    if (!r) TG_TRY(tg_no_memory(e, 1, sizeof *r));
    r->predicted = tg_theory_mtf_frequency(t->image, tg_mtf_level_of[level]);
    if (isnan(l->f_per_mm)) {
        tg_result_null(r, "%s", l->why);
    } else {
        r->value = l->f_per_mm;
        tg_result_budget(r, "noise", l->u_noise, l->dof);
        tg_result_budget(r, "method", l->u_method, INFINITY);
        tg_result_budget(r, "sampling", l->u_sampling, INFINITY);
        tg_result_combine(r);
    }
    if (mtf.n) {
        TG_TRY(add_curve(t, where, &mtf, out, e));
        snprintf(mtf.region.label, sizeof mtf.region.label, "%s", where);
        TG_TRY(tg_results_add_region(out, &mtf.region, e));
    }
done:
    return code;
}

tg_code tg_measure_mtf50(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    return add_level(t, solid, by, "mtf50", TG_MTF_HALF, out, e);
}

tg_code tg_measure_mtf10(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    return add_level(t, solid, by, "mtf10", TG_MTF_TENTH, out, e);
}
