#include "metrics/words.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

/* Decimal places that show two digits of u. */
static int places(double u)
{
    const int exponent = (int)floor(log10(u));
    return exponent >= 1 ? 0 : 1 - exponent;
}

static bool usable(double u)
{
    return u > 0 && isfinite(u);
}

/** A value in decimals; one that is 0 in all of them has no sign. */
static void decimals(int n, double value, char *out)
{
    snprintf(out, TG_WORDS, "%.*f", n, value);
    if (strtod(out, NULL) == 0) snprintf(out, TG_WORDS, "%.*f", n, 0.0);
}

void tg_words_value(double value, double uncertainty, char *out)
{
    if (isnan(value))
        snprintf(out, TG_WORDS, "-");
    else if (usable(uncertainty) && places(uncertainty) < 12)
        decimals(places(uncertainty), value, out);
    else
        snprintf(out, TG_WORDS, "%.5g", value);
}

void tg_words_uncertainty(double uncertainty, char *out)
{
    if (!usable(uncertainty)) {
        snprintf(out, TG_WORDS, "-");
        return;
    }
    const int n = places(uncertainty);
    const double unit = pow(10, -n);
    /* up, so that the interval never claims more than was found; a hair less for values that are round already */
    snprintf(out, TG_WORDS, "%.*f", n, ceil(uncertainty / unit - 1e-9) * unit);
}

void tg_words_limits(double low, double high, char *out)
{
    if (isnan(low) && isnan(high))
        *out = '\0';
    else if (isnan(low))
        snprintf(out, TG_WORDS, "at most %.5g", high);
    else if (isnan(high))
        snprintf(out, TG_WORDS, "at least %.5g", low);
    else
        snprintf(out, TG_WORDS, "%.5g to %.5g", low, high);
}
