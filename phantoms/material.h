#ifndef TG_MATERIAL_H
#define TG_MATERIAL_H
/** material.c is the only file that knows xraylib. */
#include "io/fields.h"

/** A material as described: a formula or a NIST compound with its density, a plain mu, or a nominal CT number. */
typedef struct {
    tg_text name;
    int n;            /* elements; 0: plain mu or HU */
    int *z;           /* {n} atomic numbers, owned */
    double *fraction; /* {n} mass fractions, owned */
    double density_g_cm3;
    double mu_per_mm; /* plain mu, the same at every energy; NaN: none */
    double hu;        /* nominal CT number against water at the same energy; NaN: none */
} tg_material;

/** Composition from a chemical formula ("C2F4").  @param file,line  of the user's description, for messages */
tg_code tg_material_formula(const char *formula, double density_g_cm3, const char *file, int line, tg_material *m,
                            tg_error *e);

/** Composition and density from the NIST compound list ("Water, Liquid"); an unknown name is answered with the nearest.
 *  @param density_g_cm3  NaN: the list's own */
tg_code tg_material_compound(const char *compound, double density_g_cm3, const char *file, int line, tg_material *m,
                             tg_error *e);

/** Linear attenuation coefficient with coherent scattering [1/mm] at an energy; the mixture rule over NIST data.
 *  Hubbell and Seltzer (1995), NISTIR 5632. Call it once per energy when a description is read, not in a loop.
 *  @param energy_kev  1..1000 */
tg_code tg_material_mu(const tg_material *m, double energy_kev, double *mu_per_mm, tg_error *e);

/** That of water, 1 g/cm3. */
tg_code tg_water_mu(double energy_kev, double *mu_per_mm, tg_error *e);

void tg_material_free(tg_material *m);

#endif
