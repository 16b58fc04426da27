#include "recon/kernel.h"

#include "tests/near.h"
#include "tests/scratch.h"

#include <stdio.h>
#include <string.h>

static tg_kernel open(const char *text)
{
    tg_error e = {0};
    tg_kernel k;
    CK_OK(tg_kernel_read(text, &k, &e));
    return k;
}

/* Formulas of the named windows worked out by hand: response at quarters of the Nyquist frequency, the noise integrals
 * F0 = 24 int u^2 A^2 du and F1 = the same with cos(2 pi u), u = f tau in 0..1/2, and u where A falls to 50 and 10 %.
 */
static const struct {
    const char *text;
    double quarter[4], f0, f1, u50, u10; /* u NaN: never */
} windows[] = {
    {"ramp", {1, 1, 1, 1}, 1.0000, -0.6079, NAN, NAN},
    {"shepp-logan", {.9745, .9003, .7842, .6366}, 0.6079, -0.3040, NAN, NAN},
    {"cosine", {.9239, .7071, .3827, 0}, 0.1960, -0.0160, .333, .468},
    {"hann", {.8536, .5000, .1464, 0}, 0.0900, 0.0178, .250, .398},
    {"hamming", {.8653, .5400, .2147, .0800}, 0.1115, 0.0088, .264, .453},
    {"parzen", {.7188, .2500, .0312, 0}, 0.0365, 0.0169, .181, .316},
    {"butterworth@0.5", {.9701, .7071, .4061, .2425}, 0.2313, -0.0416, .329, NAN},
};

START_TEST(window)
{
    tg_kernel k = open(windows[_i].text);
    enum { CELLS = 20000 };
    double f0 = 0, f1 = 0, below[2] = {NAN, NAN};
    for (int q = 1; q <= 4; q++)
        CK_NEAR(tg_kernel_response(&k, q / 4.0), windows[_i].quarter[q - 1], 0, 5.1e-5,
                "the window's formula, 4 digits");
    for (int i = 0; i < CELLS; i++) {
        const double u = 0.5 * (i + 0.5) / CELLS, a = tg_kernel_response(&k, 2 * u);
        f0 += 24 * u * u * a * a * 0.5 / CELLS;
        f1 += 24 * u * u * a * a * cos(2 * M_PI * u) * 0.5 / CELLS;
        if (a <= 0.5 && isnan(below[0])) below[0] = u;
        if (a <= 0.1 && isnan(below[1])) below[1] = u;
    }
    CK_NEAR(f0, windows[_i].f0, 0, 5.1e-5, "F0 in closed form, 4 digits");
    CK_NEAR(f1, windows[_i].f1, 0, 5.1e-5, "F1 in closed form, 4 digits");
    for (int i = 0; i < 2; i++) {
        const double want = i ? windows[_i].u10 : windows[_i].u50;
        if (isnan(want))
            ck_assert(isnan(below[i]));
        else
            CK_NEAR(below[i], want, 0, 5.3e-4, "where the window falls to 50 and 10 %, 3 digits");
    }
    tg_kernel_free(&k);
}
END_TEST

/* A cut-off stretches the window along the frequency axis. */
START_TEST(cutoff)
{
    tg_kernel hann = open("hann@0.8"), wide = open("cosine@2"), ramp = open("ramp@0.25"), roll = open("butterworth");
    CK_NEAR(tg_kernel_response(&hann, 0.4), 0.5, 1e-12, 0, "half at half the cut-off");
    ck_assert(tg_kernel_response(&hann, 0.81) == 0 && tg_kernel_end(&hann) == 0.8);
    CK_NEAR(tg_kernel_response(&wide, 1), M_SQRT1_2, 1e-12, 0, "cos(pi/4)");
    ck_assert(tg_kernel_response(&ramp, 0.25) == 1 && tg_kernel_response(&ramp, 0.2501) == 0);
    CK_NEAR(tg_kernel_response(&roll, 1), M_SQRT1_2, 1e-12, 0, "Butterworth 1930: 1/sqrt(2) at the cut-off");
    CK_NEAR(tg_kernel_response(&roll, 3), 1 / sqrt(82), 1e-12, 0, "and no end there");
    tg_kernel_free(&hann), tg_kernel_free(&wide), tg_kernel_free(&ramp), tg_kernel_free(&roll);
}
END_TEST

