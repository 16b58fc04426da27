#ifndef TG_RESULT_H
#define TG_RESULT_H
#include "io/error.h"
#include "io/region.h"

typedef enum { TG_NO_LIMITS, TG_PASS, TG_INCONCLUSIVE, TG_FAIL } tg_verdict; /* the worst of several is the largest */

/** One line of an uncertainty budget: a standard uncertainty in the unit of the result. */
typedef struct {
    const char *source; /* static text: "noise", "position", "method" */
    double u;
    double dof; /* degrees of freedom; INFINITY for type B */
} tg_budget;

enum { TG_BUDGET = 8 };

/** A measured figure. Numbers are NaN where there is none. */
typedef struct {
    const char *measure, *unit; /* static text; unit "" for a pure number */
    char where[96];             /* "ptfe-rod", "body right" */
    char why[200];              /* set when value is NaN: why it could not be had */
    char note[200];             /* a warning that stands beside the figure, "" for none */
    double value;
    double uncertainty;        /* 95 % expanded, everything in it */
    double uncertainty_noise;  /* its random part, 95 % expanded */
    double nominal, low, high; /* what the specification asks; limits NaN where one-sided */
    double predicted;          /* by theory or from the phantom */
    tg_budget budget[TG_BUDGET];
    size_t n_budget;
    tg_verdict verdict;
    char source[96]; /* of the specification's figure */
} tg_result;

typedef struct {
    const char *measure, *x_unit, *y_unit;
    char where[96];
    size_t n;
    double *x, *y, *predicted; /* {n} owned; predicted may be NULL */
} tg_curve;

/** All that was measured in one image (or in pooled images of one phantom). */
typedef struct {
    tg_result *result; /* {n_results} owned */
    tg_curve *curve;   /* {n_curves} owned */
    tg_region *region; /* {n_regions} owned: where it was measured */
    size_t n_results, n_curves, n_regions;
} tg_results;

/** A new result with all numbers NaN, at the end of the list, valid until the next one is added; NULL when there is no
 *  memory. */
tg_result *tg_results_add(tg_results *r, const char *measure, const char *where, const char *unit);

/** A new curve with room for n points. @param predicted  give it room for a prediction, too */
tg_curve *tg_results_add_curve(tg_results *r, const char *measure, const char *where, const char *x_unit,
                               const char *y_unit, size_t n, bool predicted);

/** Remember a region for the pictures; a second one of the same label and place is dropped. */
tg_code tg_results_add_region(tg_results *r, const tg_region *region, tg_error *e);
void tg_results_free(tg_results *r);

/** Add a line to the budget (lines with u = 0 or NaN are left out). */
void tg_result_budget(tg_result *r, const char *source, double u, double dof);

/** Combine the budget: uncertainty and uncertainty_noise (lines called "noise"), k from the effective degrees of
 *  freedom (Welch-Satterthwaite; JCGM 100:2008, G.4). */
void tg_result_combine(tg_result *r);

/** The same for another factor than Student's t.  @param k  95 % factor for some degrees of freedom, at least 1 */
void tg_result_combine_by(tg_result *r, double (*k)(double dof));

/** Say why a figure could not be had: value NaN. printf-like. */
void tg_result_null(tg_result *r, const char *format, ...) __attribute__((format(printf, 2, 3)));

#endif
