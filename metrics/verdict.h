#ifndef TG_VERDICT_H
#define TG_VERDICT_H
#include "metrics/result.h"

/** Verdict with a guard band (JCGM 106:2012, 8.3): pass when value +- uncertainty lies inside the limits, fail when it
 * lies outside, else inconclusive. A limit may be NaN: one-sided. Both NaN: no limits. A NaN value is inconclusive. */
tg_verdict tg_judge(double value, double uncertainty, double low, double high);

tg_verdict tg_worst(tg_verdict a, tg_verdict b);

/** "pass", "fail", "inconclusive", "none" */
const char *tg_verdict_text(tg_verdict v);

#endif
