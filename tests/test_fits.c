/* FITS files. Those that are read are laid out here byte by byte (FITS 4.0: cards of 80, blocks of 2880 bytes, big
 * endian), so that the reader is not tested against its own writer only. */
#include "io/fits.h"
#include "io/memory.h"
#include "tests/near.h"
#include "tests/says.h"
#include "tests/scratch.h"

#include <stdint.h>
#include <sys/stat.h>

#define RAD 0.017453292519943295 /* of a degree */

/* -------------------------------------------------- files byte by byte */

static void pad(FILE *out, char with)
{
    while (ftell(out) % 2880)
        fputc(with, out);
}

/* One HDU. @param cards  lines  @param data  big-endian already */
static void put_hdu(FILE *out, const char *cards, const void *data, size_t bytes)
{
    for (const char *end; *cards; cards = *end ? end + 1 : end) {
        end = strchr(cards, '\n');
        if (!end) end = cards + strlen(cards);
        fprintf(out, "%-80.*s", (int)(end - cards), cards);
    }
    fprintf(out, "%-80s", "END");
    pad(out, ' ');
    if (bytes) fwrite(data, 1, bytes, out);
    pad(out, '\0');
}

static const char *put_file(const char *cards, const void *data, size_t bytes)
{
    const char *path = scratch("made.fits");
    FILE *out = fopen(path, "wb");
    ck_assert_ptr_nonnull(out);
    put_hdu(out, cards, data, bytes);
    fclose(out);
    return path;
}

static size_t put_be(unsigned char *to, uint64_t bits, int bytes)
{
    for (int i = 0; i < bytes; i++)
        to[i] = (unsigned char)(bits >> 8 * (bytes - 1 - i));
    return (size_t)bytes;
}

/* A stored value in the given BITPIX. */
static size_t put_stored(unsigned char *to, int bitpix, double v)
{
    uint64_t bits;
    uint32_t bits32;
    const float f = (float)v;
    memcpy(&bits, &v, sizeof bits);
    memcpy(&bits32, &f, sizeof bits32);
    if (bitpix == -64) return put_be(to, bits, 8);
    if (bitpix == -32) return put_be(to, bits32, 4);
    return put_be(to, (uint64_t)(int64_t)v, bitpix / 8);
}

static unsigned char *floats(const float *v, size_t n)
{
    static unsigned char bytes[4096];
    ck_assert_uint_le(4 * n, sizeof bytes);
    for (size_t i = 0; i < n; i++)
        put_stored(bytes + 4 * i, -32, (double)v[i]);
    return bytes;
}

#define HEAD(bitpix, axes) "SIMPLE  =                    T\nBITPIX  = " bitpix "\nNAXIS   = " axes "\n"
#define FLAT HEAD("-32", "2") "NAXIS1  = 3\nNAXIS2  = 2\n"
#define CUBE HEAD("-32", "3") "NAXIS1  = 3\nNAXIS2  = 2\nNAXIS3  = 2\n"
#define CHANNEL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1.75\nCDELT1  = 0.5\n"
#define VIEW "CTYPE2  = 'VIEW'\nCUNIT2  = 'deg'\nCRPIX2  = 1\nCRVAL2  = 10\nCDELT2  = 30\n"
#define INTEGRAL "SCANDATA= 'line-integral'\n"
#define PARALLEL "SCANGEOM= 'parallel'\n"
static const float six[6] = {0, 1, 2, 3, 4, 5};
static const float twelve[12] = {0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11};

static tg_sinogram read_six(const char *cards)
{
    tg_error e = {0};
    tg_sinogram s;
    CK_OK(tg_fits_read_sinogram(put_file(cards, floats(six, 6), 24), &s, &e));
    return s;
}

/* -------------------------------------------------- reading */

static const struct {
    int bitpix;
    double scale, zero;
    double stored[6];
} pixel_types[] = {{8, 1, 0, {0, 1, 2, 127, 128, 255}},
                   {8, 1, -128, {0, 1, 2, 127, 128, 255}}, /* signed bytes */
                   {16, 1, 0, {-32768, -1, 0, 1, 2, 32767}},
                   {16, 1, 32768, {-32768, -1, 0, 1, 2, 32767}}, /* unsigned */
                   {16, 0.025, 0, {-32768, -1, 0, 1, 2, 32767}}, /* the product is above the nearest float */
                   {16, -0.25, 1000, {-32768, -1, 0, 1, 2, 32767}},
                   {32, 1, 0, {-2147483648.0, -1, 0, 1, 2, 2147483647}},
                   {32, 1, 2147483648.0, {-2147483648.0, -1, 0, 1, 2, 2147483647}},
                   {64, 1e-3, 5, {-4503599627370496.0, -1, 0, 1, 2, 4503599627370496.0}},
                   {-32, 1, 0, {-1.5, 0, 1e-38, 1e38, 3, 0.1}},
                   {-32, 0.5, -7, {-1.5, 0, 1e-30, 1e30, 3, 0.1}},
                   {-64, 1, 0, {-1.5, 0, 1e-38, 1e38, 3, 0.1}},
                   {-64, 2, 100, {-1.5, 0, 1e-30, 1e30, 3, 0.1}}};

