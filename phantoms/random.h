#ifndef TG_RANDOM_H
#define TG_RANDOM_H
#include <stdint.h>

/** Counter-based random numbers: Philox 4x32-10 (Salmon, Moraes, Dror, Shaw 2011). The stream is a pure function of
 *  seed, purpose and index, so results do not depend on threads or on the order of the work. */
typedef struct {
    uint32_t key[2], counter[4], block[4];
    int used; /* words of the block handed out */
} tg_random;

/** @param purpose  keeps uses of one seed apart  @param index  the view, the slice, the draw */
tg_random tg_random_stream(uint64_t seed, uint32_t purpose, uint64_t index);

uint32_t tg_random_word(tg_random *r);
double tg_random_uniform(tg_random *r);              /* in (0, 1) */
double tg_random_normal(tg_random *r);               /* mean 0, SD 1 */
double tg_random_poisson(tg_random *r, double mean); /* mean >= 0, up to 1e15 */

#endif
