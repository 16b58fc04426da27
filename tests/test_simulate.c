/* The simulated scan: what every channel sees, and its noise. */
#include "io/memory.h"
#include "phantoms/simulate.h"
#include "tests/near.h"

#include <omp.h>
#include <stdio.h>
#include <string.h>

#define DISC \
    "phantom: disc\nmaterials: [{name: a, mu: 0.02}]\nsolids:\n" \
    "  - {name: body, shape: cylinder, material: a, centre: [12, -7, 0], radius: 60, length: 20}\n"

static tg_sinogram scan(const char *phantom, const char *scanner, tg_simulated *simulated)
{
    tg_error e = {0};
    tg_phantom p;
    tg_scanner s;
    tg_sinogram made;
    CK_OK(tg_phantom_parse(phantom, strlen(phantom), "p.yaml", &p, &e));
    CK_OK(tg_scanner_parse(scanner, strlen(scanner), "s.yaml", &s, &e));
    CK_OK(tg_simulate(&p, &s, NULL, &made, simulated, &e));
    tg_phantom_free(&p);
    tg_scanner_free(&s);
    return made;
}

/** Chord of the disc above for the parallel ray (theta, s), times mu. */
static double disc_integral(double theta, double s)
{
    const double b = s - 12 * cos(theta) + 7 * sin(theta);
    return fabs(b) < 60 ? 0.02 * 2 * sqrt(3600 - b * b) : 0;
}

START_TEST(point_aperture)
{
    static const char *const scanner[] = {
        "scanner: s\ngeometry: parallel\nchannels: 181\npitch: 0.83\naxis-channel: 88.3\nviews: 7\nstart: "
        "11\naperture: 0\n",
        "scanner: s\ngeometry: fan-equiangular\nsource-axis: 300\nsource-detector: 500\nchannels: 181\npitch: 0.17\n"
        "axis-channel: 88.3\nviews: 7\nstart: 11\naperture: 0\n",
        "scanner: s\ngeometry: fan-equispaced\nsource-axis: 300\nsource-detector: 500\nchannels: 181\npitch: 1.4\n"
        "axis-channel: 88.3\nviews: 7\nstart: 11\ndirection: clockwise\naperture: 0\n"};
    const double radian = acos(-1) / 180;
    for (int g = 0; g < 3; g++) {
        tg_sinogram sino = scan(DISC, scanner[g], NULL);
        for (int v = 0; v < 7; v++)
            for (int c = 0; c < 181; c++) { /* the ray by the conventions of io/scan.h, written out again */
                const double beta = (11 + (g == 2 ? -1 : 1) * 360. / 7 * v) * radian, at = c - 87.3;
                const double gamma = g == 0 ? 0 : g == 1 ? at * 0.17 * radian : atan(at * 1.4 / 500);
                const double s = g == 0 ? at * 0.83 : 300 * sin(gamma), want = disc_integral(beta + gamma, s);
                CK_NEAR(sino.v[v * 181 + c], want, 1e-7, 1e-9, "chord of a disc (closed form), float"); /* 2^-24 */
            }
        tg_sinogram_free(&sino);
    }
}
END_TEST

/** The same scan with another aperture. */
#define PARALLEL "scanner: s\ngeometry: parallel\nchannels: 181\npitch: 0.83\nviews: 3\n"

START_TEST(apertures)
{
    tg_sinogram lines = scan(DISC, PARALLEL "subrays: 3\naverage: line-integrals\naperture: 0.6\n", NULL);
    tg_sinogram light = scan(DISC, PARALLEL "subrays: 3\naperture: 0.6\n", NULL);
    tg_sinogram wide = scan(DISC, PARALLEL "subrays: 101\naverage: line-integrals\n", NULL);
    bool differ = false;
    for (int c = 0; c < 181; c++) {
        double sum = 0, intensity = 0;
        for (int k = -1; k <= 1; k++) { /* thirds of the aperture have their middles 0.2 pitches apart */
            const double p = disc_integral(0, (c - 90 + 0.2 * k) * 0.83);
            sum += p / 3;
            intensity += exp(-p) / 3;
        }
        CK_NEAR(lines.v[c], sum, 1e-7, 1e-9, "mean of three line integrals (closed form)");
        CK_NEAR(light.v[c], -log(intensity), 1e-7, 1e-7, "mean of three intensities (closed form)");
        differ |= fabs(sum + log(intensity)) > 1e-4;
        /* all of the aperture: the primitive of the chord, 1/2 (b sqrt(r^2 - b^2) + r^2 asin(b / r)) */
        double end[2];
        for (int k = 0; k < 2; k++) {
            const double b = fmax(-60, fmin(60, (c - 90.5 + k) * 0.83 - 12));
            end[k] = 0.02 * (b * sqrt(3600 - b * b) + 3600 * asin(b / 60));
        }
        /* on a square-root edge the mid-point rule errs by |zeta(-1/2, a)| <= 0.208 times mu sqrt(8 r) h^1.5, h the
         * step of sub-rays (Euler and Maclaurin, with Hurwitz's zeta for the phase a of the edge); elsewhere far less
         */
        const double h = 0.83 / 101, most = 0.21 * 0.02 * sqrt(8 * 60) * h * sqrt(h) / 0.83;
        CK_NEAR(wide.v[c], (end[1] - end[0]) / 0.83, 1e-7, most, "mean over the aperture (closed form)");
    }
    ck_assert(differ); /* the two ways are not the same at the edge */
    CK_NEAR(lines.facts.aperture_mm.v, 0.6 * 0.83, 1e-15, 0, "aperture at the axis");
    tg_sinogram_free(&lines);
    tg_sinogram_free(&light);
    tg_sinogram_free(&wide);
}
END_TEST

