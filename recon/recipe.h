#ifndef TG_RECIPE_H
#define TG_RECIPE_H
#include "io/grid.h"
#include "io/scan.h"

#define TG_METHODS "fbp" /* in the order of the table in reconstruct.c */

/** What one reconstruction is: the same keys as options and in a job file. */
typedef struct {
    tg_text name;       /* in a job */
    tg_number method;   /* index of one of TG_METHODS */
    tg_text kernel;     /* "hann@0.8" or a file */
    tg_number pixels;   /* along a side */
    tg_number field_mm; /* side of the square field; not given: the scan's field of view */
    tg_vector centre_mm;
    tg_number axis_channel;    /* 1-based channel of the rotation axis; not given: the scan's own */
    tg_number mu_water_per_mm; /* not given: the scan's own; neither: the image stays in 1/mm */
    tg_text specification;     /* in a job: path */
    int line;
} tg_recipe;

extern const tg_field tg_recipe_fields[]; /* all but name and specification, which only a job has */

/** The 0-based channel of the axis: the recipe's, or else the scan's. */
double tg_recipe_channel_zero(const tg_recipe *r, const tg_scan *scan);

/** The grid that a recipe asks for on a scan (one slice per row). Refuses a field of no size. */
tg_code tg_recipe_grid(const tg_recipe *r, const tg_scan *scan, tg_grid *grid, tg_error *e);

#endif
