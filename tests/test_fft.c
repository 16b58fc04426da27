#include "recon/fft.h"

#include "io/memory.h"
#include "tests/near.h"

#include <complex.h>

/* A fixed sequence without structure, in (-1, 1). */
static double sample(size_t i)
{
    return sin(1.0 + 12.9898 * (double)i * (double)(i % 7 + 1));
}

START_TEST(length)
{
    static const size_t least[] = {0, 1, 2, 11, 13, 1472, 2049}, want[] = {2, 2, 2, 12, 14, 1500, 2058};
    for (size_t i = 0; i < sizeof want / sizeof *want; i++)
        ck_assert_uint_eq(tg_fft_length(least[i]), want[i]);
}
END_TEST

/* Against the defining sum, odd and even lengths; double rounding over at most 35 terms of size 1. */
START_TEST(definition)
{
    static const size_t shape[][2] = {{1, 8}, {1, 7}, {5, 7}, {4, 6}};
    const size_t ny = shape[_i][0], nx = shape[_i][1];
    tg_error e = {0};
    tg_fft fft;
    CK_OK(tg_fft_create(ny, nx, &fft, &e));
    for (size_t i = 0; i < ny * nx; i++)
        fft.real[i] = sample(i);
    tg_fft_forward(&fft);
    for (size_t j = 0; j < ny; j++)
        for (size_t k = 0; k <= nx / 2; k++) {
            double complex sum = 0;
            for (size_t y = 0; y < ny; y++)
                for (size_t x = 0; x < nx; x++)
                    sum += sample(y * nx + x) * cexp(-2 * M_PI * (double complex)I *
                                                     ((double)(j * y) / (double)ny + (double)(k * x) / (double)nx));
            CK_NEAR(cabs(fft.half[j * (nx / 2 + 1) + k] - sum), 0, 0, 1e-13, "definition of the transform");
        }
    tg_fft_inverse(&fft);
    for (size_t i = 0; i < ny * nx; i++)
        CK_NEAR(fft.real[i], sample(i), 0, 1e-14, "inverse undoes forward");
    tg_fft_free(&fft);
}
END_TEST

/* A response 2 cos(2 pi k / n) is the even kernel of ones at +-1: each sample becomes the sum of its neighbours. */
START_TEST(neighbours)
{
    const size_t n = 30;
    tg_error e = {0};
    tg_fft_rows rows;
    float *row, response[16];
    CK_OK(tg_fft_rows_create(n, &rows, &e));
    ck_assert_uint_ge(rows.stride, n + 2);
    CK_OK(TG_NEW(row, rows.stride, &e));
    for (size_t k = 0; k <= n / 2; k++)
        response[k] = (float)(2 * cos(2 * M_PI * (double)k / (double)n));
    for (size_t i = 0; i < n; i++)
        row[i] = (float)sample(i);
    tg_fft_rows_apply(&rows, response, row);
    for (size_t i = 0; i < n; i++)
        CK_NEAR(row[i], sample((i + 1) % n) + sample((i + n - 1) % n), 0, 1e-6, "sum of the neighbours, float");
    tg_free(row);
    tg_fft_rows_free(&rows);
}
END_TEST

START_TEST(refusals)
{
    tg_error e = {0};
    tg_fft fft;
    tg_fft_rows rows;
    ck_assert_int_eq(tg_fft_create(1, 0, &fft, &e), TG_MACHINE);
    ck_assert_int_eq(tg_fft_create((size_t)1 << 40, 4, &fft, &e), TG_MACHINE);
    ck_assert_int_eq(tg_fft_rows_create(0, &rows, &e), TG_MACHINE);
    ck_assert_uint_eq(e.count, 3);
}
END_TEST

Suite *suite_fft(void);
Suite *suite_fft(void)
{
    SUITE_BEGIN("fft", 10);
    tcase_add_test(tcase, length);
    tcase_add_loop_test(tcase, definition, 0, 4);
    tcase_add_test(tcase, neighbours);
    tcase_add_test(tcase, refusals);
    return suite;
}
