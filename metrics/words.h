#ifndef TG_WORDS_H
#define TG_WORDS_H
/** Figures as people read them, the same on the terminal and on the page. */
#include "metrics/result.h"

enum { TG_WORDS = 48 };

/** A value rounded to the place of the second digit of its uncertainty ("938.2"); without uncertainty to five digits;
 *  "-" for NaN.  @param out  {TG_WORDS} */
void tg_words_value(double value, double uncertainty, char *out);

/** An uncertainty with two digits, rounded up ("1.9"); "-" for NaN. */
void tg_words_uncertainty(double uncertainty, char *out);

/** What is specified: "900 to 980", "at most 5.75", "at least 5.6", "" without limits. */
void tg_words_limits(double low, double high, char *out);

#endif