START_TEST(pixel_type)
{
    const int bitpix = pixel_types[_i].bitpix;
    const double scale = pixel_types[_i].scale, zero = pixel_types[_i].zero;
    unsigned char bytes[48];
    char cards[1024];
    size_t n = 0;
    tg_error e = {0};
    tg_image image;
    for (int i = 0; i < 6; i++)
        n += put_stored(bytes + n, bitpix, pixel_types[_i].stored[i]);
    snprintf(cards, sizeof cards,
             "SIMPLE  =                    T\nBITPIX  = %d\nNAXIS   = 2\nNAXIS1  = 3\nNAXIS2  = 2\nBSCALE  = %.17G\n"
             "BZERO   = %.17G\nBUNIT   = 'HU'\nCDELT1  = 0.5\nCDELT2  = 0.5\n",
             bitpix, scale, zero);
    CK_OK(tg_fits_read_image(put_file(cards, bytes, n), &image, &e));
    for (int i = 0; i < 6; i++) /* float32 rounds the stored value and the sum: FITS 4.0, 4.4.2.5 */
        CK_NEAR(image.v[i], zero + scale * pixel_types[_i].stored[i], 1.2e-7, 1.2e-7 * fabs(zero), "BZERO + BSCALE v");
    if (bitpix > 0) {
        const double all = ldexp(1, bitpix), low = bitpix == 8 ? 0 : -all / 2;
        /* a float further in, 2^-23 of the value, and half as much for its rounding */
        CK_NEAR(image.least, zero + fmin(scale * low, scale * (low + all - 1)), 1.8e-7, 1e-40, "the type's least");
        CK_NEAR(image.most, zero + fmax(scale * low, scale * (low + all - 1)), 1.8e-7, 1e-40, "the type's most");
        for (int i = 0; i < 6 && bitpix < 64; i++) { /* the row's first and last are the type's ends */
            const double v = (double)image.v[i];
            ck_assert_int_eq(v > image.least && v<image.most, i> 0 && i < 5);
        }
    } else {
        ck_assert(isinf(image.least) && isinf(image.most));
    }
    tg_image_free(&image);
}
END_TEST

#define IMAGE "BUNIT   = 'HU'\nCTYPE1  = 'X'\nCTYPE2  = 'Y'\nCUNIT1  = 'mm'\nCUNIT2  = 'mm'\n"

/* A slice of another program states its thickness by one keyword. */
START_TEST(thickness_of_a_slice)
{
    static const char *const cards[] = {FLAT IMAGE "CDELT1  = 1\nCDELT2  = 1\n",
                                        FLAT IMAGE "CDELT1  = 1\nCDELT2  = 1\nZSTEP   = 5\n"};
    const float v[6] = {0};
    tg_error e = {0};
    for (int stated = 0; stated < 2; stated++) {
        tg_image image;
        CK_OK(tg_fits_read_image(put_file(cards[stated], floats(v, 6), 24), &image, &e));
        ck_assert_uint_eq(image.scan.channels, 0);
        CK_NEAR(image.scan.row_step_mm, stated ? 5 : 0, 0, 0, "ZSTEP");
        CK_NEAR(image.grid.step_mm[2], stated ? 5 : 1, 0, 0, "ZSTEP, or as thick as the pixels");
        tg_image_free(&image);
    }
}
END_TEST

START_TEST(blank_pixels)
{
    static const unsigned char bytes[] = {0, 5, 0x80, 0, 0, 7, 0, 8, 0, 9, 0, 10};
    tg_error e = {0};
    tg_image image;
    const char *cards = HEAD("16", "2") "NAXIS1  = 3\nNAXIS2  = 2\nBLANK   = -32768\n" IMAGE
                                        "CRPIX1  = 1\nCRPIX2  = 1\nCDELT1  = 1\nCDELT2  = 1\n";
    CK_OK(tg_fits_read_image(put_file(cards, bytes, sizeof bytes), &image, &e));
    ck_assert_uint_eq(e.count, 0);
    ck_assert(image.v[0] == 5 && isnan(image.v[1]) && image.v[2] == 7);
    tg_image_free(&image);
    float v[6] = {0, 1, INFINITY, 3, NAN, 5};
    cards = FLAT IMAGE "CRPIX1  = 1\nCRPIX2  = 1\nCDELT1  = 1\nCDELT2  = 1\n";
    CK_OK(tg_fits_read_image(put_file(cards, floats(v, 6), 24), &image, &e));
    ck_assert(isnan(image.v[2]) && isnan(image.v[4]) && image.v[5] == 5);
    tg_image_free(&image);
    tg_sinogram s;
    ck_assert_int_eq(tg_fits_read_sinogram(put_file(FLAT PARALLEL INTEGRAL CHANNEL VIEW, floats(v, 6), 24), &s, &e),
                     TG_INPUT);
    ck_assert(says(&e, "channel 3, view 1, row 1"));
}
END_TEST