START_TEST(file)
{
    scratch_begin();
    tg_kernel k = open(scratch_write("k@2.txt", "# a window\n\n0 1 # flat first\r\n\t0.5  1\n1.5e0 -0.5\n"));
    ck_assert_uint_eq(k.n, 3);
    CK_NEAR(tg_kernel_response(&k, 0.3), 1, 1e-15, 0, "first rows");
    CK_NEAR(tg_kernel_response(&k, 0.5), 1, 1e-15, 0, "on a row");
    CK_NEAR(tg_kernel_response(&k, 0.75), 0.625, 1e-15, 0, "linear between rows");
    CK_NEAR(tg_kernel_response(&k, 1.5), -0.5, 1e-15, 0, "the last row");
    ck_assert(tg_kernel_response(&k, 1.500001) == 0 && tg_kernel_end(&k) == 1.5);
    tg_kernel_free(&k);
    tg_kernel_free(&k);
    scratch_end();
}
END_TEST

static const struct {
    const char *text;
    int line;
    const char *says;
} wrong_files[] = {
    {"0 1\n1 x\n", 2, "x"},
    {"0 1\n\n1\n", 3, "without a value"},
    {"0 1 2\n", 1, "more than"},
    {"0.1 1\n1 0\n", 1, "start at 0"},
    {"0 1\n0.5 1\n0.5 0\n", 3, "rise"},
    {"0 1\n2.5 0\n", 2, "out of range"},
    {"0 1\n1 1e300\n", 2, "out of range"},
    {"0 1\n", 0, "at least 2"},
    {"", 0, "at least 2"},
};

START_TEST(wrong_file)
{
    tg_error e = {0};
    tg_kernel k = {0};
    scratch_begin();
    const char *path = scratch_write("kernel.txt", wrong_files[_i].text);
    ck_assert_int_eq(tg_kernel_read(path, &k, &e), TG_INPUT);
    ck_assert_str_eq(e.message[0].file, path);
    ck_assert_int_eq(e.message[0].line, wrong_files[_i].line);
    ck_assert_msg(strstr(e.message[0].what, wrong_files[_i].says), "%s", e.message[0].what);
    ck_assert(!k.fraction && !k.value);
    scratch_end();
}
END_TEST

static const char *const wrong_names[][2] = {
    {"han", "hann"},
    {"haming@0.5", "hamming"},
    {"hann@", "number"},
    {"hann@0", "above 0"},
    {"hann@2.1", "up to 2"},
    {"hann@0,8", "0.8"},
    {"hann@nan", "not a number"},
    {"soft", "windows are ramp"},
    {"/no/such/file", "no kernel file"},
};

START_TEST(wrong_name)
{
    tg_error e = {0};
    tg_kernel k = {0};
    ck_assert_int_eq(tg_kernel_read(wrong_names[_i][0], &k, &e), TG_INPUT);
    ck_assert_uint_eq(e.count, 1);
    ck_assert_msg(strstr(e.message[0].what, wrong_names[_i][1]), "%s", e.message[0].what);
    ck_assert(!k.apodisation && !k.fraction);
}
END_TEST

Suite *suite_kernel(void);
Suite *suite_kernel(void)
{
    SUITE_BEGIN("kernel", 10);
    tcase_add_loop_test(tcase, window, 0, sizeof windows / sizeof *windows);
    tcase_add_test(tcase, cutoff);
    tcase_add_test(tcase, file);
    tcase_add_loop_test(tcase, wrong_file, 0, sizeof wrong_files / sizeof *wrong_files);
    tcase_add_loop_test(tcase, wrong_name, 0, sizeof wrong_names / sizeof *wrong_names);
    return suite;
}
