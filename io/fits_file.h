#ifndef TG_FITS_FILE_H
#define TG_FITS_FILE_H
/** What fits.c lends to the two contracts, fits_scan.c and fits_image.c; nobody else includes this. */
#include "io/fits.h"
#include "io/output.h"

enum { TG_FITS_WORD = 72, TG_FITS_LONG = 4096 }; /* bytes of a one-card text, and of the longest that is read */

/** A file open at one of its HDUs. */
typedef struct {
    void *handle;     /* cfitsio's */
    const char *path; /* the user's, not owned */
    tg_error *e;      /* where all calls report, not owned */
    int bitpix, axes; /* of the image HDU it stands at */
    size_t n[3];      /* samples along each axis, 1 beyond the last */
    int status;       /* of writing: cfitsio's; calls after a failure do nothing */
    tg_code code;     /* of writing: a failure that was reported already */
    tg_output output; /* of writing */
} tg_fits;

/** Open for reading at the first image HDU that has axes: two or three of 1..2^20 samples, all of them in the file.
 *  On failure nothing is left open. */
tg_code tg_fits_open(tg_fits *f, const char *path, tg_error *e);

/** Go to an extension by its name. @param found  false: there is none, and the file stands where it stood */
tg_code tg_fits_extension(tg_fits *f, const char *name, bool *found);

/** A keyword's number; `v` keeps its value where the keyword is absent. TG_INPUT: not a finite number. */
tg_code tg_fits_number(tg_fits *f, const char *key, double *v);

/** A keyword's text; "" where it is absent. TG_INPUT: not a text, or longer than size - 1. */
tg_code tg_fits_text(tg_fits *f, const char *key, char *text, size_t size);

/** Fails with what is wrong where the first axis (CTYPE1) is that of another kind of file. */
tg_code tg_fits_refuse(tg_fits *f, const char *axis, const char *wrong);

/** All samples of the image HDU with BSCALE and BZERO applied, after its DATASUM has been checked; NaN for BLANK.
 *  @param v  {n[2], n[1], n[0]} */
tg_code tg_fits_samples(tg_fits *f, float *v);

/** A column of the table extension it stands at. @param v  {rows}  @param unit  as in TUNIT, "" where absent */
tg_code tg_fits_column(tg_fits *f, const char *name, size_t rows, double *v, char unit[TG_FITS_WORD]);

/** Close a file that was read, or give up one that was to be written. Safe on a zeroed struct. */
void tg_fits_close(tg_fits *f);

/** Begin a file with float samples beside its final name, and say who writes it. @param axes  2 or 3 */
tg_code tg_fits_create(tg_fits *f, const char *path, int axes, const size_t n[3], tg_error *e);

void tg_fits_put_number(tg_fits *f, const char *key, double v, const char *comment);    /* read back: the same bits */
void tg_fits_put_text(tg_fits *f, const char *key, const char *v, const char *comment); /* any length; NULL: nothing */
void tg_fits_put_samples(tg_fits *f, const float *v);
void tg_fits_put_made(tg_fits *f, const tg_provenance *made); /* NULL: nothing */

/** Close the HDU under way and add a table with one column of doubles. */
void tg_fits_put_column(tg_fits *f, const char *extension, const char *name, const char *unit, size_t rows,
                        const double *v);

/** Close and name the file; on failure nothing is left of it. */
tg_code tg_fits_finish(tg_fits *f);

/** A unit and its size in the table's first unit; a NULL name ends a table. */
typedef struct {
    const char *name;
    double size;
} tg_fits_unit;
extern const tg_fits_unit tg_fits_lengths[], tg_fits_angles[];         /* in mm; in degrees */
double tg_fits_unit_size(const tg_fits_unit *units, const char *name); /* NaN: not in the table */

/** WCS of one axis: coordinate = value + (index - pixel) step, index counted from 1. */
typedef struct {
    const char *type;          /* "CHANNEL" */
    const tg_fits_unit *units; /* the first is written, and assumed where CUNIT is absent */
    const char *step_is;       /* "channel pitch"; NULL: CDELT may be absent */
    double pixel, value, step; /* CRPIX, CRVAL, CDELT */
} tg_fits_axis;

/** Read an axis and convert its unit. Absent CTYPE, CUNIT and CRPIX are assumed, with a warning.
 *  @param axis  type, units and step_is are given, and the pixel and the step to assume */
tg_code tg_fits_axis_of(tg_fits *f, int number, tg_fits_axis *axis);
void tg_fits_put_axis(tg_fits *f, int number, const tg_fits_axis *axis);

/** CRPIX of the middle of n samples. */
double tg_fits_middle(size_t n);

/** 0-based fractional index at which an axis is 0. */
double tg_fits_axis_zero(const tg_fits_axis *axis);

/** What sinograms and images share of a scan (fits_scan.c): SCANGEOM, SRCAXIS, SRCDET; the facts; the angles. */
tg_code tg_fits_source(tg_fits *f, tg_scan *scan);
void tg_fits_put_source(tg_fits *f, const tg_scan *scan);
tg_code tg_fits_facts(tg_fits *f, tg_facts *facts);
void tg_fits_put_facts(tg_fits *f, const tg_facts *facts);

/** Angles from the table ANGLES where there is one, else first + i step. Moves to another HDU.
 *  @param scan  views are set; angle_rad is allocated here */
tg_code tg_fits_view_angles(tg_fits *f, double first_deg, double step_deg, tg_scan *scan);

/** First angle and step as written to a file [deg]; ANGLES says where they differ by more than 1e-9 rad, and then the
 *  table of angles follows as the last thing to write. */
void tg_fits_put_regular(tg_fits *f, const tg_scan *scan, double *first_deg, double *step_deg);
void tg_fits_put_angles(tg_fits *f, const tg_scan *scan);

/** An angle in degrees with 15 digits: 0.05, not 0.050000000000000003. */
double tg_fits_degrees(double rad);

#endif
