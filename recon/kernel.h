#ifndef TG_KERNEL_H
#define TG_KERNEL_H
#include "io/error.h"

/** An apodising window as a row of a table. */
typedef struct {
    const char *name;
    double (*response)(double u); /* u = f / cut-off, 0..1; the response beyond 1 is 0 */
    const char *source;           /* author year */
} tg_apodisation;

extern const tg_apodisation tg_apodisations[]; /* ends with a NULL name */

/** The window that multiplies the ramp: NAME, NAME@CUTOFF (fraction of Nyquist), or a file of fraction and value. */
typedef struct {
    char text[64];                     /* as it was written */
    const tg_apodisation *apodisation; /* NULL: from a file */
    double cutoff;                     /* fraction of the Nyquist frequency, 0 < cutoff <= 2 */
    size_t n;                          /* rows of a file */
    double *fraction, *value;          /* {n} rising fractions of Nyquist, owned */
} tg_kernel;

/** @param text  "hann@0.8" or a path; a name that is no window and no readable file is answered with the nearest name
 *  @return TG_OK, TG_INPUT, TG_MACHINE */
tg_code tg_kernel_read(const char *text, tg_kernel *k, tg_error *e);
void tg_kernel_free(tg_kernel *k);

/** Response of the window at a frequency given as a fraction of Nyquist (linear between the rows of a file). */
double tg_kernel_response(const tg_kernel *k, double fraction);

#endif
