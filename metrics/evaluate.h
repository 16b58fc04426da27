#ifndef TG_EVALUATE_H
#define TG_EVALUATE_H
#include "io/input.h"
#include "io/progress.h"
#include "metrics/examine.h"
#include "metrics/job.h"

/** One reconstruction of a job, done and measured. */
typedef struct {
    const tg_recipe *recipe;
    char *image_name; /* "hann.fits", beside the results; NULL in a measurement of images */
    tg_image image;
    char *specification; /* its name; NULL: nothing judged */
    char *unspecified;   /* why the specification does not speak of this image; NULL: it does */
    tg_results results;
    tg_verdict verdict;
    double shift_mm[2], turn_rad;
    bool turn_known;
    char lost[200];
    double seconds; /* reconstruction and measuring: goes to run.json only */
} tg_evaluated;

typedef struct {
    const tg_job *job;
    char *phantom_name;
    tg_evaluated *item; /* {n}, owned */
    size_t n;
    tg_verdict verdict;
    tg_inputs inputs;
    tg_error remarks; /* warnings collected on the way */
    double seconds_scan, peak_mib;
} tg_evaluation;

/** Do a job in memory; nothing is written. */
tg_code tg_evaluate(const tg_job *job, const tg_progress *progress, tg_evaluation *out, tg_error *e);
void tg_evaluation_free(tg_evaluation *ev);

/** Write an evaluation into a folder: images as FITS and PNG, results.json, results.csv, run.json, report.html. */
tg_code tg_evaluation_write(const tg_evaluation *ev, const char *folder, bool force, tg_error *e);

#endif