/* Whatever the signs, the sample at a coordinate stays at that coordinate. */
START_TEST(signs)
{
    const double d1 = _i & 1 ? -0.5 : 0.5, d2 = _i & 2 ? -30 : 30, d3 = _i & 4 ? -2 : 2;
    char cards[2048];
    tg_error e = {0};
    tg_sinogram s;
    tg_image image;
    snprintf(cards, sizeof cards,
             CUBE PARALLEL INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1.75\nCRVAL1  = 0.2\nCDELT1  = %g\n"
                                    "CTYPE2  = 'VIEW'\nCUNIT2  = 'deg'\nCRPIX2  = 2\nCRVAL2  = 10\nCDELT2  = %g\n"
                                    "CTYPE3  = 'ROW'\nCUNIT3  = 'mm'\nCRPIX3  = 1.25\nCRVAL3  = 3\nCDELT3  = %g\n",
             d1, d2, d3);
    CK_OK(tg_fits_read_sinogram(put_file(cards, floats(twelve, 12), 48), &s, &e));
    ck_assert_uint_eq(e.count, 0);
    ck_assert(s.scan.channel_step == 0.5 && s.scan.row_step_mm == 2);
    for (size_t i = 0; i < 12; i++) { /* i: place in the file; at: place in memory, from the coordinates alone */
        const double channel = 0.2 + ((double)(i % 3) - 0.75) * d1, row = 3 + ((double)(i / 6) - 0.25) * d3;
        const long c = lround(channel / s.scan.channel_step + s.scan.channel_zero);
        const long r = lround(row / s.scan.row_step_mm + s.scan.row_zero);
        CK_NEAR(tg_scan_coordinate(&s.scan, (double)c), channel, 1e-14, 1e-15, "channel coordinate");
        CK_NEAR(((double)r - s.scan.row_zero) * s.scan.row_step_mm, row, 1e-14, 0, "row coordinate");
        CK_NEAR(s.v[(r * 2 + (long)(i / 3 % 2)) * 3 + c], twelve[i], 0, 0, "sample");
        CK_NEAR(s.scan.angle_rad[i / 3 % 2], (10 + ((double)(i / 3 % 2) - 1) * d2) * RAD, 1e-15, 1e-16, "angle");
    }
    tg_sinogram_free(&s);

    snprintf(cards, sizeof cards,
             CUBE "BUNIT   = 'mm-1'\nCTYPE1  = 'X'\nCUNIT1  = 'mm'\nCRPIX1  = 1.75\nCRVAL1  = 0.2\nCDELT1  = %g\n"
                  "CTYPE2  = 'Y'\nCUNIT2  = 'mm'\nCRPIX2  = 2\nCRVAL2  = 10\nCDELT2  = %g\n"
                  "CTYPE3  = 'Z'\nCUNIT3  = 'mm'\nCRPIX3  = 1.25\nCRVAL3  = 3\nCDELT3  = %g\n",
             d1, d2, d3);
    CK_OK(tg_fits_read_image(put_file(cards, floats(twelve, 12), 48), &image, &e));
    ck_assert_uint_eq(e.count, 0);
    for (size_t i = 0; i < 12; i++) {
        const double mm[3] = {0.2 + ((double)(i % 3) - 0.75) * d1, 10 + ((double)(i / 3 % 2) - 1) * d2,
                              3 + ((double)(i / 6) - 0.25) * d3};
        long at[3];
        for (int a = 0; a < 3; a++) {
            const double index = tg_grid_index(&image.grid, a, mm[a]);
            at[a] = lround(index);
            ck_assert_double_gt(image.grid.step_mm[a], 0);
            CK_NEAR(index, (double)at[a], 1e-14, 1e-14, "pixel centre");
        }
        CK_NEAR(image.v[(at[2] * 2 + at[1]) * 3 + at[0]], twelve[i], 0, 0, "pixel");
    }
    tg_image_free(&image);
}
END_TEST

#define FAN(kind) "SCANGEOM= '" kind "'\nSRCAXIS = 500\nSRCDET  = 1000\n"

