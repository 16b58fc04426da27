#ifndef TG_PHANTOM_H
#define TG_PHANTOM_H
#include "phantoms/material.h"
#include "phantoms/solid.h"

/** What is there. Where solids overlap the later one displaces the earlier; outside all of them is vacuum. */
typedef struct {
    tg_text name;
    char *path;            /* of the description */
    tg_material *material; /* {n_materials}, owned */
    tg_solid *solid;       /* {n_solids}, owned */
    size_t n_materials, n_solids;
} tg_phantom;

enum { TG_MOST_SOLIDS = 256 }; /* and materials: a description has no more of either */

/** Read a description (keys: see phantoms/README.md). All errors of the file are reported.
 *  @return TG_OK, TG_INPUT, TG_MACHINE; on failure the struct is released already */
tg_code tg_phantom_read(const char *path, tg_phantom *p, tg_error *e);
tg_code tg_phantom_parse(const char *text, size_t bytes, const char *name, tg_phantom *p, tg_error *e);
void tg_phantom_free(tg_phantom *p);

/** Path length of a ray in every material, exactly: the whole line through the point.
 *  @param point_mm,direction  {3}; direction of unit length
 *  @param mm  {n_materials} written */
void tg_phantom_paths(const tg_phantom *p, const double point_mm[3], const double direction[3], double *mm);

enum { TG_NO_SOLID = -1 };

/** The solid that fills a point, or TG_NO_SOLID. */
int tg_phantom_solid_at(const tg_phantom *p, const double point_mm[3]);

/** Index of a solid by name, or TG_NO_SOLID. */
int tg_phantom_find(const tg_phantom *p, const char *name);

/** Attenuation of every material at one energy.  @param mu_per_mm  {n_materials} written */
tg_code tg_phantom_mu(const tg_phantom *p, double energy_kev, double *mu_per_mm, tg_error *e);

#endif
