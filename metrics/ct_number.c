#include "metrics/measure.h"
#include "metrics/place.h"
#include "metrics/presence.h"

#include <math.h>
#include <stdio.h>

/** What the phantom's description and the image's energy say of a solid; NaN where they do not. */
static double expected(const tg_target *t, int solid)
{
    const tg_material *m = &t->phantom->material[t->phantom->solid[solid].material];
    const tg_facts *facts = &t->image->facts;
    double mu = m->mu_per_mm;
    if (t->unit == TG_HU && isfinite(m->hu)) return m->hu;
    if (!isfinite(mu) && (!isfinite(facts->energy_kev.v) || tg_material_mu(m, facts->energy_kev.v, &mu, NULL) != TG_OK))
        return NAN;
    return t->unit == TG_HU ? 1000 * (mu - facts->mu_water_per_mm.v) / facts->mu_water_per_mm.v : mu;
}

tg_code tg_measure_ct_number(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_place place = {0};
    tg_presence presence;
    tg_result *r;
    (void)by;
    TG_TRY(tg_place_result(t, "ct-number", t->phantom->solid[solid].name.v, tg_unit_text(t->unit), out, &r, e));
    r->predicted = expected(t, solid);
    if (r->why[0]) goto done;
    TG_TRY(tg_place_mean(t, solid, &place, e));
    if (place.why[0]) {
        tg_result_null(r, "%s", place.why);
        goto done;
    }
    r->value = place.mean;
    TG_TRY(tg_presence_find(t, solid, &presence, e));
    snprintf(r->note, sizeof r->note, "%s",
             presence == TG_MISSING ? "no outline at its place: is the description right?" : place.note);
    tg_result_budget(r, "noise", place.u, place.dof);
    tg_place_budget_slices(t, &place, NULL, r);
    tg_result_budget(r, "position", tg_place_position_u(t, &place), INFINITY);
    tg_result_combine(r);
    TG_TRY(tg_results_add_region(out, &place.region, e));
done:
    tg_place_free(&place);
    return code;
}
