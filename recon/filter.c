#include "recon/filter.h"

#include "io/memory.h"
#include "recon/fft.h"

#include <complex.h>
#include <math.h>
#include <string.h>

struct tg_filter {
    size_t channels, views;
    tg_fft_rows rows;
    float *cosine;   /* {channels} of the fan angle; 1 for parallel */
    float *response; /* {n / 2 + 1} [1/mm] */
};

double tg_ramp_tap_per_mm2(const tg_scan *scan, size_t n)
{
    const double tau = tg_scan_pitch_mm(scan);
    if (n == 0) return 1 / (4 * tau * tau);
    if (n % 2 == 0) return 0;
    if (scan->geometry != TG_FAN_EQUIANGULAR) return -1 / pow(M_PI * (double)n * tau, 2);
    return -1 / pow(M_PI * scan->source_axis_mm * sin((double)n * scan->channel_step), 2);
}

/* Spectrum of the taps that a row can meet, times the window. */
static tg_code make_response(const tg_scan *scan, const tg_kernel *kernel, tg_filter *f, tg_error *e)
{
    tg_code code = TG_OK;
    tg_fft fft = {0};
    const size_t n = f->rows.n;
    const double tau = tg_scan_pitch_mm(scan);
    TG_TRY(TG_NEW(f->response, n / 2 + 1, e));
    TG_TRY(tg_fft_create(1, n, &fft, e));
    memset(fft.real, 0, n * sizeof *fft.real);
    for (size_t i = 0; i < f->channels; i++)
        fft.real[i] = fft.real[(n - i) % n] = tau * tg_ramp_tap_per_mm2(scan, i);
    tg_fft_forward(&fft);
    for (size_t k = 0; k <= n / 2; k++)
        f->response[k] = (float)(creal(fft.half[k]) * tg_kernel_response(kernel, 2 * (double)k / (double)n));
done:
    tg_fft_free(&fft);
    return code;
}

tg_code tg_filter_create(const tg_scan *scan, const tg_kernel *kernel, tg_filter **filter, tg_error *e)
{
    tg_code code = TG_OK;
    tg_filter *f = NULL;
    const double low = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, 0));
    const double high = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, (double)scan->channels - 1));
    if (low <= -M_PI_2 || high >= M_PI_2)
        TG_TRY(tg_fail(e, TG_INPUT, NULL, 0,
                       "the fan reaches from %.4g to %.4g degrees; a source sees less than 90 to either side",
                       low / TG_DEGREE, high / TG_DEGREE));
    TG_TRY(TG_NEW(f, 1, e));
    f->channels = scan->channels;
    f->views = scan->views;
    TG_TRY(tg_fft_rows_create(tg_fft_length(2 * scan->channels), &f->rows, e));
    TG_TRY(make_response(scan, kernel, f, e));
    TG_TRY(TG_NEW(f->cosine, f->channels, e));
    for (size_t i = 0; i < f->channels; i++)
        f->cosine[i] = (float)cos(tg_scan_fan_angle(scan, tg_scan_coordinate(scan, (double)i)));
done:
    if (code == TG_OK)
        *filter = f;
    else
        tg_filter_free(f);
    return code;
}

void tg_filter_free(tg_filter *filter)
{
    if (!filter) return;
    tg_fft_rows_free(&filter->rows);
    tg_free(filter->cosine);
    tg_free(filter->response);
    tg_free(filter);
}

size_t tg_filter_stride(const tg_filter *filter)
{
    return filter->rows.stride;
}

void tg_filter_apply(const tg_filter *f, const double *weight, const float *line, float *filtered)
{
#pragma omp parallel for schedule(static)
    for (size_t view = 0; view < f->views; view++) {
        const float *from = line + view * f->channels, w = (float)weight[view];
        float *row = filtered + view * f->rows.stride;
        for (size_t i = 0; i < f->channels; i++)
            row[i] = w * f->cosine[i] * from[i];
        memset(row + f->channels, 0, (f->rows.stride - f->channels) * sizeof *row);
        tg_fft_rows_apply(&f->rows, f->response, row);
    }
}
