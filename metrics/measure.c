#include "metrics/measure.h"

#include <math.h>
#include <string.h>

/** Some pixels are left where the spread of the outline has faded. */
static bool large_enough(const tg_target *t, int solid)
{
    double centre_mm[2], radius_mm;
    return tg_target_inner_circle(t, solid, centre_mm, &radius_mm) &&
           radius_mm > 3 * t->spread_mm + 2 * t->grid.step_mm[0];
}

static bool round_body(const tg_target *t, int solid)
{
    double centre_mm[2], radius_mm;
    return solid == t->body && tg_target_circle(t, solid, centre_mm, &radius_mm);
}

static bool large_body(const tg_target *t, int solid)
{
    return solid == t->body && large_enough(t, solid);
}

/** A circle that stands in another material: thin as a wire, or with an edge of its own. */
static bool point_or_edge(const tg_target *t, int solid)
{
    double centre_mm[2], radius_mm;
    if (!tg_target_circle(t, solid, centre_mm, &radius_mm)) return false;
    if (2 * radius_mm > t->spread_mm && radius_mm < 4 * t->spread_mm) return false;
    const int around = tg_target_around(t, centre_mm, radius_mm);
    return around == TG_NO_SOLID || t->phantom->solid[around].material != t->phantom->solid[solid].material;
}

/** A circle whose outline can be told from its spread. */
static bool round_outline(const tg_target *t, int solid)
{
    double centre_mm[2], radius_mm;
    return tg_target_circle(t, solid, centre_mm, &radius_mm) && radius_mm >= 4 * t->spread_mm;
}

/** Or one so thin that its image is a point. */
static bool point_or_outline(const tg_target *t, int solid)
{
    double centre_mm[2], radius_mm;
    return round_outline(t, solid) ||
           (tg_target_circle(t, solid, centre_mm, &radius_mm) && 2 * radius_mm < t->spread_mm);
}

const tg_measure tg_measures[] = {
    {"ct-number", "HU", "mean of the inner part of a solid", false, false, large_enough, tg_measure_ct_number},
    {"uniformity", "HU", "mean at the rim minus mean in the middle of the body", true, false, round_body,
     tg_measure_uniformity},
    {"cupping", "HU", "middle of the body against its rim", true, false, round_body, tg_measure_cupping},
    {"noise", "HU", "standard deviation of the pixels of one slice", false, false, large_body, tg_measure_noise},
    {"nps-peak", "frequency", "frequency where the noise power is greatest", false, false, large_body, tg_measure_nps},
    {"nps-mean", "frequency", "mean frequency of the noise power", false, false, large_body, tg_measure_nps},
    {"mtf50", "frequency", "frequency where the modulation falls to a half", false, true, point_or_edge,
     tg_measure_mtf},
    {"mtf10", "frequency", "frequency where the modulation falls to a tenth", false, true, point_or_edge,
     tg_measure_mtf},
    {"diameter", "mm", "diameter at half of the step at the outline", false, false, round_outline, tg_measure_diameter},
    {"position", "mm", "distance of a solid from its place", true, false, point_or_outline, tg_measure_position},
    {0},
};

const tg_measure *tg_measure_find(const char *name)
{
    for (const tg_measure *m = tg_measures; m->name; m++)
        if (!strcmp(m->name, name)) return m;
    return NULL;
}