START_TEST(units)
{
    static const struct {
        const char *scan, *channel;
        double step;
    } rows[] = {{PARALLEL, "CUNIT1  = 'mm'\nCDELT1  = 0.5\n", 0.5},
                {PARALLEL, "CUNIT1  = 'cm'\nCDELT1  = 0.5\n", 5},
                {PARALLEL, "CUNIT1  = 'm'\nCDELT1  = 5D-4\n", 0.5},
                {PARALLEL, "CUNIT1  = 'um'\nCDELT1  = 500\n", 0.5},
                {FAN("fan-equispaced"), "CUNIT1  = 'cm'\nCDELT1  = 0.1\n", 1},
                {FAN("fan-equiangular"), "CUNIT1  = 'deg'\nCDELT1  = 0.5\n", 0.5 * RAD},
                {FAN("fan-equiangular"), "CUNIT1  = 'rad'\nCDELT1  = 1E-3\n", 1e-3}};
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        char cards[1024];
        snprintf(cards, sizeof cards, FLAT "%s" INTEGRAL "CTYPE1  = 'CHANNEL'\nCRPIX1  = 2\n%s" VIEW, rows[i].scan,
                 rows[i].channel);
        tg_sinogram s = read_six(cards);
        CK_NEAR(s.scan.channel_step, rows[i].step, 1e-15, 0, rows[i].channel);
        tg_sinogram_free(&s);
    }
    tg_sinogram s = read_six(FLAT PARALLEL INTEGRAL CHANNEL
                             "CTYPE2  = 'VIEW'\nCUNIT2  = 'rad'\nCRPIX2  = 1\nCRVAL2  = 0.25\nCDELT2  = 0.5\n");
    CK_NEAR(s.scan.angle_rad[1], 0.75, 1e-15, 0, "radians");
    tg_sinogram_free(&s);
    tg_error e = {0};
    tg_image image;
    CK_OK(tg_fits_read_image(put_file(FLAT "BUNIT   = 'cm-1'\nCDELT1  = 0.05\nCDELT2  = 0.05\nCUNIT1  = 'cm'\n"
                                           "CUNIT2  = 'cm'\nCTYPE1  = 'x'\nCTYPE2  = 'y'\nCRPIX1  = 1\nCRPIX2  = 1\n",
                                      floats(six, 6), 24),
                             &image, &e));
    ck_assert_int_eq(image.unit, TG_PER_MM);
    CK_NEAR(image.v[5], 0.5, 1e-7, 0, "5/cm in 1/mm");
    CK_NEAR(image.grid.step_mm[0], 0.5, 1e-15, 0, "0.05 cm");
    tg_image_free(&image);
}
END_TEST

/* What is not said is assumed, with a warning; the middle of three channels is the second. */
START_TEST(assumed)
{
    tg_error e = {0};
    tg_sinogram s;
    CK_OK(tg_fits_read_sinogram(put_file(FLAT PARALLEL "CDELT1  = 2\nCDELT2  = 90\n", floats(six, 6), 24), &s, &e));
    ck_assert_uint_eq(e.count, 3); /* each axis, and SCANDATA */
    ck_assert(says(&e, "CTYPE1 CUNIT1 CRPIX1 missing") && says(&e, "taken as line integrals"));
    ck_assert_double_eq(s.scan.channel_zero, 1);
    CK_NEAR(s.scan.angle_rad[0], 0, 0, 0, "the first view");
    CK_NEAR(s.scan.angle_rad[1], 90 * RAD, 1e-15, 0, "the second view");
    tg_sinogram_free(&s);
    tg_image image;
    e = (tg_error){0};
    CK_OK(tg_fits_read_image(put_file(FLAT "BUNIT   = 'HU'\nCDELT1  = 2\nCDELT2  = 2\n", floats(six, 6), 24), &image,
                             &e));
    ck_assert_uint_eq(e.count, 2);
    ck_assert(image.grid.first_mm[0] == -2 && image.grid.first_mm[1] == -1 && image.scan.channels == 0);
    tg_image_free(&image);
}
END_TEST

static const char *put_with_extensions(const char *first, const void *data, size_t bytes, const char *second,
                                       const void *data2, size_t bytes2, const char *third, const void *data3,
                                       size_t bytes3)
{
    const char *path = scratch("made.fits");
    FILE *out = fopen(path, "wb");
    ck_assert_ptr_nonnull(out);
    put_hdu(out, first, data, bytes);
    put_hdu(out, second, data2, bytes2);
    if (third) put_hdu(out, third, data3, bytes3);
    fclose(out);
    return path;
}

#define TABLE(type, width, rows) \
    "XTENSION= 'BINTABLE'\nBITPIX  = 8\nNAXIS   = 2\nNAXIS1  = " width "\nNAXIS2  = " rows \
    "\nPCOUNT  = 0\nGCOUNT  = 1\n" \
    "TFIELDS = 1\nTTYPE1  = 'ANGLE'\nTFORM1  = '" type "'\nEXTNAME = 'ANGLES'\n"
