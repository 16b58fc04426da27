#ifndef TG_FITS_H
#define TG_FITS_H
/** FITS 4.0 files: sinograms and images as the README describes them. fits.c is the only file that knows cfitsio, which
 *  keeps state of its own: one thread at a time may call these. */
#include "io/image.h"
#include "io/input.h"
#include "io/sinogram.h"

typedef enum { TG_FITS_SINOGRAM, TG_FITS_IMAGE, TG_FITS_OTHER } tg_fits_kind;

/** What a file holds: CTYPE1 CHANNEL or the keyword SCANGEOM says sinogram, two or three axes otherwise say image. */
tg_code tg_fits_what(const char *path, tg_fits_kind *kind, tg_error *e);

/** Read a sinogram: any BITPIX with BSCALE and BZERO, first image HDU, 2-D or stack, CDELT of either sign, regular
 *  or irregular angles. Everything comes out normalised to scan.h. SCANDATA 'transmission' and 'count' (with AIR, DARK)
 *  become line integrals p = -ln(I / I0), less than half a photon taken as half a photon, with a warning.
 *  @return TG_OK (perhaps with warnings), TG_INPUT, TG_MACHINE; out is released already on failure */
tg_code tg_fits_read_sinogram(const char *path, tg_sinogram *out, tg_error *e);
tg_code tg_fits_write_sinogram(const char *path, const tg_sinogram *s, const tg_provenance *made, tg_error *e);

/** Read an image: BUNIT HU or mm-1, axes x, y[, z] of either sign of CDELT (flipped to step > 0). Without CTYPE or
 *  CUNIT axes are taken as mm, centred where CRPIX is absent, with a warning.
 *  @return as above */
tg_code tg_fits_read_image(const char *path, tg_image *out, tg_error *e);
tg_code tg_fits_write_image(const char *path, const tg_image *image, const tg_provenance *made, tg_error *e);

/** DATASUM of the first image HDU, computed from the file, as decimal text. @param text  {16} */
tg_code tg_fits_datasum(const char *path, char text[16], tg_error *e);

/** Does the file start as FITS does? */
bool tg_fits_magic(const char *path);

#endif
