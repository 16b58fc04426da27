#ifndef TG_FFT_H
#define TG_FFT_H
/** fft.c is the only file that knows FFTW. Buffers are aligned to TG_ALIGN and plans are made by estimate, so that the
 *  bits are the same in every run and for any number of threads; one lock stands around planning.
 *
 *  Forward: X_k = sum_n x_n exp(-2 pi i k n / N), not scaled. Inverse: scaled by 1 / N, so that it undoes forward. */
#include "io/error.h"

/** Smallest length >= least that transforms fast: 2^a 3^b 5^c 7^d, even. */
size_t tg_fft_length(size_t least);

/** Real data of one or two dimensions and its half spectrum, in double. Write one buffer, transform, read the other.
 *  Frequency of column k: k / (nx step); of row j: (j <= ny / 2 ? j : j - ny) / (ny step). */
typedef struct {
    size_t ny, nx;         /* ny = 1: one dimension */
    double *real;          /* {ny, nx} */
    double _Complex *half; /* {ny, nx / 2 + 1}; the rest follows from X(-k) = conj X(k) */
    void *forward, *inverse;
} tg_fft;

/** @param fft  set on success; one thread at a time may use it
 *  @return TG_OK or TG_MACHINE */
tg_code tg_fft_create(size_t ny, size_t nx, tg_fft *fft, tg_error *e);
void tg_fft_free(tg_fft *fft);
void tg_fft_forward(const tg_fft *fft); /* real to half */
void tg_fft_inverse(const tg_fft *fft); /* half to real; half is overwritten */

/** A plan that filters rows of float in place: any number of threads may apply it to rows of their own. */
typedef struct {
    size_t n;      /* samples of a row */
    size_t stride; /* floats of a row's buffer: room for the spectrum, a multiple of TG_ALIGN bytes */
    void *forward, *inverse;
} tg_fft_rows;

tg_code tg_fft_rows_create(size_t n, tg_fft_rows *rows, tg_error *e);
void tg_fft_rows_free(tg_fft_rows *rows);

/** Multiply the spectrum of a row by a real response: a circular convolution with an even kernel.
 *  @param response  {n / 2 + 1}
 *  @param row       {stride} aligned to TG_ALIGN: n samples in, n samples out, the rest is scratch */
void tg_fft_rows_apply(const tg_fft_rows *rows, const float *response, float *row);

#endif
