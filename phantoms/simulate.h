#ifndef TG_SIMULATE_H
#define TG_SIMULATE_H
#include "io/progress.h"
#include "io/sinogram.h"
#include "phantoms/phantom.h"
#include "phantoms/scanner.h"

/** What a simulation has to report beside the data. */
typedef struct {
    size_t zero_counts; /* rays with no photon at all, taken as half a photon */
} tg_simulated;

/** A scan of a phantom: exact line integrals of every sub-ray, averaged over the aperture, then Poisson noise when the
 *  scanner names photons. Bit-identical for any number of threads; noise depends on seed, row and view only.
 *  @param out       set on success; facts are filled in (energy, photons, aperture, names, seed, and the mu of water
 *                  unless all materials are plain attenuations)
 *  @param simulated may be NULL */
tg_code tg_simulate(const tg_phantom *p, const tg_scanner *s, const tg_progress *progress, tg_sinogram *out,
                    tg_simulated *simulated, tg_error *e);

#endif
