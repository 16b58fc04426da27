#include "phantoms/material.h"

#include "io/memory.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>
#include <xraylib.h>

enum { MOST_Z = 98, MOST_DEPTH = 20 }; /* attenuation is known up to californium */
#define MOST_ATOMS 1e6

/** Add up the atoms of a formula or of a bracket in it: xraylib has a parser too, but it leaks.
 *  @param c      moves behind what was read, or to what cannot stand where it does
 *  @param atoms  {MOST_Z + 1} by atomic number, raised */
static bool read_atoms(const char **c, int depth, double *atoms)
{
    const char *first = *c;
    while (**c && **c != ')') {
        const char symbol[3] = {**c, islower((unsigned char)(*c)[1]) ? (*c)[1] : '\0', '\0'};
        const int element = SymbolToAtomicNumber(symbol, NULL);
        double group[MOST_Z + 1] = {0}, times = 1;
        if (element > 0 && element <= MOST_Z) {
            group[element] = 1;
            *c += strlen(symbol);
        } else if (**c == '(' && depth < MOST_DEPTH) {
            ++*c;
            if (!read_atoms(c, depth + 1, group) || **c != ')') return false;
            ++*c;
        } else {
            return false;
        }
        if (isdigit((unsigned char)**c)) {
            const char *behind = *c + strspn(*c, "0123456789.");
            char *end;
            times = strtod(*c, &end);
            if (!(times > 0 && times <= MOST_ATOMS) || end != behind || behind[-1] == '.') return false;
            *c = behind;
        }
        for (int z = 1; z <= MOST_Z; z++)
            atoms[z] += times * group[z];
    }
    return *c > first;
}

/** Take a composition over. */
static tg_code compose(int n, const int *z, const double *fraction, double density_g_cm3, tg_material *m, tg_error *e)
{
    tg_code code = TG_OK;
    tg_material made = {.name = m->name, .n = n, .density_g_cm3 = density_g_cm3, .mu_per_mm = NAN, .hu = NAN};
    TG_TRY(TG_NEW(made.z, (size_t)n, e));
    TG_TRY(TG_NEW(made.fraction, (size_t)n, e));
    memcpy(made.z, z, (size_t)n * sizeof *z);
    memcpy(made.fraction, fraction, (size_t)n * sizeof *fraction);
    *m = made;
    return TG_OK;
done:
    tg_free(made.z);
    tg_free(made.fraction);
    return code;
}

tg_code tg_material_formula(const char *formula, double density_g_cm3, const char *file, int line, tg_material *m,
                            tg_error *e)
{
    double atoms[MOST_Z + 1] = {0}, fraction[MOST_Z], total = 0;
    int z[MOST_Z], n = 0;
    const char *c = formula;
    if (!read_atoms(&c, 0, atoms) || *c)
        return tg_fail(e, TG_INPUT, file, line,
                       "formula: '%s' cannot be read %s%s; write elements and numbers, as in C2F4 or Ca5(PO4)3OH",
                       tg_show(formula).text, *c ? "from " : "to its end", tg_show(c).text);
    for (int i = 1; i <= MOST_Z; i++)
        if (atoms[i] > 0) {
            z[n] = i;
            fraction[n] = atoms[i] * AtomicWeight(i, NULL);
            total += fraction[n++];
        }
    for (int i = 0; i < n; i++)
        fraction[i] /= total;
    return compose(n, z, fraction, density_g_cm3, m, e);
}

/** A name of the list that the user may have meant: one that starts alike, or one that is spelt nearly so. */
static bool nearest_compound(const char *name, char **list, int n, char out[64])
{
    char words[8192] = "", word[64];
    for (int i = 0; i < n; i++) {
        if (!strncasecmp(list[i], name, strlen(name))) {
            snprintf(out, 64, "%s", list[i]);
            return true;
        }
        const size_t used = strlen(words);
        snprintf(words + used, sizeof words - used, "%s ", list[i]);
        for (char *c = words + used; *c && c[1]; c++)
            if (*c == ' ') *c = '_'; /* tg_nearest parts words at blanks */
    }
    snprintf(word, sizeof word, "%s", name);
    for (char *c = word; *c; c++)
        if (*c == ' ') *c = '_';
    if (!tg_nearest(word, words, out)) return false;
    for (char *c = out; *c; c++)
        if (*c == '_') *c = ' ';
    return true;
}

tg_code tg_material_compound(const char *compound, double density_g_cm3, const char *file, int line, tg_material *m,
                             tg_error *e)
{
    int n = 0, at = 0;
    char **list = GetCompoundDataNISTList(&n, NULL);
    struct compoundDataNIST *c = NULL;
    tg_code code = list ? TG_OK : tg_no_memory(e, 1, sizeof *list);
    while (at < n && strcasecmp(compound, list[at]))
        at++;
    if (code == TG_OK && at == n) {
        char near[64];
        const bool found = *compound && nearest_compound(compound, list, n, near);
        code = tg_fail(e, TG_INPUT, file, line, "compound: '%s' is not in the NIST list%s%s%s", tg_show(compound).text,
                       found ? "; did you mean '" : "; give its formula and density instead", found ? near : "",
                       found ? "'?" : "");
    } else if (code == TG_OK) {
        c = GetCompoundDataNISTByIndex(at, NULL);
        code = c ? compose(c->nElements, c->Elements, c->massFractions,
                           isnan(density_g_cm3) ? c->density : density_g_cm3, m, e)
                 : tg_no_memory(e, 1, sizeof *c);
    }
    if (c) FreeCompoundDataNIST(c);
    for (int i = 0; i < n; i++)
        xrlFree(list[i]);
    xrlFree(list);
    return code;
}

/** The mixture rule. */
static tg_code mixture_mu(const tg_material *m, double energy_kev, double *mu_per_mm, tg_error *e)
{
    double mass_cm2_g = 0;
    for (int i = 0; i < m->n; i++) {
        const double one = CS_Total(m->z[i], energy_kev, NULL);
        if (!(one > 0))
            return tg_fail(e, TG_INPUT, NULL, 0, "no attenuation is tabulated for element %d at %g keV", m->z[i],
                           energy_kev);
        mass_cm2_g += m->fraction[i] * one;
    }
    *mu_per_mm = mass_cm2_g * m->density_g_cm3 / 10; /* 1/cm to 1/mm */
    return TG_OK;
}

tg_code tg_water_mu(double energy_kev, double *mu_per_mm, tg_error *e)
{
    tg_material water = {0};
    tg_code code = TG_OK;
    TG_TRY(tg_material_compound("Water, Liquid", 1, NULL, 0, &water, e));
    TG_TRY(tg_material_mu(&water, energy_kev, mu_per_mm, e));
done:
    tg_material_free(&water);
    return code;
}

tg_code tg_material_mu(const tg_material *m, double energy_kev, double *mu_per_mm, tg_error *e)
{
    if (!(energy_kev >= 1 && energy_kev <= 1000))
        return tg_fail(e, TG_INPUT, NULL, 0, "an energy of %g keV is outside 1 to 1000 keV", energy_kev);
    if (m->n) return mixture_mu(m, energy_kev, mu_per_mm, e);
    if (isnan(m->hu)) {
        *mu_per_mm = m->mu_per_mm;
        return TG_OK;
    }
    double water;
    const tg_code code = tg_water_mu(energy_kev, &water, e);
    if (code == TG_OK) *mu_per_mm = water * (1 + m->hu / 1000);
    return code;
}

void tg_material_free(tg_material *m)
{
    tg_free(m->name.v);
    tg_free(m->z);
    tg_free(m->fraction);
    *m = (tg_material){0};
}