#define FRAME(name) \
    "XTENSION= 'IMAGE'\nBITPIX  = -32\nNAXIS   = 1\nNAXIS1  = 3\nPCOUNT  = 0\nGCOUNT  = 1\nEXTNAME = '" name "'\n"

START_TEST(angle_table)
{
    static const struct {
        const char *table;
        int bitpix;
        double stored[2], rad[2];
    } rows[] = {{TABLE("1D", "8", "2") "TUNIT1  = 'deg'\n", -64, {10, 350.5}, {10 * RAD, 350.5 * RAD}},
                {TABLE("1D", "8", "2") "TUNIT1  = 'rad'\n", -64, {1, -2}, {1, -2}},
                {TABLE("1E", "4", "2"), -32, {90, 45}, {90 * RAD, 45 * RAD}},
                {TABLE("1I", "2", "2"), 16, {90, 45}, {90 * RAD, 45 * RAD}}};
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        unsigned char bytes[16];
        tg_error e = {0};
        tg_sinogram s;
        size_t n = put_stored(bytes, rows[i].bitpix, rows[i].stored[0]);
        n += put_stored(bytes + n, rows[i].bitpix, rows[i].stored[1]);
        CK_OK(tg_fits_read_sinogram(put_with_extensions(FLAT PARALLEL INTEGRAL CHANNEL
                                                        "CTYPE2  = 'VIEW'\nCUNIT2  = 'deg'\nCRPIX2  = 1\n",
                                                        floats(six, 6), 24, rows[i].table, bytes, n, NULL, NULL, 0),
                                    &s, &e));
        for (int k = 0; k < 2; k++)
            CK_NEAR(s.scan.angle_rad[k], rows[i].rad[k], 1e-15, 0, "angle of the table");
        tg_sinogram_free(&s);
    }
    static const char *const wrong[][2] = {{TABLE("1D", "8", "1"), "1 rows"},
                                           {TABLE("1D", "8", "2") "TUNIT1  = 'gon'\n", "gon"},
                                           {TABLE("2D", "16", "2"), "values"}};
    static const unsigned char zeros[32] = {0};
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        tg_error e = {0};
        tg_sinogram s;
        ck_assert_int_eq(tg_fits_read_sinogram(put_with_extensions(FLAT PARALLEL INTEGRAL CHANNEL VIEW, floats(six, 6),
                                                                   24, wrong[i][0], zeros, 32, NULL, NULL, 0),
                                               &s, &e),
                         TG_INPUT);
        ck_assert_msg(says(&e, wrong[i][1]), "%s", e.message[0].what);
    }
}
END_TEST

