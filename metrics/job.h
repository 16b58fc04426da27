#ifndef TG_JOB_H
#define TG_JOB_H
#include "metrics/specification.h"
#include "phantoms/phantom.h"
#include "phantoms/scanner.h"
#include "recon/recipe.h"

/** A job: what was scanned, how, and every reconstruction with the specification it answers to. */
typedef struct {
    tg_text name;
    char *path;
    tg_text phantom, scan, scanner; /* paths; scan (a file) or scanner (to simulate), not both */
    tg_number photons, seed;        /* instead of the scanner's own */
    tg_text water;                  /* solid whose mean defines CT number 0 */
    tg_text specification;          /* for every reconstruction without its own */
    tg_number frequency_unit;       /* choice: lp/cm lp/mm */
    tg_list reconstructions;        /* of tg_recipe */
    tg_text note;                   /* words for the page: who, what for */
} tg_job;

/** Read and check a job. */
tg_code tg_job_read(const char *path, tg_job *job, tg_error *e);
void tg_job_free(tg_job *job);

#endif
