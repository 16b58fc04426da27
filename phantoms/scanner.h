#ifndef TG_SCANNER_H
#define TG_SCANNER_H
#include "io/scan.h"

enum { TG_MOST_SUBRAYS = 101 };

/** What scans: geometry, beam and detector of a simulated scanner. */
typedef struct {
    tg_text name;
    tg_scan scan;
    double energy_kev;
    double aperture;        /* of a channel, as a fraction of its pitch; 0: a point */
    int subrays;            /* across the aperture, 1..TG_MOST_SUBRAYS */
    bool average_lines;     /* average line integrals over the aperture instead of intensities */
    double photons_per_ray; /* NaN: no noise */
    double seed;            /* of the noise, a whole number */
} tg_scanner;

/** Read a description (keys: see phantoms/README.md). */
tg_code tg_scanner_read(const char *path, tg_scanner *s, tg_error *e);
tg_code tg_scanner_parse(const char *text, size_t bytes, const char *name, tg_scanner *s, tg_error *e);
void tg_scanner_free(tg_scanner *s);

#endif
