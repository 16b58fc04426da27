#include "metrics/examine.h"

#include "io/memory.h"
#include "metrics/measure.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

typedef struct {
    const tg_target *target;
    const tg_specification *specification;
    const tg_examine_options *options;
    tg_results *out;
} examination;

static tg_result *find(const tg_results *all, const char *measure, const char *where)
{
    for (size_t i = 0; i < all->n_results; i++)
        if (!strcmp(all->result[i].measure, measure) && !strcmp(all->result[i].where, where)) return &all->result[i];
    return NULL;
}

__attribute__((format(printf, 2, 3))) static void add_note(tg_result *r, const char *format, ...)
{
    const size_t used = strlen(r->note), gap = used ? 2 : 0;
    if (used + gap + 1 >= sizeof r->note) return;
    if (gap) memcpy(r->note + used, "; ", 3);
    va_list args;
    va_start(args, format);
    vsnprintf(r->note + used + gap, sizeof r->note - used - gap, format, args);
    va_end(args);
}

/** 1/mm to the unit in which frequencies are said. */
static void say_frequency(tg_result *r, const char *unit, double factor)
{
    double *const figures[] = {&r->value, &r->uncertainty, &r->uncertainty_noise, &r->predicted};
    for (size_t i = 0; i < sizeof figures / sizeof *figures; i++)
        *figures[i] *= factor;
    for (size_t i = 0; i < r->n_budget; i++)
        r->budget[i].u *= factor;
    r->unit = unit;
}

/** The water value is uncertain, and with it the scale of all CT numbers: u(HU) = (1000 + HU) u(mu_w) / mu_w. */
static void add_water(tg_result *r, double water_u)
{
    if (!(water_u > 0) || isnan(r->value) || strcmp(r->measure, "ct-number")) return;
    tg_result_budget(r, "water value", fabs(1000 + r->value) * water_u, (double)INFINITY);
    tg_result_combine(r);
}

/** Measure at a solid unless that has been done, and say the new results as the options want them. */
static tg_code measure_once(const examination *x, const tg_measure *m, int solid, tg_by by, tg_error *e)
{
    tg_results *out = x->out;
    const size_t results = out->n_results, curves = out->n_curves;
    if (find(out, m->name, x->target->phantom->solid[solid].name.v)) return TG_OK;
    const tg_code code = m->run(x->target, solid, by, out, e);
    const double factor = x->options->lp_per_mm ? 1 : 10;
    const char *unit = x->options->lp_per_mm ? "lp/mm" : "lp/cm";
    for (size_t i = results; i < out->n_results; i++) {
        tg_result *r = &out->result[i];
        if (!strcmp(m->unit, "frequency")) say_frequency(r, unit, factor);
        add_water(r, x->options->water_u);
    }
    for (size_t i = curves; i < out->n_curves; i++) {
        tg_curve *c = &out->curve[i];
        if (strcmp(c->x_unit, "1/mm")) continue;
        for (size_t k = 0; k < c->n; k++)
            c->x[k] *= factor;
        c->x_unit = unit;
    }
    return code;
}

static void set_limits(tg_result *r, const tg_check *c, const tg_measure *m)
{
    const bool computed = c->nominal.line && isnan(c->nominal.v);
    r->nominal = computed ? r->predicted : c->nominal.line ? c->nominal.v : m->zero ? 0 : (double)NAN;
    r->low = c->tolerance.line ? r->nominal - c->tolerance.v : c->low.line ? c->low.v : (double)NAN;
    r->high = c->tolerance.line ? r->nominal + c->tolerance.v : c->high.line ? c->high.v : (double)NAN;
}

/** Why the limits of a check cannot be laid at its result; NULL: they can. */
static const char *unjudgeable(const examination *x, const tg_check *c, const tg_measure *m, const tg_result *r)
{
    const bool image_unit = !strcmp(m->unit, "HU"), spec_hu = x->specification->unit.v < 0.5;
    if (image_unit && spec_hu != (x->target->unit == TG_HU))
        return spec_hu ? "the limits are in HU and the image is in 1/mm; give a water value"
                       : "the limits are in 1/mm and the image is in HU";
    if (c->tolerance.line && c->nominal.line && isnan(c->nominal.v) && isnan(r->predicted))
        return "the nominal value cannot be computed for this image";
    return NULL;
}

