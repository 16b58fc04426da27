#include "io/png.h"

#include "io/memory.h"
#include "io/output.h"
#include "io/version.h"

#include <math.h>
#include <png.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

typedef struct {
    const tg_image *image;
    const float *slice; /* {ny, nx}, row 0 at the bottom */
    const tg_window *window;
    size_t nx, ny;
    int bytes;            /* of a pixel: 1 or 2 grey, 3 RGB */
    unsigned char *pixel; /* {ny, nx, bytes}, row 0 at the top */
} picture;

static unsigned char *at(const picture *p, size_t x, size_t y)
{
    return p->pixel + ((p->ny - 1 - y) * p->nx + x) * (size_t)p->bytes;
}

/* The window's share of a value, 0 to 1; what has no value is black. */
static double grey(const tg_window *w, double v)
{
    const double share = (v - w->level) / w->width + 0.5;
    return share > 0 ? fmin(share, 1) : 0;
}

static void fill(const picture *p)
{
    const double most = p->bytes == 2 ? UINT16_MAX : UINT8_MAX;
    for (size_t y = 0; y < p->ny; y++)
        for (size_t x = 0; x < p->nx; x++) {
            const unsigned v = (unsigned)lround(most * grey(p->window, (double)p->slice[y * p->nx + x]));
            unsigned char *to = at(p, x, y);
            if (p->bytes == 2) { /* big-endian */
                to[0] = (unsigned char)(v >> 8);
                to[1] = (unsigned char)(v & 0xff);
            } else {
                memset(to, (int)v, (size_t)p->bytes);
            }
        }
}

/* Distance from a region's outline [mm], negative inside it. */
static double distance_mm(const tg_region *r, double x_mm, double y_mm)
{
    const double x = x_mm - r->centre_mm[0], y = y_mm - r->centre_mm[1];
    if (r->outline == TG_BOX) {
        const double c = cos(r->turn_rad), s = sin(r->turn_rad);
        return fmax(fabs(c * x + s * y) - r->half_mm[0], fabs(c * y - s * x) - r->half_mm[1]);
    }
    const double d = hypot(x, y);
    return r->outline == TG_RING ? fmax(d - r->outer_mm, r->inner_mm - d) : d - r->outer_mm;
}

/* One line of the outline: its middle so many pixels outside the region, one pixel wide, edges smoothed. */
static void stroke(unsigned char *to, double pixels, const unsigned char colour[3])
{
    const double share = fmin(fmax(1 - fabs(pixels), 0), 1);
    for (int i = 0; i < 3; i++)
        to[i] = (unsigned char)lround(to[i] + share * (colour[i] - to[i]));
}

/* A light line in a colour and a dark one around it: they read on any background, and without colour. Both run outside
 * the region, whose pixels stay as they are. */
static void draw(const picture *p, const tg_region *r)
{
    static const unsigned char dark[3] = {24, 24, 40}, light[3] = {255, 196, 64};
    enum { AROUND = 4 }; /* pixels that the lines may reach beyond the region */
    const tg_grid *g = &p->image->grid;
    const double step = fmin(g->step_mm[0], g->step_mm[1]);
    tg_region wide = *r;
    const double more = AROUND * fmax(g->step_mm[0], g->step_mm[1]);
    size_t x0, x1, y0, y1;
    wide.outer_mm += more;
    wide.half_mm[0] += more;
    wide.half_mm[1] += more;
    tg_region_bounds(&wide, g, &x0, &x1, &y0, &y1);
    for (size_t y = y0; y < y1; y++)
        for (size_t x = x0; x < x1; x++) {
            const double d = distance_mm(r, tg_grid_mm(g, 0, (double)x), tg_grid_mm(g, 1, (double)y)) / step;
            if (d <= 0) continue;
            stroke(at(p, x, y), d - 2, dark);
            stroke(at(p, x, y), d - 1, light);
        }
}

/* What libpng has written so far. */
typedef struct {
    unsigned char *bytes;
    size_t n, room;
} buffer;

static void append(png_structp png, png_bytep bytes, size_t n)
{
    buffer *b = png_get_io_ptr(png);
    if (n > b->room - b->n) {
        const size_t room = 2 * (b->room + n);
        unsigned char *grown = tg_alloc(room, 1);
        if (!grown) png_error(png, "no memory");
        if (b->n) memcpy(grown, b->bytes, b->n);
        tg_free(b->bytes);
        b->bytes = grown;
        b->room = room;
    }
    memcpy(b->bytes + b->n, bytes, n);
    b->n += n;
}

