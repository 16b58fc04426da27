/* Pictures, read back by a decoder of their own (ISO 15948: chunks, CRC-32, zlib, filters). */
#include "io/memory.h"
#include "io/png.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <stdint.h>
#include <zlib.h>

typedef struct {
    size_t nx, ny, bytes; /* of a pixel */
    int depth, colour;
    uint32_t per_metre[2];
    char text[512]; /* "key=value\n" of the text chunks */
    unsigned char *pixel;
} picture;

static uint32_t word(const unsigned char *p)
{
    return (uint32_t)p[0] << 24 | (uint32_t)p[1] << 16 | (uint32_t)p[2] << 8 | p[3];
}

static int paeth(int a, int b, int c)
{
    const int pa = abs(b - c), pb = abs(a - c), pc = abs(a + b - 2 * c);
    return pa <= pb && pa <= pc ? a : pb <= pc ? b : c;
}

/* Undo the filter of each row, in place; answers {ny, row} bytes. */
static unsigned char *unfilter(const unsigned char *raw, size_t ny, size_t row, size_t pixel)
{
    unsigned char *out = calloc(ny, row);
    for (size_t y = 0; y < ny; y++) {
        const unsigned char *from = raw + y * (row + 1);
        for (size_t x = 0; x < row; x++) {
            const int a = x >= pixel ? out[y * row + x - pixel] : 0, b = y ? out[(y - 1) * row + x] : 0;
            const int c = x >= pixel && y ? out[(y - 1) * row + x - pixel] : 0;
            const int guess[] = {0, a, b, (a + b) / 2, paeth(a, b, c)};
            ck_assert_int_le(from[0], 4);
            out[y * row + x] = (unsigned char)(from[1 + x] + guess[from[0]]);
        }
    }
    return out;
}

static picture decode(const unsigned char *bytes, size_t n)
{
    static const unsigned char signature[] = {0x89, 'P', 'N', 'G', '\r', '\n', 0x1a, '\n'};
    picture p = {0};
    unsigned char *packed = malloc(n);
    size_t n_packed = 0, at = 8;
    ck_assert_mem_eq(bytes, signature, 8);
    for (bool end = false; !end;) {
        const size_t length = word(bytes + at);
        const unsigned char *type = bytes + at + 4, *data = bytes + at + 8;
        ck_assert_uint_le(at + 12 + length, n);
        ck_assert_uint_eq(crc32(0, type, (uInt)(4 + length)), word(data + length));
        if (!memcmp(type, "IHDR", 4)) {
            p.nx = word(data);
            p.ny = word(data + 4);
            p.depth = data[8];
            p.colour = data[9];
            p.bytes = (size_t)p.depth / 8 * (p.colour == 2 ? 3 : 1);
        } else if (!memcmp(type, "pHYs", 4)) {
            p.per_metre[0] = word(data);
            p.per_metre[1] = word(data + 4);
        } else if (!memcmp(type, "tEXt", 4)) {
            const size_t used = strlen(p.text), key = strlen((const char *)data);
            snprintf(p.text + used, sizeof p.text - used, "%s=%.*s\n", (const char *)data, (int)(length - key - 1),
                     (const char *)data + key + 1);
        } else if (!memcmp(type, "IDAT", 4)) {
            memcpy(packed + n_packed, data, length);
            n_packed += length;
        }
        end = !memcmp(type, "IEND", 4);
        at += 12 + length;
    }
    ck_assert_uint_eq(at, n);
    const size_t row = p.nx * p.bytes;
    uLongf size = p.ny * (row + 1);
    unsigned char *raw = malloc(size);
    ck_assert_int_eq(uncompress(raw, &size, packed, n_packed), Z_OK);
    ck_assert_uint_eq(size, p.ny * (row + 1));
    p.pixel = unfilter(raw, p.ny, row, p.bytes);
    free(raw);
    free(packed);
    return p;
}

static tg_image ramp(void)
{
    tg_error e = {0};
    tg_image image;
    const tg_grid g = {{5, 4, 2}, {0.5, 0.25, 1}, {-1, -1, 0}};
    CK_OK(tg_image_create(&g, TG_HU, &image, &e));
    for (size_t i = 0; i < tg_grid_samples(&g); i++)
        image.v[i] = (float)i * 3 - 20;
    image.v[2] = NAN;
    return image;
}

