#ifndef TG_RESULTS_FILE_H
#define TG_RESULTS_FILE_H
/** An evaluation as machines and people read it. */
#include "io/json.h"
#include "metrics/evaluate.h"

/** results.json: the same bytes for the same inputs, seed and build. tg_json_free it. */
tg_json *tg_results_json(const tg_evaluation *ev);

/** A curve as it stands there; a member of a list, or tg_json_free it. */
tg_json *tg_curve_json(const tg_curve *c);

/** run.json: what differs from run to run: date, machine, threads, seconds, memory, libraries. */
tg_json *tg_run_json(const tg_evaluation *ev);

/** results.csv: RFC 4180, a header row, then one row for each result. @param text  set on success, tg_free */
tg_code tg_results_csv(const tg_evaluation *ev, char **text, tg_error *e);

/** The verdict and a table for each reconstruction, 80 columns wide. @param text  set on success, tg_free */
tg_code tg_results_text(const tg_evaluation *ev, char **text, tg_error *e);

/** May everything be written that a job's evaluation writes into a folder? Asked before the work begins. */
tg_code tg_evaluation_allowed(const tg_job *job, const char *folder, bool force, tg_error *e);

/** Write an evaluation into a folder: images as FITS and PNG, results.json, results.csv, run.json, report.html.
 *  Looks first whether all of them may be written. */
tg_code tg_evaluation_write(const tg_evaluation *ev, const char *folder, bool force, tg_error *e);

#endif
