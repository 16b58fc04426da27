/* Streams of random numbers: known answers, independence, and the laws of their distributions. */
#include "phantoms/random.h"
#include "tests/near.h"

#include <gsl/gsl_cdf.h>
#include <string.h>

/* Fixed seeds: a chance below this would be an unlucky choice of seed once in ten thousand. */
#define LEAST_CHANCE 1e-4

START_TEST(known_answers)
{
    /* the test vectors published with Salmon et al. (2011), philox4x32 with 10 rounds; from memory */
    static const struct {
        uint32_t counter[4], key[2], want[4];
    } table[] = {
        {{0}, {0}, {0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}},
        {{UINT32_MAX, UINT32_MAX, UINT32_MAX, UINT32_MAX},
         {UINT32_MAX, UINT32_MAX},
         {0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}},
        {{0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344}, /* digits of pi */
         {0xa4093822, 0x299f31d0},
         {0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}},
    };
    for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
        tg_random r = {.used = 4};
        memcpy(r.counter, table[i].counter, sizeof r.counter);
        memcpy(r.key, table[i].key, sizeof r.key);
        for (int k = 0; k < 4; k++)
            ck_assert_uint_eq(tg_random_word(&r), table[i].want[k]);
    }
}
END_TEST

START_TEST(streams_differ)
{
    const tg_random base = tg_random_stream(7, 1, 12);
    tg_random same = base, again = tg_random_stream(7, 1, 12);
    for (int i = 0; i < 100; i++)
        ck_assert_uint_eq(tg_random_word(&same), tg_random_word(&again));
    /* every part of seed, purpose and index counts, the upper words too; 8 equal words would be a 2^-256 accident */
    const tg_random other[] = {tg_random_stream(8, 1, 12), tg_random_stream(7 + (UINT64_C(1) << 32), 1, 12),
                               tg_random_stream(7, 2, 12), tg_random_stream(7, 1, 13),
                               tg_random_stream(7, 1, 12 + (UINT64_C(1) << 32))};
    for (size_t k = 0; k < sizeof other / sizeof *other; k++) {
        tg_random a = base, b = other[k];
        int equal = 0;
        for (int i = 0; i < 8; i++)
            equal += tg_random_word(&a) == tg_random_word(&b);
        ck_assert_int_lt(equal, 8);
    }
}
END_TEST

/** Chance of a worse agreement between counts and expectation, bins of less than ten expected put together. */
static double chi_square_chance(const double *count, const double *expected, size_t n)
{
    double square = 0, c = 0, x = 0, last_c = 0, last_x = 0;
    int bins = 0;
    for (size_t i = 0; i < n; i++) {
        c += count[i];
        x += expected[i];
        if (x < 10) continue;
        square += (c - x) * (c - x) / x;
        last_c = c;
        last_x = x;
        c = x = 0;
        bins++;
    }
    square += (last_c + c - last_x - x) * (last_c + c - last_x - x) / (last_x + x) -
              (last_c - last_x) * (last_c - last_x) / last_x; /* the rest joins the last bin */
    return gsl_cdf_chisq_Q(square, bins - 1);
}

START_TEST(uniform_and_normal)
{
    enum { DRAWS = 200000, BINS = 100 };
    double u_count[BINS] = {0}, n_count[BINS] = {0}, expected[BINS];
    tg_random r = tg_random_stream(1, 0, 0);
    for (int i = 0; i < DRAWS; i++) {
        const double u = tg_random_uniform(&r);
        ck_assert(u > 0 && u < 1);
        u_count[(int)(u * BINS)]++;
        n_count[(int)(0.5 * erfc(-tg_random_normal(&r) / sqrt(2)) * BINS)]++; /* the normal law makes it uniform */
    }
    for (int k = 0; k < BINS; k++)
        expected[k] = (double)DRAWS / BINS;
    ck_assert(chi_square_chance(u_count, expected, BINS) > LEAST_CHANCE);
    ck_assert(chi_square_chance(n_count, expected, BINS) > LEAST_CHANCE);
}
END_TEST

START_TEST(poisson_law)
{
    enum { DRAWS = 100000, MOST = 3000 };
    static const double mean[] = {0.02, 0.7, 5, 9.99, 10.01, 12.5, 37, 250, 2000};
    static double count[MOST], expected[MOST];
    for (size_t m = 0; m < sizeof mean / sizeof *mean; m++) {
        tg_random r = tg_random_stream(3, 0, m);
        memset(count, 0, sizeof count);
        for (int i = 0; i < DRAWS; i++) {
            const double k = tg_random_poisson(&r, mean[m]);
            ck_assert(k >= 0 && k < MOST && k == floor(k));
            count[(int)k]++;
        }
        for (int k = 0; k < MOST; k++)
            expected[k] = DRAWS * exp(k * log(mean[m]) - mean[m] - lgamma(k + 1.0));
        const double chance = chi_square_chance(count, expected, MOST);
        ck_assert_msg(chance > LEAST_CHANCE, "mean %g: chance %g", mean[m], chance);
    }
}
END_TEST

START_TEST(poisson_moments)
{
    enum { DRAWS = 20000 };
    static const double mean[] = {1e4, 1e6, 9.9e8, 1.1e9, 1e12, 1e15};
    for (size_t m = 0; m < sizeof mean / sizeof *mean; m++) {
        tg_random r = tg_random_stream(4, 0, m);
        double sum = 0, square = 0;
        for (int i = 0; i < DRAWS; i++) {
            const double k = tg_random_poisson(&r, mean[m]), z = (k - mean[m]) / sqrt(mean[m]);
            ck_assert(k == floor(k));
            sum += z;
            square += z * z;
        }
        /* standard errors of mean and variance of a standardised draw: 1 / sqrt(n) and sqrt(2 / n); four of them */
        CK_NEAR(sum / DRAWS, 0, 0, 4 / sqrt(DRAWS), "mean of Poisson draws");
        CK_NEAR(square / DRAWS, 1, 0, 4 * sqrt(2. / DRAWS), "variance of Poisson draws");
    }
    tg_random r = tg_random_stream(4, 0, 0);
    ck_assert(tg_random_poisson(&r, 0) == 0);
}
END_TEST

Suite *suite_random(void);
Suite *suite_random(void)
{
    SUITE_BEGIN("random", 20);
    tcase_add_test(tcase, known_answers);
    tcase_add_test(tcase, streams_differ);
    tcase_add_test(tcase, uniform_and_normal);
    tcase_add_test(tcase, poisson_law);
    tcase_add_test(tcase, poisson_moments);
    return suite;
}
