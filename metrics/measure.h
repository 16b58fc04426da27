#ifndef TG_MEASURE_H
#define TG_MEASURE_H
#include "metrics/target.h"

/** How to measure, where a measure has a choice. */
typedef enum { TG_BY_ANY, TG_BY_WIRE, TG_BY_EDGE } tg_by;
#define TG_BY_WORDS "wire edge"

/** One measure: a row of the table. A run adds one result or several (and curves, regions) for one solid; a figure that
 *  cannot be had is added as null with a why. Rows that share a run are figures of one curve, and come together. It
 *  fails only when memory runs out. */
typedef struct tg_measure {
    const char *name; /* "ct-number" */
    const char *unit; /* "HU": the image's unit; "frequency": the job's; else as written */
    const char *what; /* one sentence */
    bool zero;        /* 0 is its ideal: a tolerance needs no nominal value */
    bool by;          /* it can be measured in more than one way */
    /** Does it make sense at this solid when nothing asks for it? */
    bool (*applies)(const tg_target *t, int solid);
    tg_code (*run)(const tg_target *t, int solid, tg_by by, tg_results *out, tg_error *e);
} tg_measure;

extern const tg_measure tg_measures[]; /* ends with a NULL name */

const tg_measure *tg_measure_find(const char *name);

/* The runs of the table. Frequencies are 1/mm inside; examine.c turns them to the job's unit. */
tg_code tg_measure_ct_number(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_uniformity(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_cupping(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_noise(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_nps(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_mtf(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_diameter(const tg_target *, int solid, tg_by, tg_results *, tg_error *);
tg_code tg_measure_position(const tg_target *, int solid, tg_by, tg_results *, tg_error *);

#endif