static void judge(const examination *x, const tg_check *c, const tg_measure *m, tg_result *r)
{
    snprintf(r->source, sizeof r->source, "%s", c->source.v ? c->source.v : "");
    const char *why = unjudgeable(x, c, m, r);
    if (why) {
        r->verdict = TG_INCONCLUSIVE;
        add_note(r, "%s", why);
        return;
    }
    set_limits(r, c, m);
    r->verdict = tg_judge(r->value, r->uncertainty, r->low, r->high);
    if (2 * r->uncertainty > r->high - r->low)
        add_note(r, "uncertainty too large for these limits: no value could pass");
}

static tg_code run_check(const examination *x, const tg_check *c, tg_error *e)
{
    const tg_measure *m = tg_measure_find(c->measure.v);
    const int solid = tg_phantom_find(x->target->phantom, tg_check_solid(c));
    if (!m || solid == TG_NO_SOLID)
        return tg_fail(e, TG_INPUT, x->specification->path, c->line, "the phantom has no '%s' for %s",
                       tg_check_solid(c), c->measure.v);
    const tg_by by = c->by.line ? (tg_by)(TG_BY_WIRE + (int)c->by.v) : TG_BY_ANY;
    const tg_code code = measure_once(x, m, solid, by, e);
    tg_result *r = find(x->out, m->name, tg_check_solid(c));
    if (code != TG_OK) return code;
    if (!r) { /* a measure that says nothing must not make a check disappear */
        r = tg_results_add(x->out, m->name, tg_check_solid(c), "");
        if (!r) return tg_no_memory(e, 1, sizeof *r);
        tg_result_null(r, "the measure gave no figure here");
    }
    const char *water = x->options->water;
    if (!(water && !strcmp(water, r->where) && !strcmp(r->measure, "ct-number"))) judge(x, c, m, r);
    return TG_OK;
}

/** Where a result stands: those that are checked first, in the order of their checks, then all others in that of the
 *  table. */
static size_t rank(const examination *x, const tg_result *r)
{
    const size_t checks = x->specification ? x->specification->checks.n : 0;
    const tg_check *check = checks ? x->specification->checks.v : NULL;
    for (size_t i = 0; i < checks; i++)
        if (!strcmp(r->measure, check[i].measure.v) && !strcmp(r->where, tg_check_solid(&check[i]))) return i;
    return checks + (size_t)(tg_measure_find(r->measure) - tg_measures);
}

/** A stable sort by insertion: the results are few and mostly in order. */
static void put_in_order(const examination *x)
{
    tg_result *all = x->out->result;
    for (size_t i = 1; i < x->out->n_results; i++) {
        const tg_result r = all[i];
        const size_t place = rank(x, &r);
        size_t k = i;
        for (; k > 0 && rank(x, &all[k - 1]) > place; k--)
            all[k] = all[k - 1];
        all[k] = r;
    }
}

tg_code tg_examine(const tg_target *t, const tg_specification *s, const tg_examine_options *o, tg_results *out,
                   tg_verdict *verdict, tg_error *e)
{
    tg_code code = TG_OK;
    *out = (tg_results){0};
    const examination x = {t, s, o, out};
    for (size_t i = 0; s && i < s->checks.n; i++)
        TG_TRY(run_check(&x, (const tg_check *)s->checks.v + i, e));
    for (const tg_measure *m = tg_measures; m->name && !*t->lost; m++)
        for (int solid = 0; solid < (int)t->phantom->n_solids; solid++)
            if (m->applies(t, solid)) TG_TRY(measure_once(&x, m, solid, TG_BY_ANY, e));
    put_in_order(&x);
    tg_result *water = o->water ? find(out, "ct-number", o->water) : NULL;
    if (water) add_note(water, "defines CT number 0");
    *verdict = *t->lost ? TG_INCONCLUSIVE : TG_NO_LIMITS;
    for (size_t i = 0; i < out->n_results; i++)
        *verdict = tg_worst(*verdict, out->result[i].verdict);
done:
    if (code != TG_OK) tg_results_free(out);
    return code;
}
