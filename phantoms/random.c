#include "phantoms/random.h"

#include <gsl/gsl_randist.h>
#include <math.h>

/** Ten rounds of Philox 4x32: Salmon et al. (2011), section 4; multipliers and Weyl constants of its table 2. */
static void philox(const uint32_t key[2], const uint32_t counter[4], uint32_t out[4])
{
    uint32_t c[4] = {counter[0], counter[1], counter[2], counter[3]}, k[2] = {key[0], key[1]};
    for (int round = 0; round < 10; round++) {
        const uint64_t a = UINT64_C(0xD2511F53) * c[0], b = UINT64_C(0xCD9E8D57) * c[2];
        const uint32_t next[4] = {(uint32_t)(b >> 32) ^ c[1] ^ k[0], (uint32_t)b, (uint32_t)(a >> 32) ^ c[3] ^ k[1],
                                  (uint32_t)a};
        for (int i = 0; i < 4; i++)
            c[i] = next[i];
        k[0] += UINT32_C(0x9E3779B9);
        k[1] += UINT32_C(0xBB67AE85);
    }
    for (int i = 0; i < 4; i++)
        out[i] = c[i];
}

tg_random tg_random_stream(uint64_t seed, uint32_t purpose, uint64_t index)
{
    return (tg_random){.key = {(uint32_t)seed, (uint32_t)(seed >> 32)},
                       .counter = {0, purpose, (uint32_t)index, (uint32_t)(index >> 32)},
                       .used = 4};
}

uint32_t tg_random_word(tg_random *r)
{
    if (r->used == 4) {
        philox(r->key, r->counter, r->block);
        r->counter[0]++;
        r->used = 0;
    }
    return r->block[r->used++];
}

double tg_random_uniform(tg_random *r)
{
    const uint64_t high = tg_random_word(r) >> 6, low = tg_random_word(r) >> 6; /* 52 bits: + 1/2 is still exact */
    return ((double)(high << 26 | low) + 0.5) / 0x1p52;
}

static unsigned long word(void *state)
{
    return tg_random_word(state);
}

static double uniform(void *state)
{
    return tg_random_uniform(state);
}

/** The stream as a generator of GSL, for its distributions. */
static const gsl_rng_type stream_type = {"philox4x32-10", UINT32_MAX, 0, sizeof(tg_random), NULL, word, uniform};

double tg_random_normal(tg_random *r)
{
    const gsl_rng g = {&stream_type, r};
    return gsl_ran_gaussian_ziggurat(&g, 1);
}

double tg_random_poisson(tg_random *r, double mean)
{
    /* GSL counts in unsigned int; from 1e9 on the normal limit with its skewness of 3e-5 cannot be told apart */
    if (mean > 1e9) return round(mean + sqrt(mean) * tg_random_normal(r));
    const gsl_rng g = {&stream_type, r};
    return gsl_ran_poisson(&g, mean);
}