START_TEST(empty_primary)
{
    tg_error e = {0};
    tg_sinogram s;
    tg_fits_kind kind;
    CK_OK(tg_fits_read_sinogram(
        put_with_extensions(HEAD("8", "0") "EXTEND  = T\n", NULL, 0,
                            "XTENSION= 'IMAGE'\nBITPIX  = -32\nNAXIS   = 2\nNAXIS1  = 3\nNAXIS2  = 2\nPCOUNT  = 0\n"
                            "GCOUNT  = 1\n" PARALLEL INTEGRAL CHANNEL VIEW,
                            floats(six, 6), 24, NULL, NULL, 0),
        &s, &e));
    CK_NEAR(s.v[4], 4, 0, 0, "sample of the extension");
    CK_OK(tg_fits_what(scratch("made.fits"), &kind, &e));
    ck_assert_int_eq(kind, TG_FITS_SINOGRAM);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(counts)
{
    static const float count[6] = {110, 60, 10, 1010, 9, 10.6f}, air[3] = {1010, 510, 110}, dark[3] = {10, 10, 10};
    unsigned char a[12], d[12];
    tg_error e = {0};
    tg_sinogram s;
    memcpy(a, floats(air, 3), 12);
    memcpy(d, floats(dark, 3), 12);
    for (int flip = 0; flip < 2; flip++) {
        e = (tg_error){0};
        CK_OK(tg_fits_read_sinogram(
            put_with_extensions(flip ? FLAT PARALLEL "SCANDATA= 'count'\nCTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\n"
                                                     "CRPIX1  = 2\nCDELT1  = -1\n" VIEW
                                     : FLAT PARALLEL "SCANDATA= 'count'\n" CHANNEL VIEW,
                                floats(count, 6), 24, FRAME("AIR"), a, 12, FRAME("DARK"), d, 12),
            &s, &e));
        for (size_t i = 0; i < 6; i++) {
            const double left = fmax((double)(count[i] - dark[i % 3]), 0.5), full = (double)(air[i % 3] - dark[i % 3]);
            CK_NEAR(s.v[flip ? i / 3 * 3 + 2 - i % 3 : i], -log(left / full), 3e-7, 3e-7, "-ln(I / I0)");
        }
        ck_assert_uint_eq(e.count, 1);
        ck_assert(says(&e, "2 samples below half a photon"));
        tg_sinogram_free(&s);
    }
    const char *path = put_with_extensions(FLAT PARALLEL "SCANDATA= 'count'\n" CHANNEL VIEW, floats(count, 6), 24,
                                           FRAME("DARK"), d, 12, NULL, NULL, 0);
    ck_assert_int_eq(tg_fits_read_sinogram(path, &s, &e), TG_INPUT);
    ck_assert(says(&e, "extension AIR"));
    path = put_with_extensions(FLAT PARALLEL "SCANDATA= 'count'\n" CHANNEL VIEW, floats(count, 6), 24, FRAME("AIR"), d,
                               12, FRAME("DARK"), d, 12);
    ck_assert_int_eq(tg_fits_read_sinogram(path, &s, &e), TG_INPUT);
    ck_assert(says(&e, "AIR less DARK is 0 at channel 1"));
}
END_TEST

START_TEST(transmission)
{
    static const float dark[6] = {1, 0.5f, 0.25f, 1e-3f, 0, -0.01f}, good[6] = {1, 0.5f, 0.25f, 1e-3f, 1.25f, 1e-30f};
    tg_error e = {0};
    tg_sinogram s;
    CK_OK(tg_fits_read_sinogram(put_file(FLAT PARALLEL "SCANDATA= 'transmission'\n" CHANNEL VIEW, floats(good, 6), 24),
                                &s, &e));
    ck_assert_uint_eq(e.count, 0);
    for (int i = 0; i < 6; i++)
        CK_NEAR(s.v[i], -log((double)good[i]), 1e-7, 0, "-ln(T)");
    tg_sinogram_free(&s);
    CK_OK(tg_fits_read_sinogram(
        put_file(FLAT PARALLEL "SCANDATA= 'transmission'\nPHOTONS = 1E4\n" CHANNEL VIEW, floats(dark, 6), 24), &s, &e));
    CK_NEAR(s.v[3], -log(1e-3), 1e-7, 0, "-ln(T)");
    CK_NEAR(s.v[4], log(2e4), 1e-7, 0, "half a photon of 10000");
    CK_NEAR(s.v[5], log(2e4), 1e-7, 0, "half a photon of 10000");
    ck_assert(says(&e, "2 samples"));
    tg_sinogram_free(&s);
    ck_assert_int_eq(
        tg_fits_read_sinogram(put_file(FLAT PARALLEL "SCANDATA= 'transmission'\n" CHANNEL VIEW, floats(dark, 6), 24),
                              &s, &e),
        TG_INPUT);
    ck_assert(says(&e, "channel 2, view 2") && says(&e, "PHOTONS"));
}
END_TEST

/* -------------------------------------------------- refusals */

static const struct {
    const char *cards, *says;
} refused[] = {
    {FLAT INTEGRAL CHANNEL VIEW, "SCANGEOM is missing; write one of: parallel"},
    {FLAT "SCANGEOM= 'fan'\n" INTEGRAL CHANNEL VIEW, "SCANGEOM is 'fan'"},
    {FLAT "SCANGEOM= 'cone-equispaced'\n" INTEGRAL CHANNEL VIEW, "fan-equispaced"},
    {FLAT "SCANGEOM= 'fan-equispaced'\nSRCDET  = 5\n" INTEGRAL CHANNEL VIEW, "SRCAXIS"},
    {FLAT "SCANGEOM= 'fan-equispaced'\nSRCAXIS = 5\n" INTEGRAL CHANNEL VIEW, "SRCDET"},
    {FLAT "SCANGEOM= 'fan-equispaced'\nSRCAXIS = 5\nSRCDET  = 4\n" INTEGRAL CHANNEL VIEW, "less than SRCAXIS"},
    {FLAT "SCANGEOM= 'fan-equispaced'\nSRCAXIS = 'near'\nSRCDET  = 4\n" INTEGRAL CHANNEL VIEW,
     "SRCAXIS is not a number"},
    {FLAT FAN("fan-equiangular") INTEGRAL CHANNEL VIEW, "CUNIT1 is 'mm'"},
    {FLAT FAN("fan-equiangular") INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'deg'\nCRPIX1  = 1\nCDELT1  = 50\n" VIEW,
     "100 degrees from the axis"},
    {FLAT PARALLEL INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'deg'\nCRPIX1  = 1\nCDELT1  = 1\n" VIEW, "CUNIT1 is 'deg'"},
    {FLAT PARALLEL INTEGRAL "CTYPE1  = 'VIEW'\nCUNIT1  = 'mm'\nCRPIX1  = 1\nCDELT1  = 1\n" VIEW, "CTYPE1 is 'VIEW'"},
    {FLAT PARALLEL INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1\n" VIEW, "channel pitch in mm"},
    {FLAT PARALLEL INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1\nCDELT1  = 0\n" VIEW,
     "CDELT1 = 0 is no step"},
    {FLAT PARALLEL INTEGRAL
     "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1\nCRVAL1  = 1E300\nCDELT1  = 1E-300\n" VIEW,
     "CDELT1 = 1e-300"},
    {FLAT PARALLEL INTEGRAL "CTYPE1  = 'CHANNEL'\nCUNIT1  = 'mm'\nCRPIX1  = 1E12\nCDELT1  = 1\n" VIEW,
     "far off the axis"},
    {FLAT PARALLEL INTEGRAL CHANNEL "CTYPE2  = 'VIEW'\nCUNIT2  = 'deg'\nCRPIX2  = 1\n", "write CDELT2"},
    {FLAT PARALLEL "SCANDATA= 'log'\n" CHANNEL VIEW, "SCANDATA is 'log'"},
    {HEAD("16", "2") "NAXIS1  = 3\nNAXIS2  = 2\n" PARALLEL CHANNEL VIEW, "the data are integers"},
    {FLAT PARALLEL INTEGRAL CHANNEL VIEW "ROWSTEP = -1\n", "ROWSTEP"},
    {CUBE PARALLEL INTEGRAL CHANNEL VIEW "CTYPE3  = 'ROW'\nCUNIT3  = 'mm'\nCRPIX3  = 1\n", "CDELT3 is missing"},
    {FLAT PARALLEL INTEGRAL CHANNEL VIEW "TUBEKV  = -5\n", "TUBEKV"},
    {FLAT PARALLEL INTEGRAL CHANNEL VIEW "SEED    = 1.5\n", "SEED"},
    {HEAD("-32", "1") "NAXIS1  = 3\n" PARALLEL INTEGRAL CHANNEL, "one axis"},
    {HEAD("-32", "4") "NAXIS1  = 3\nNAXIS2  = 2\nNAXIS3  = 1\nNAXIS4  = 1\n" PARALLEL, "4 axes"},
    {HEAD("-32", "2") "NAXIS1  = 3\nNAXIS2  = 0\n" PARALLEL, "NAXIS2 = 0"},
    {HEAD("-32", "2") "NAXIS1  = 1048577\nNAXIS2  = 2\n" PARALLEL, "outside 1 to 1048576"},
    {HEAD("-64", "3") "NAXIS1  = 1048576\nNAXIS2  = 1048576\nNAXIS3  = 1048576\n" PARALLEL, "cut short"},
    {HEAD("-32", "2") "NAXIS1  = 9223372036854775807\nNAXIS2  = 9223372036854775807\n" PARALLEL, ""},
    {HEAD("-32", "2") "NAXIS1  = -3\nNAXIS2  = 2\n" PARALLEL, ""},
    {HEAD("-31", "2") "NAXIS1  = 3\nNAXIS2  = 2\n" PARALLEL, ""},
    {HEAD("8", "0"), "holds no image"},
    {HEAD("8", "999"), ""},
};

START_TEST(refusal)
{
    tg_error e = {0};
    tg_sinogram s;
    ck_assert_int_eq(tg_fits_read_sinogram(put_file(refused[_i].cards, floats(six, 6), 24), &s, &e), TG_INPUT);
    ck_assert_ptr_null(s.v);
    const tg_message *last = &e.message[e.count - 1];
    ck_assert(!last->warning && !strcmp(last->file, scratch("made.fits")) && !strchr(last->what, '\n'));
    ck_assert_msg(strstr(last->what, refused[_i].says), "'%s' does not say '%s'", last->what, refused[_i].says);
}
END_TEST

static const struct {
    const char *cards, *says;
} refused_images[] = {
    {FLAT "CDELT1  = 1\nCDELT2  = 1\n", "BUNIT is missing; write 'HU' or 'mm-1'"},
    {FLAT "BUNIT   = 'Jy'\nCDELT1  = 1\nCDELT2  = 1\n", "BUNIT is 'Jy'"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\n", "CDELT2 is missing; write the pixel size in mm"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nCUNIT1  = 'deg'\n", "CUNIT1 is 'deg'"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nCTYPE1  = 'Y'\n", "CTYPE1 is 'Y'"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nPC1_2   = 0.5\n", "PC1_2 turns the axes"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nSCANGEOM= 'parallel'\n", "CHANNELS is missing"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nSCANGEOM= 'parallel'\nCHANNELS= 1.5\nCHANSTEP= 1\nCHANAXIS= 1\n"
          "VIEWS   = 1\nVIEWFRST= 0\nVIEWSTEP= 1\nROWS    = 1\nROWSTEP = 0\nROWMID  = 1\n",
     "whole numbers"},
    {FLAT "BUNIT   = 'HU'\nCDELT1  = 1\nCDELT2  = 1\nZSTEP   = 0\n", "ZSTEP"},
    {HEAD("-32", "1") "NAXIS1  = 6\nBUNIT   = 'HU'\nCDELT1  = 1\n", "one axis"},
};

START_TEST(image_refusal)
{
    tg_error e = {0};
    tg_image image;
    ck_assert_int_eq(tg_fits_read_image(put_file(refused_images[_i].cards, floats(six, 6), 24), &image, &e), TG_INPUT);
    ck_assert_ptr_null(image.v);
    const char *what = e.message[e.count - 1].what;
    ck_assert_msg(strstr(what, refused_images[_i].says), "'%s' does not say '%s'", what, refused_images[_i].says);
}
END_TEST

START_TEST(not_fits)
{
    static const struct {
        const char *bytes, *says;
        size_t n;
    } rows[] = {{"", "is not a FITS file", 0},
                {"SIMPLE", "is not a FITS file", 6},
                {"\x1f\x8b\x08 gzip of something", "unpack it first", 20},
                {"SIMPLE  =                    T", "", 30}};
    tg_error e;
    tg_fits_kind kind;
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        FILE *out = fopen(scratch("x.fits"), "wb");
        fwrite(rows[i].bytes, 1, rows[i].n, out);
        fclose(out);
        e = (tg_error){0};
        ck_assert_int_eq(tg_fits_what(scratch("x.fits"), &kind, &e), TG_INPUT);
        ck_assert_uint_eq(e.count, 1);
        ck_assert_msg(strstr(e.message[0].what, rows[i].says), "%s", e.message[0].what);
    }
    e = (tg_error){0};
    ck_assert_int_eq(tg_fits_what(scratch("none.fits"), &kind, &e), TG_INPUT);
    ck_assert(says(&e, "No such file"));
    ck_assert_int_eq(tg_fits_what(scratch_folder, &kind, &e), TG_INPUT);
    ck_assert(says(&e, "is not a file"));
    ck_assert(!tg_fits_magic(scratch_folder));
}
END_TEST

START_TEST(kinds)
{
    static const struct {
        const char *cards;
        tg_fits_kind kind;
    } rows[] = {{FLAT CHANNEL VIEW, TG_FITS_SINOGRAM},
                {FLAT PARALLEL, TG_FITS_SINOGRAM},
                {FLAT PARALLEL "CTYPE1  = 'X'\n", TG_FITS_IMAGE},
                {FLAT, TG_FITS_IMAGE},
                {CUBE, TG_FITS_IMAGE},
                {HEAD("-32", "1") "NAXIS1  = 6\n", TG_FITS_OTHER}};
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        tg_error e = {0};
        tg_fits_kind kind;
        CK_OK(tg_fits_what(put_file(rows[i].cards, floats(twelve, 12), 48), &kind, &e));
        ck_assert_int_eq(kind, rows[i].kind);
    }
}
END_TEST

START_TEST(measured_scan)
{
    const char *path = "../shared/data/acrylic-disc.fits"; /* not part of the repository: nothing to do without it */
    tg_error e = {0};
    tg_sinogram s;
    if (access(path, R_OK)) return;
    CK_OK(tg_fits_read_sinogram(path, &s, &e));
    ck_assert_uint_eq(e.count, 0);
    ck_assert(s.scan.geometry == TG_FAN_EQUISPACED && s.scan.channels == 560 && s.scan.views == 720);
    CK_NEAR(s.scan.channel_step, 0.2, 1e-15, 0, "its description");
    CK_NEAR(s.scan.channel_zero, 279.5, 1e-15, 0, "its description: CRPIX1 280.5, reversed");
    CK_NEAR(s.scan.angle_rad[1], 180.5 * RAD, 1e-15, 0, "its description");
    tg_sinogram_free(&s);
}
END_TEST

Suite *suite_fits(void);
Suite *suite_fits(void)
{
    SUITE_BEGIN("fits", 30);
    tcase_add_checked_fixture(tcase, scratch_begin, scratch_end);
    tcase_add_loop_test(tcase, pixel_type, 0, sizeof pixel_types / sizeof *pixel_types);
    tcase_add_test(tcase, blank_pixels);
    tcase_add_test(tcase, thickness_of_a_slice);
    tcase_add_loop_test(tcase, signs, 0, 8);
    tcase_add_test(tcase, units);
    tcase_add_test(tcase, assumed);
    tcase_add_test(tcase, angle_table);
    tcase_add_test(tcase, empty_primary);
    tcase_add_test(tcase, counts);
    tcase_add_test(tcase, transmission);
    tcase_add_loop_test(tcase, refusal, 0, sizeof refused / sizeof *refused);
    tcase_add_loop_test(tcase, image_refusal, 0, sizeof refused_images / sizeof *refused_images);
    tcase_add_test(tcase, not_fits);
    tcase_add_test(tcase, kinds);
    tcase_add_test(tcase, measured_scan);
    return suite;
}
