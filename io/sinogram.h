#ifndef TG_SINOGRAM_H
#define TG_SINOGRAM_H
#include "io/scan.h"

/** Line integrals of one scan. */
typedef struct {
    tg_scan scan;
    tg_facts facts;
    float *v; /* {rows, views, channels} line integrals [1], owned */
} tg_sinogram;

/** Samples for a scan: v zeroed, the scan copied, facts unknown. Refuses a product of sizes that does not fit. */
tg_code tg_sinogram_create(const tg_scan *scan, tg_sinogram *out, tg_error *e);
void tg_sinogram_free(tg_sinogram *s);

#endif
