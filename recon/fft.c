#include "recon/fft.h"

#include "io/memory.h"

#include <complex.h>
#include <fftw3.h>
#include <limits.h>
#include <pthread.h>

static pthread_mutex_t planning = PTHREAD_MUTEX_INITIALIZER; /* FFTW plans through shared state */

size_t tg_fft_length(size_t least)
{
    for (size_t n = least + least % 2;; n += 2) {
        size_t rest = n;
        for (size_t prime = 2; prime <= 7; prime++)
            while (rest > 1 && rest % prime == 0)
                rest /= prime;
        if (rest <= 1) return n ? n : 2;
    }
}

static tg_code no_plan(tg_error *e, size_t ny, size_t nx)
{
    return tg_fail(e, TG_MACHINE, NULL, 0, "no plan for a Fourier transform of %zu x %zu samples", ny, nx);
}

tg_code tg_fft_create(size_t ny, size_t nx, tg_fft *fft, tg_error *e)
{
    tg_code code = TG_OK;
    tg_fft made = {.ny = ny, .nx = nx};
    size_t n;
    if (!nx || !ny || nx > INT_MAX || ny > INT_MAX || !tg_multiply(ny, nx + 2, &n)) return no_plan(e, ny, nx);
    TG_TRY(TG_NEW(made.real, n, e));
    TG_TRY(TG_NEW(made.half, ny * (nx / 2 + 1), e));
    pthread_mutex_lock(&planning);
    made.forward = fftw_plan_dft_r2c_2d((int)ny, (int)nx, made.real, made.half, FFTW_ESTIMATE);
    made.inverse = fftw_plan_dft_c2r_2d((int)ny, (int)nx, made.half, made.real, FFTW_ESTIMATE);
    pthread_mutex_unlock(&planning);
    if (!made.forward || !made.inverse) code = no_plan(e, ny, nx);
done:
    if (code == TG_OK)
        *fft = made;
    else
        tg_fft_free(&made);
    return code;
}

void tg_fft_free(tg_fft *fft)
{
    pthread_mutex_lock(&planning);
    if (fft->forward) fftw_destroy_plan(fft->forward);
    if (fft->inverse) fftw_destroy_plan(fft->inverse);
    pthread_mutex_unlock(&planning);
    tg_free(fft->real);
    tg_free(fft->half);
    *fft = (tg_fft){0};
}

void tg_fft_forward(const tg_fft *fft)
{
    fftw_execute(fft->forward);
}

void tg_fft_inverse(const tg_fft *fft)
{
    const size_t n = fft->ny * fft->nx;
    fftw_execute(fft->inverse);
    for (size_t i = 0; i < n; i++)
        fft->real[i] /= (double)n;
}

tg_code tg_fft_rows_create(size_t n, tg_fft_rows *rows, tg_error *e)
{
    enum { FLOATS = TG_ALIGN / sizeof(float) };
    tg_code code = TG_OK;
    tg_fft_rows made = {.n = n};
    float *row = NULL;
    if (!n || n > INT_MAX) return no_plan(e, 1, n);
    made.stride = (2 * (n / 2 + 1) + FLOATS - 1) / FLOATS * FLOATS;
    TG_TRY(TG_NEW(row, made.stride, e));
    pthread_mutex_lock(&planning);
    made.forward = fftwf_plan_dft_r2c_1d((int)n, row, (fftwf_complex *)row, FFTW_ESTIMATE);
    made.inverse = fftwf_plan_dft_c2r_1d((int)n, (fftwf_complex *)row, row, FFTW_ESTIMATE);
    pthread_mutex_unlock(&planning);
    if (!made.forward || !made.inverse) code = no_plan(e, 1, n);
done:
    tg_free(row);
    if (code == TG_OK)
        *rows = made;
    else
        tg_fft_rows_free(&made);
    return code;
}

void tg_fft_rows_free(tg_fft_rows *rows)
{
    pthread_mutex_lock(&planning);
    if (rows->forward) fftwf_destroy_plan(rows->forward);
    if (rows->inverse) fftwf_destroy_plan(rows->inverse);
    pthread_mutex_unlock(&planning);
    *rows = (tg_fft_rows){0};
}

void tg_fft_rows_apply(const tg_fft_rows *rows, const float *response, float *row)
{
    const float scale = 1.0F / (float)rows->n;
    fftwf_execute_dft_r2c(rows->forward, row, (fftwf_complex *)row);
    for (size_t k = 0; k <= rows->n / 2; k++) {
        row[2 * k] *= response[k] * scale;
        row[2 * k + 1] *= response[k] * scale;
    }
    fftwf_execute_dft_c2r(rows->inverse, (fftwf_complex *)row, row);
}