static void flush(png_structp png)
{
    (void)png;
}

/* libpng would print. */
static void fail(png_structp png, png_const_charp message)
{
    (void)message;
    png_longjmp(png, 1);
}

static void hush(png_structp png, png_const_charp message)
{
    (void)png;
    (void)message;
}

static void put_chunks(png_structp png, png_infop info, const picture *p)
{
    const tg_grid *g = &p->image->grid;
    char software[] = TG_PROGRAM " " TG_VERSION, window[96], pixel[64];
    char keys[3][16] = {"Software", "Window", "Pixel size"};
    snprintf(window, sizeof window, "level %.9g, width %.9g %s", p->window->level, p->window->width,
             tg_unit_text(p->image->unit));
    snprintf(pixel, sizeof pixel, "%.9g x %.9g mm", g->step_mm[0], g->step_mm[1]);
    png_text text[3] = {{.compression = PNG_TEXT_COMPRESSION_NONE, .key = keys[0], .text = software},
                        {.compression = PNG_TEXT_COMPRESSION_NONE, .key = keys[1], .text = window},
                        {.compression = PNG_TEXT_COMPRESSION_NONE, .key = keys[2], .text = pixel}};
    png_set_IHDR(png, info, (png_uint_32)p->nx, (png_uint_32)p->ny, p->bytes == 2 ? 16 : 8,
                 p->bytes == 3 ? PNG_COLOR_TYPE_RGB : PNG_COLOR_TYPE_GRAY, PNG_INTERLACE_NONE,
                 PNG_COMPRESSION_TYPE_DEFAULT, PNG_FILTER_TYPE_DEFAULT);
    png_set_text(png, info, text, 3);
    const double per_metre[2] = {rint(1000 / g->step_mm[0]), rint(1000 / g->step_mm[1])};
    if (fmax(per_metre[0], per_metre[1]) <= INT32_MAX)
        png_set_pHYs(png, info, (png_uint_32)per_metre[0], (png_uint_32)per_metre[1], PNG_RESOLUTION_METER);
}

/* libpng leaves by longjmp: nothing here but its own objects and the buffer behind a pointer. */
static bool encode(const picture *p, buffer *b)
{
    png_structp png = png_create_write_struct(PNG_LIBPNG_VER_STRING, NULL, fail, hush);
    png_infop info = png ? png_create_info_struct(png) : NULL;
    if (!info || setjmp(png_jmpbuf(png))) {
        png_destroy_write_struct(&png, &info);
        return false;
    }
    png_set_write_fn(png, b, append, flush);
    put_chunks(png, info, p);
    png_write_info(png, info);
    for (size_t y = 0; y < p->ny; y++)
        png_write_row(png, p->pixel + y * p->nx * (size_t)p->bytes);
    png_write_end(png, info);
    png_destroy_write_struct(&png, &info);
    return true;
}

tg_code tg_png_encode(const tg_image *image, size_t slice, const tg_window *w, unsigned char **bytes, size_t *n,
                      tg_error *e)
{
    tg_code code = TG_OK;
    const tg_grid *g = &image->grid;
    buffer b = {0};
    picture p = {image, image->v, w, g->n[0], g->n[1], w->region ? 3 : w->bits / 8, NULL};
    if (slice >= g->n[2]) TG_TRY(tg_fail(e, TG_USAGE, NULL, 0, "slice %zu of %zu", slice + 1, g->n[2]));
    if (!(w->width > 0) || !isfinite(w->width) || !isfinite(w->level))
        TG_TRY(tg_fail(e, TG_USAGE, NULL, 0, "the window needs a level and a width greater than 0"));
    TG_TRY(TG_NEW(p.pixel, tg_grid_slice(g) * (size_t)p.bytes, e));
    p.slice += slice * tg_grid_slice(g);
    fill(&p);
    for (size_t i = 0; i < (w->region ? w->n_regions : 0); i++)
        draw(&p, &w->region[i]);
    if (!encode(&p, &b)) TG_TRY(tg_no_memory(e, p.nx, p.ny));
    *bytes = b.bytes;
    *n = b.n;
    b.bytes = NULL;
done:
    tg_free(b.bytes);
    tg_free(p.pixel);
    return code;
}

tg_code tg_png_write(const char *path, const tg_image *image, size_t slice, const tg_window *w, tg_error *e)
{
    unsigned char *bytes;
    size_t n;
    tg_code code = tg_png_encode(image, slice, w, &bytes, &n, e);
    if (code != TG_OK) return code;
    code = tg_output_write(path, bytes, n, e);
    tg_free(bytes);
    return code;
}
