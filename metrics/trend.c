#include "metrics/trend.h"

#include <math.h>
#include <string.h>

static void powers(const tg_trend *t, size_t pixel, double *p)
{
    const double x = ((double)(pixel % t->nx) - t->origin[0]) / t->scale;
    const double y = ((double)(pixel / t->nx) - t->origin[1]) / t->scale, r2 = x * x + y * y;
    const double all[TG_CUP] = {1, x, y, x * x, x * y, y * y, r2 * r2};
    memcpy(p, all, t->modes * sizeof *p);
}

static double product(const double *a, double (*gram)[TG_CUP], const double *b, size_t n)
{
    double sum = 0;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            sum += a[i] * gram[i][j] * b[j];
    return sum;
}

void tg_trend_over(size_t modes, const size_t *index, size_t n, size_t nx, tg_trend *t)
{
    *t = (tg_trend){.modes = modes, .nx = nx, .scale = 1};
    double low[2] = {INFINITY, INFINITY}, high[2] = {-INFINITY, -INFINITY}, gram[TG_CUP][TG_CUP] = {{0}};
    for (size_t i = 0; i < n; i++) {
        const double at[2] = {(double)(index[i] % nx), (double)(index[i] / nx)};
        for (int a = 0; a < 2; a++) {
            low[a] = fmin(low[a], at[a]);
            high[a] = fmax(high[a], at[a]);
        }
    }
    for (int a = 0; a < 2 && n; a++) {
        t->origin[a] = 0.5 * (low[a] + high[a]);
        t->scale = fmax(t->scale, 0.5 * (high[a] - low[a]));
    }
    for (size_t i = 0; i < n; i++) {
        double p[TG_CUP];
        powers(t, index[i], p);
        for (size_t j = 0; j < modes; j++)
            for (size_t k = 0; k < modes; k++)
                gram[j][k] += p[j] * p[k];
    }
    for (size_t k = 0; k < modes; k++) { /* Gram-Schmidt on the powers */
        double *m = t->mode[k];
        m[k] = 1;
        for (size_t j = 0; j < k; j++) {
            const double along = product(t->mode[j], gram, m, modes);
            for (size_t i = 0; i < modes; i++)
                m[i] -= along * t->mode[j][i];
        }
        const double norm = product(m, gram, m, modes);
        const double scale = norm > 1e-9 * gram[k][k] ? 1 / sqrt(norm) : 0;
        for (size_t i = 0; i < modes; i++)
            m[i] *= scale;
    }
}

/** All surfaces at one pixel. */
static void modes_at(const tg_trend *t, size_t pixel, double *value)
{
    double p[TG_CUP];
    powers(t, pixel, p);
    for (size_t k = 0; k < t->modes; k++) {
        value[k] = 0;
        for (size_t i = 0; i <= k; i++)
            value[k] += t->mode[k][i] * p[i];
    }
}

void tg_trend_mode(const tg_trend *t, size_t k, const size_t *index, size_t n, double *value)
{
    for (size_t i = 0; i < n; i++) {
        double p[TG_CUP];
        powers(t, index[i], p);
        value[i] = 0;
        for (size_t j = 0; j <= k; j++)
            value[i] += t->mode[k][j] * p[j];
    }
}

void tg_trend_fit(const tg_trend *t, const size_t *index, size_t n, const float *v, const float *minus,
                  double *coefficient)
{
    memset(coefficient, 0, t->modes * sizeof *coefficient);
    for (size_t i = 0; i < n; i++) {
        double m[TG_CUP];
        modes_at(t, index[i], m);
        const double value = (double)v[index[i]] - (minus ? (double)minus[index[i]] : 0);
        for (size_t k = 0; k < t->modes; k++)
            coefficient[k] += m[k] * value;
    }
}

double tg_trend_remove(const tg_trend *t, const size_t *index, size_t n, const float *v, const float *minus,
                       double *residual)
{
    double c[TG_CUP], sum = 0;
    tg_trend_fit(t, index, n, v, minus, c);
    for (size_t i = 0; i < n; i++) {
        double m[TG_CUP], rest = (double)v[index[i]] - (minus ? (double)minus[index[i]] : 0);
        modes_at(t, index[i], m);
        for (size_t k = 0; k < t->modes; k++)
            rest -= c[k] * m[k];
        if (residual) residual[i] = rest;
        sum += rest * rest;
    }
    return sum;
}

void tg_trend_slope(const tg_trend *t, const double *coefficient, double slope[2])
{
    for (size_t a = 0; a < 2; a++) {
        slope[a] = 0;
        for (size_t k = 0; k < t->modes; k++)
            slope[a] += coefficient[k] * t->mode[k][a + 1] / t->scale;
    }
}
