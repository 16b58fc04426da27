#include "metrics/verdict.h"

#include <math.h>

tg_verdict tg_judge(double value, double uncertainty, double low, double high)
{
    if (isnan(low) && isnan(high)) return TG_NO_LIMITS;
    if (isnan(value) || !(uncertainty >= 0)) return TG_INCONCLUSIVE;
    const double from = value - uncertainty, to = value + uncertainty;
    /* comparisons with NaN are false: a missing limit is never broken */
    if (from > high || to < low) return TG_FAIL;
    return from < low || to > high ? TG_INCONCLUSIVE : TG_PASS;
}

tg_verdict tg_worst(tg_verdict a, tg_verdict b)
{
    return a > b ? a : b;
}

const char *tg_verdict_text(tg_verdict v)
{
    static const char *const text[] = {
        [TG_NO_LIMITS] = "none", [TG_PASS] = "pass", [TG_INCONCLUSIVE] = "inconclusive", [TG_FAIL] = "fail"};
    return text[v];
}