START_TEST(dense_matter)
{
    /* a ray of exp(-2000) has no double: the mean of intensities is still finite and right */
    tg_sinogram s = scan("phantom: p\nmaterials: [{name: a, mu: 10}]\nsolids:\n"
                         "  - {name: b, shape: box, material: a, size: [400, 200, 20]}\n",
                         PARALLEL, NULL);
    CK_NEAR(s.v[90], 2000, 1e-7, 0, "box (closed form)");
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(slices)
{
    tg_sinogram s = scan("phantom: p\nmaterials: [{name: a, mu: 0.1}]\nsolids:\n"
                         "  - {name: b, shape: cone, material: a, radius: 30, top-radius: 10, length: 40}\n",
                         PARALLEL "slices: 4\nslice-pitch: 12\naperture: 0\n", NULL);
    ck_assert_uint_eq(s.scan.rows, 4);
    for (int row = 0; row < 4; row++) { /* rows at z = -18, -6, 6, 18 */
        const double z = -18 + 12 * row, r = 20 - z / 2;
        CK_NEAR(s.v[(row * 3 + 1) * 181 + 90], 0.1 * 2 * r, 1e-7, 0, "cone at z (closed form)");
    }
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(facts)
{
    tg_sinogram s = scan("phantom: disc\nmaterials: [{name: a, mu: 0.02}, {name: b, hu: 30}]\nsolids:\n"
                         "  - {name: body, shape: cylinder, material: a, radius: 60, length: 20}\n",
                         PARALLEL "energy: 60\nphotons: 1000\nseed: 9\n", NULL);
    double water;
    tg_error e = {0};
    CK_OK(tg_water_mu(60, &water, &e));
    CK_NEAR(s.facts.energy_kev.v, 60, 0, 0, "energy");
    CK_NEAR(s.facts.mu_water_per_mm.v, water, 0, 0, "water at that energy");
    CK_NEAR(s.facts.photons_per_ray.v, 1000, 0, 0, "photons");
    CK_NEAR(s.facts.seed.v, 9, 0, 0, "seed");
    CK_NEAR(s.facts.aperture_mm.v, 0.83, 1e-15, 0, "aperture");
    ck_assert_str_eq(s.facts.phantom.v, "disc");
    ck_assert_str_eq(s.facts.scanner.v, "s");
    ck_assert(isnan(s.facts.tube_kv.v));
    tg_sinogram_free(&s);
    s = scan(DISC, PARALLEL "aperture: 0\n", NULL);
    ck_assert(isnan(s.facts.photons_per_ray.v) && isnan(s.facts.seed.v) && isnan(s.facts.aperture_mm.v));
    ck_assert(isnan(s.facts.mu_water_per_mm.v)); /* all materials are plain attenuations */
    tg_sinogram_free(&s);
}
END_TEST

#define SLAB \
    "phantom: slab\nmaterials: [{name: a, mu: 0.02}]\nsolids:\n" \
    "  - {name: b, shape: box, material: a, size: [100, 1000, 1000], turn: 90}\n"

START_TEST(noise)
{
    /* 2000 channels of one view through 100 mm of a slab, 2000 photons expected behind it */
    const double photons = 2000 * exp(2.0);
    char scanner[300];
    snprintf(
        scanner, sizeof scanner,
        "scanner: s\ngeometry: parallel\nchannels: 2000\npitch: 0.1\nviews: 1\nslices: 10\nphotons: %.10g\nseed: 4\n",
        photons);
    tg_sinogram s = scan(SLAB, scanner, NULL);
    enum { N = 20000 };
    double sum = 0, square = 0;
    for (int i = 0; i < N; i++) {
        const double n = photons * exp(-(double)s.v[i]);
        CK_NEAR(n, round(n), 0, 2000 * 3e-7, "a whole number of photons");
        sum += n;
        square += (n - 2000) * (n - 2000);
    }
    CK_NEAR(sum / N, 2000, 0, 4 * sqrt(2000. / N), "mean of Poisson counts, four standard errors");
    CK_NEAR(square / N, 2000, 4 * sqrt(2. / N), 0, "variance of Poisson counts, four standard errors");
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(no_photon)
{
    /* two photons before, exp(-2) of them behind: exp(-0.27) of the channels see none */
    tg_simulated simulated;
    tg_sinogram s =
        scan(SLAB, "scanner: s\ngeometry: parallel\nchannels: 2000\npitch: 0.1\nviews: 1\nphotons: 2\n", &simulated);
    size_t none = 0;
    for (int i = 0; i < 2000; i++)
        none += fabs((double)s.v[i] - log(4)) < 1e-6; /* half a photon of two */
    ck_assert_uint_eq(simulated.zero_counts, none);
    const double chance = exp(-2 * exp(-2.0));
    CK_NEAR((double)none, 2000 * chance, 0, 4 * sqrt(2000 * chance * (1 - chance)),
            "Poisson chance of zero, four errors");
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(same_bits)
{
#define NOISY "scanner: s\ngeometry: parallel\nchannels: 99\npitch: 1\nviews: 150\nslices: 2\nphotons: 1000\n"
    omp_set_num_threads(1);
    tg_sinogram a = scan(DISC, NOISY, NULL);
    omp_set_num_threads(2);
    tg_sinogram b = scan(DISC, NOISY, NULL);
    tg_sinogram c = scan(DISC, NOISY "seed: 2\n", NULL);
    const size_t n = 99 * 300;
    ck_assert_mem_eq(a.v, b.v, n * sizeof *a.v);
    size_t equal = 0;
    for (size_t i = 0; i < n; i++)
        equal += a.v[i] == c.v[i];
    ck_assert_uint_lt(equal, n / 10); /* another seed is another noise; near counts coincide now and then */
    ck_assert(memcmp(a.v, a.v + 99 * 150, 99 * 150 * sizeof *a.v) != 0); /* and so is another slice */
    tg_sinogram_free(&a);
    tg_sinogram_free(&b);
    tg_sinogram_free(&c);
}
END_TEST

static bool stop(void *context, const char *what, double done)
{
    (void)what;
    int *calls = context;
    ++*calls;
    return done < 0.5;
}

START_TEST(stopped_and_refused)
{
    tg_error e = {0};
    tg_phantom p;
    tg_scanner s;
    tg_sinogram made = {0};
    int calls = 0;
    const tg_progress progress = {stop, &calls};
    CK_OK(tg_phantom_parse(DISC, strlen(DISC), "p.yaml", &p, &e));
    CK_OK(tg_scanner_parse(NOISY, strlen(NOISY), "s.yaml", &s, &e));
    ck_assert_int_eq(tg_simulate(&p, &s, &progress, &made, NULL, &e), TG_STOPPED);
    ck_assert_int_gt(calls, 1);
    ck_assert_ptr_null(made.v);
    tg_scanner_free(&s);

    const char *near = "scanner: s\ngeometry: fan-equispaced\nsource-axis: 70\nsource-detector: 200\nchannels: "
                       "9\npitch: 1\nviews: 9\n";
    CK_OK(tg_scanner_parse(near, strlen(near), "s.yaml", &s, &e));
    ck_assert_int_eq(tg_simulate(&p, &s, NULL, &made, NULL, &e), TG_INPUT); /* the disc reaches out to 73.9 mm */
    ck_assert_msg(strstr(e.message[0].what, "'body' reaches 73.9 mm"), "%s", e.message[0].what);
    tg_scanner_free(&s);
    tg_phantom_free(&p);
}
END_TEST

/** Phantom and scanner that draw one warning. */
static void assert_warns(const char *phantom, const char *scanner, const char *says)
{
    tg_error e = {0};
    tg_phantom p;
    tg_scanner s;
    tg_sinogram made;
    CK_OK(tg_phantom_parse(phantom, strlen(phantom), "p.yaml", &p, &e));
    CK_OK(tg_scanner_parse(scanner, strlen(scanner), "s.yaml", &s, &e));
    CK_OK(tg_simulate(&p, &s, NULL, &made, NULL, &e));
    ck_assert_uint_eq(e.count, 1);
    ck_assert(e.message[0].warning && strstr(e.message[0].what, says));
    tg_sinogram_free(&made);
    tg_scanner_free(&s);
    tg_phantom_free(&p);
}

START_TEST(too_thin)
{
    assert_warns(DISC "  - {name: wire, shape: cylinder, material: a, radius: 0.05, length: 20}\n", PARALLEL,
                 "subrays: 9"); /* 0.83 mm / 0.1 mm */
}
END_TEST

START_TEST(cut_off)
{
    /* 12 and -7 mm off the axis and 60 mm in radius; 70 pitches to each side of the middle channel */
    assert_warns(DISC, "scanner: s\ngeometry: parallel\nchannels: 141\npitch: 1\nviews: 3\n",
                 "'body' reaches 73.9 mm from the axis and the scanner sees 70");
}
END_TEST

Suite *suite_simulate(void);
Suite *suite_simulate(void)
{
    SUITE_BEGIN("simulate", 30);
    tcase_add_test(tcase, point_aperture);
    tcase_add_test(tcase, apertures);
    tcase_add_test(tcase, dense_matter);
    tcase_add_test(tcase, slices);
    tcase_add_test(tcase, facts);
    tcase_add_test(tcase, noise);
    tcase_add_test(tcase, no_photon);
    tcase_add_test(tcase, same_bits);
    tcase_add_test(tcase, stopped_and_refused);
    tcase_add_test(tcase, too_thin);
    tcase_add_test(tcase, cut_off);
    return suite;
}
