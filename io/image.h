#ifndef TG_IMAGE_H
#define TG_IMAGE_H
#include "io/grid.h"
#include "io/scan.h"

typedef enum { TG_PER_MM, TG_HU } tg_unit;

/** One slice or a stack, with what is known of how it was made, so that theory can say what to expect of it. */
typedef struct {
    tg_grid grid;
    tg_unit unit;
    tg_scan scan; /* scan.channels = 0: unknown; row_step_mm is the thickness of a slice even then, 0: not stated */
    tg_facts facts;
    char *method, *kernel; /* as written in a recipe ("fbp", "hann@0.8"); owned, NULL: unknown */
    double least, most;    /* values between which the file's pixel type does not clip; -INFINITY, INFINITY for float */
    float *v;              /* {z, y, x} HU or 1/mm, owned; NaN where the file has no value */
} tg_image;

tg_code tg_image_create(const tg_grid *grid, tg_unit unit, tg_image *out, tg_error *e);
void tg_image_free(tg_image *image);

/** "HU" or "1/mm", for people. */
const char *tg_unit_text(tg_unit unit);

#endif
