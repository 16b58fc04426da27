#include "phantoms/phantom.h"

#include <string.h>

/** The part of a ray that solids have taken already: disjoint intervals in rising order. */
typedef struct {
    size_t n;
    double t[TG_MOST_SOLIDS][2];
} taken;

/** Take an interval. @return the length of it that was still free */
static double take(taken *k, double a, double b)
{
    size_t first = 0;
    while (first < k->n && k->t[first][1] < a)
        first++;
    double free_mm = 0, from = a, low = a, high = b;
    size_t next = first;
    for (; next < k->n && k->t[next][0] <= b; next++) {
        if (k->t[next][0] > from) free_mm += k->t[next][0] - from;
        if (k->t[next][1] > from) from = k->t[next][1];
    }
    if (b > from) free_mm += b - from;
    if (next > first) { /* those that it touches become one */
        if (k->t[first][0] < low) low = k->t[first][0];
        if (k->t[next - 1][1] > high) high = k->t[next - 1][1];
    }
    if (next != first + 1) memmove(k->t + first + 1, k->t + next, (k->n - next) * sizeof *k->t);
    k->n = k->n + first + 1 - next;
    k->t[first][0] = low;
    k->t[first][1] = high;
    return free_mm;
}

void tg_phantom_paths(const tg_phantom *p, const double point_mm[3], const double direction[3], double *mm)
{
    taken k;
    k.n = 0;
    for (size_t m = 0; m < p->n_materials; m++)
        mm[m] = 0;
    for (size_t i = p->n_solids; i-- > 0;) { /* from the last, which displaces all others */
        double t[2];
        if (tg_solid_interval(&p->solid[i], point_mm, direction, t)) mm[p->solid[i].material] += take(&k, t[0], t[1]);
    }
}

int tg_phantom_solid_at(const tg_phantom *p, const double point_mm[3])
{
    for (size_t i = p->n_solids; i-- > 0;)
        if (tg_solid_holds(&p->solid[i], point_mm)) return (int)i;
    return TG_NO_SOLID;
}

int tg_phantom_find(const tg_phantom *p, const char *name)
{
    for (size_t i = 0; i < p->n_solids; i++)
        if (!strcmp(p->solid[i].name.v, name)) return (int)i;
    return TG_NO_SOLID;
}

tg_code tg_phantom_mu(const tg_phantom *p, double energy_kev, double *mu_per_mm, tg_error *e)
{
    tg_code code = TG_OK;
    for (size_t m = 0; m < p->n_materials; m++)
        TG_TRY(tg_material_mu(&p->material[m], energy_kev, &mu_per_mm[m], e));
done:
    return code;
}
