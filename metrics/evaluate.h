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
    const tg_job *job; /* NULL in a measurement of images */
    char *phantom_name;
    tg_evaluated *item; /* {n}, owned */
    size_t n;
    tg_verdict verdict;
    tg_inputs inputs;
    tg_error remarks; /* warnings collected on the way */
    double seconds_scan, peak_mib;
} tg_evaluation;

/** Every file that a job reads, with its checksum. */
tg_code tg_job_inputs(const tg_job *job, tg_inputs *inputs, tg_error *e);

/** Do a job in memory; nothing is written. */
tg_code tg_evaluate(const tg_job *job, const tg_progress *progress, tg_evaluation *out, tg_error *e);
void tg_evaluation_free(tg_evaluation *ev);

/** Find the phantom in images (pooled), measure, and judge by a specification where it speaks of them.
 *  @param specification  path, NULL: nothing is judged
 *  @param item           zeroed but for recipe, image and image_name; the rest is set */
tg_code tg_evaluate_images(const tg_image *image, size_t n, const tg_phantom *phantom, const char *specification,
                           const tg_examine_options *options, const tg_progress *progress, tg_evaluated *item,
                           tg_error *e);

/** What a job will take, roughly: reads the scan's header or the scanner only.
 *  @param seconds  on one core @param mib  at its peak */
tg_code tg_evaluate_estimate(const tg_job *job, double *seconds, double *mib, tg_error *e);

/** The exit status that a verdict asks for: TG_OK, TG_FAILS or TG_OPEN. */
tg_code tg_verdict_code(tg_verdict verdict);

#endif
