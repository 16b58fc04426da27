#ifndef TG_KERNEL_H
#define TG_KERNEL_H
#include "io/error.h"

/* In the order of the table in kernel.c. */
#define TG_WINDOWS "ramp shepp-logan cosine hann hamming parzen butterworth"

typedef struct tg_apodisation tg_apodisation; /* a row of the table of windows */

/** The window that multiplies the ramp: NAME, NAME@CUTOFF (fraction of Nyquist, without it 1), or a text file of rows
 *  "fraction value", fractions rising from 0 to at most 2, with # before comments.
 *
 *  Each view holds frequencies up to its Nyquist frequency, no more: a cut-off above 1 stretches the window beyond it,
 *  so that less is taken away below (scans with a quarter-channel offset hold more, between opposed views). */
typedef struct {
    const tg_apodisation *apodisation; /* NULL: from a file */
    double cutoff;                     /* fraction of the Nyquist frequency, 0 < cutoff <= 2 */
    size_t n;                          /* rows of a file */
    double *fraction, *value;          /* {n} rising fractions of Nyquist, owned */
} tg_kernel;

/** @param text  "hann@0.8" or a path; a name that is no window and no file is answered with the nearest name
 *  @param k     set on success
 *  @return TG_OK, TG_INPUT, TG_MACHINE */
tg_code tg_kernel_read(const char *text, tg_kernel *k, tg_error *e);
void tg_kernel_free(tg_kernel *k);

/** Response of the window at a frequency given as a fraction of Nyquist (linear between the rows of a file). */
double tg_kernel_response(const tg_kernel *k, double fraction);

/** Fraction of Nyquist beyond which the response is 0; INFINITY: none. */
double tg_kernel_end(const tg_kernel *k);

#endif
