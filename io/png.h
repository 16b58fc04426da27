#ifndef TG_PNG_H
#define TG_PNG_H
#include "io/image.h"
#include "io/region.h"

typedef struct {
    double level, width;     /* the grey range is level +- width / 2 */
    int bits;                /* 8 or 16 */
    const tg_region *region; /* {n_regions} outlines drawn over the image (8 bit RGB); NULL: none */
    size_t n_regions;
} tg_window;

/** Write one slice as PNG, flipped so that y points up. @param slice  index along z
 *  The window, the pixel size and the program stand in its text chunks. */
tg_code tg_png_write(const char *path, const tg_image *image, size_t slice, const tg_window *w, tg_error *e);

/** The same into memory, for a page. @param bytes  set on success, tg_free */
tg_code tg_png_encode(const tg_image *image, size_t slice, const tg_window *w, unsigned char **bytes, size_t *n,
                      tg_error *e);

#endif
