#ifndef TG_EXAMINE_H
#define TG_EXAMINE_H
#include "metrics/specification.h"
#include "metrics/target.h"
#include "metrics/verdict.h"

/** How results are said. */
typedef struct {
    const char *water; /* solid that defined CT number 0: its own ct-number is no check; NULL: none */
    double water_u;    /* relative standard uncertainty of its attenuation: goes into every ct-number; 0: none */
    bool lp_per_mm;    /* frequencies in lp/mm instead of lp/cm */
} tg_examine_options;

/** Measure a target against a specification (NULL: everything the phantom allows, nothing judged).
 *  @param out  results, each with its verdict  @param verdict  the worst of them; inconclusive for a lost phantom */
tg_code tg_examine(const tg_target *t, const tg_specification *s, const tg_examine_options *o, tg_results *out,
                   tg_verdict *verdict, tg_error *e);

#endif
