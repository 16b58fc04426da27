#include "phantoms/material.h"

#include "io/memory.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>
#include <xraylib.h>

enum { MOST_FORMULA = 200 }; /* characters */

/** The first character that cannot stand where it does, or NULL: xraylib's parser leaks when it fails, so it is shown
 *  only formulas that it can read. */
static const char *formula_fault(const char *formula)
{
    int depth = 0;
    bool counted = false; /* an element or group stands before, which a number or a closing bracket may follow */
    const char *c = formula;
    while (*c && c - formula < MOST_FORMULA) {
        const char symbol[3] = {c[0], islower((unsigned char)c[1]) ? c[1] : '\0', '\0'};
        if (*c == '(') {
            depth++;
            c++;
            counted = false;
        } else if (*c == ')' && counted && depth > 0) {
            depth--;
            c++;
        } else if (isdigit((unsigned char)*c) && counted) {
            const char *behind = c + strspn(c, "0123456789.");
            char *end;
            if (!(strtod(c, &end) > 0) || end != behind || behind[-1] == '.') return c;
            c = behind;
        } else if (SymbolToAtomicNumber(symbol, NULL)) {
            c += strlen(symbol);
            counted = true;
        } else {
            return c;
        }
    }
    return *c || depth || !counted ? c : NULL;
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
    const char *fault = formula_fault(formula);
    if (fault)
        return tg_fail(e, TG_INPUT, file, line,
                       "formula: '%.60s' cannot be read %s%.20s; write elements and numbers, as in C2F4 or Ca5(PO4)3OH",
                       formula, *fault ? "from " : "to its end", fault);
    struct compoundData *c = CompoundParser(formula, NULL);
    if (!c) return tg_fail(e, TG_INPUT, file, line, "formula: '%.60s' is not understood", formula);
    const tg_code code = compose(c->nElements, c->Elements, c->massFractions, density_g_cm3, m, e);
    FreeCompoundData(c);
    return code;
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
        code = tg_fail(e, TG_INPUT, file, line, "compound: '%.60s' is not in the NIST list%s%s%s", compound,
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