static picture encode(const tg_image *image, size_t slice, const tg_window *w)
{
    tg_error e = {0};
    unsigned char *bytes = NULL;
    size_t n = 0;
    CK_OK(tg_png_encode(image, slice, w, &bytes, &n, &e));
    const picture p = decode(bytes, n);
    tg_free(bytes);
    return p;
}

/* Every pixel by the window's formula, the last row of the image first. */
START_TEST(greys)
{
    const tg_window w = {.level = 4, .width = 30, .bits = _i ? 16 : 8};
    const double most = _i ? 65535 : 255;
    tg_image image = ramp();
    for (size_t z = 0; z < 2; z++) {
        const picture p = encode(&image, z, &w);
        ck_assert(p.nx == 5 && p.ny == 4 && p.depth == w.bits && p.colour == 0);
        for (size_t i = 0; i < 20; i++) {
            const double v = (double)image.v[20 * z + i], share = fmin(fmax((v + 11) / 30, 0), 1);
            const unsigned char *got = p.pixel + ((3 - i / 5) * 5 + i % 5) * p.bytes;
            const double grey = _i ? got[0] * 256 + got[1] : got[0];
            if (isnan(v))
                CK_NEAR(grey, 0, 0, 0, "no value: black");
            else
                CK_NEAR(grey, most * share, 0, 0.5 + 1e-9 * most, "level, width"); /* rounded to a grey */
        }
        free(p.pixel);
    }
    tg_image_free(&image);
}
END_TEST

START_TEST(chunks)
{
    const tg_window w = {.level = 40, .width = 400, .bits = 8};
    tg_image image = ramp();
    const picture p = encode(&image, 0, &w);
    ck_assert_str_eq(p.text, "Software=tomogauge 0.1.0\nWindow=level 40, width 400 HU\nPixel size=0.5 x 0.25 mm\n");
    ck_assert(p.per_metre[0] == 2000 && p.per_metre[1] == 4000);
    free(p.pixel);
    tg_image_free(&image);
}
END_TEST

/* Outlines run around a region within three pixels of its rim, change no pixel inside or far off, and hold both a light
 * and a dark line, on black, grey and white alike. */
START_TEST(outlines)
{
    tg_error e = {0};
    const tg_region regions[] = {{.outline = TG_DISC, .centre_mm = {-6, 5}, .outer_mm = 4},
                                 {.outline = TG_RING, .centre_mm = {7, 7}, .inner_mm = 4, .outer_mm = 7},
                                 {.outline = TG_BOX, .centre_mm = {0, -9}, .half_mm = {8, 3}, .turn_rad = 0.4}};
    const double centre[2] = {0, 0};
    const tg_grid g = tg_grid_square(120, 40, centre);
    const double step = g.step_mm[0];
    static const double backgrounds[] = {-1, 0, 1};
    for (size_t b = 0; b < 3; b++) {
        const tg_window w = {.level = 0, .width = 2, .bits = 8, .region = regions, .n_regions = 3};
        const int ground = (int)lround(255 * (backgrounds[b] / 2 + 0.5));
        tg_image image;
        CK_OK(tg_image_create(&g, TG_HU, &image, &e));
        for (size_t i = 0; i < tg_grid_samples(&g); i++)
            image.v[i] = (float)backgrounds[b];
        const picture p = encode(&image, 0, &w);
        ck_assert(p.depth == 8 && p.colour == 2);
        for (int r = 0; r < 3; r++) {
            int least = 255, most = 0;
            tg_region wide = regions[r], narrow = regions[r];
            wide.outer_mm += 3 * step, wide.inner_mm -= 3 * step;
            wide.half_mm[0] += 3 * step, wide.half_mm[1] += 3 * step;
            for (size_t i = 0; i < tg_grid_samples(&g); i++) {
                const double x = tg_grid_mm(&g, 0, (double)(i % 120)), y = tg_grid_mm(&g, 1, (double)(i / 120));
                const unsigned char *rgb = p.pixel + ((119 - i / 120) * 120 + i % 120) * 3;
                const bool plain = rgb[0] == ground && rgb[1] == ground && rgb[2] == ground;
                const int luminance = (2126 * rgb[0] + 7152 * rgb[1] + 722 * rgb[2]) / 10000; /* ITU-R BT.709 */
                if (tg_region_holds(&narrow, x, y))
                    ck_assert_msg(plain, "pixel inside region %d", r);
                else if (tg_region_holds(&wide, x, y)) {
                    least = luminance < least ? luminance : least;
                    most = luminance > most ? luminance : most;
                } else {
                    bool near = false;
                    for (int k = 0; k < 3; k++) {
                        tg_region other = regions[k];
                        other.outer_mm += 3 * step, other.inner_mm -= 3 * step;
                        other.half_mm[0] += 3 * step, other.half_mm[1] += 3 * step;
                        near = near || tg_region_holds(&other, x, y);
                    }
                    ck_assert_msg(plain || near, "pixel off the regions");
                }
            }
            ck_assert_msg(most - least > 100, "region %d: luminance %d to %d", r, least, most);
        }
        free(p.pixel);
        tg_image_free(&image);
    }
}
END_TEST

