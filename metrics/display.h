#ifndef TG_DISPLAY_H
#define TG_DISPLAY_H
#include "io/png.h"

/** The window in which an image is shown when nobody asks for another: in HU 400 wide around the median of the field's
 * inner half, which is the body; in 1/mm all but the extreme half per cent of the values. 8 bits, no regions. */
tg_code tg_display_window(const tg_image *image, size_t slice, tg_window *w, tg_error *e);

#endif