/* A region half off the image draws what is on it. */
START_TEST(off_the_image)
{
    const tg_region r[] = {{.outline = TG_DISC, .centre_mm = {-1, -1}, .outer_mm = 1},
                           {.outline = TG_DISC, .centre_mm = {100, 100}, .outer_mm = 1},
                           {.outline = TG_BOX, .centre_mm = {-100, 0}, .half_mm = {1, 1}}};
    const tg_window w = {.level = 0, .width = 2, .bits = 8, .region = r, .n_regions = 3};
    tg_image image = ramp();
    const picture p = encode(&image, 0, &w);
    ck_assert_uint_eq(p.bytes, 3);
    free(p.pixel);
    tg_image_free(&image);
}
END_TEST

START_TEST(file)
{
    tg_error e = {0};
    const tg_window w = {.level = 0, .width = 10, .bits = 16};
    tg_image image = ramp();
    unsigned char *bytes = NULL;
    char *text = NULL;
    size_t n[2];
    CK_OK(tg_png_encode(&image, 1, &w, &bytes, &n[0], &e));
    CK_OK(tg_png_write(scratch("a.png"), &image, 1, &w, &e));
    FILE *in = fopen(scratch("a.png"), "rb");
    text = malloc(n[0] + 1);
    n[1] = fread(text, 1, n[0] + 1, in);
    fclose(in);
    ck_assert_uint_eq(n[0], n[1]);
    ck_assert_mem_eq(bytes, text, n[0]);
    free(text);
    tg_free(bytes);
    tg_image_free(&image);
}
END_TEST

START_TEST(refused)
{
    tg_image image = ramp();
    unsigned char *bytes = NULL;
    size_t n;
    const tg_window bad[] = {
        {.width = 0, .bits = 8}, {.width = NAN, .bits = 8}, {.level = INFINITY, .width = 1, .bits = 8}};
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        tg_error e = {0};
        ck_assert_int_eq(tg_png_encode(&image, 0, &bad[i], &bytes, &n, &e), TG_USAGE);
        ck_assert_ptr_nonnull(strstr(e.message[0].what, "width greater than 0"));
    }
    tg_error e = {0};
    const tg_window w = {.width = 1, .bits = 8};
    ck_assert_int_eq(tg_png_encode(&image, 2, &w, &bytes, &n, &e), TG_USAGE);
    ck_assert_str_eq(e.message[0].what, "slice 3 of 2");
    tg_image_free(&image);
}
END_TEST

Suite *suite_png(void);
Suite *suite_png(void)
{
    SUITE_BEGIN("png", 10);
    tcase_add_checked_fixture(tcase, scratch_begin, scratch_end);
    tcase_add_loop_test(tcase, greys, 0, 2);
    tcase_add_test(tcase, chunks);
    tcase_add_test(tcase, outlines);
    tcase_add_test(tcase, off_the_image);
    tcase_add_test(tcase, file);
    tcase_add_test(tcase, refused);
    return suite;
}
