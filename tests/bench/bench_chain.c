/* A simulated scan, and filtered back-projection of one slice, 512 x 512 from 984 views of 736 channels, with all
 * threads. Every row of JSON holds a time and its ratio to a ceiling measured in the same run, the time in which the
 * machine could do
 *     simulate     one square root for each sub-ray and solid
 *     filter       the reading and writing of all rows
 *     backproject  two float multiply-adds for each pixel and view */
#include "io/embedded.h"
#include "io/memory.h"
#include "io/progress.h"
#include "phantoms/simulate.h"
#include "recon/backproject.h"
#include "recon/filter.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { CHANNELS = 736, VIEWS = 984, PIXELS = 512, ROUNDS = 5 };

/* Multiply-adds a second, all threads: independent chains that fit in registers. */
static double multiply_adds_per_s(void)
{
    enum { BLOCKS = 64, TURNS = 200000, CHAINS = 32 };
    double best = 0;
    float kept[BLOCKS];
    for (int round = 0; round < ROUNDS; round++) {
        const double start = tg_seconds();
#pragma omp parallel for
        for (int block = 0; block < BLOCKS; block++) {
            float chain[CHAINS];
            for (int i = 0; i < CHAINS; i++)
                chain[i] = (float)i;
            for (int turn = 0; turn < TURNS; turn++)
                for (int i = 0; i < CHAINS; i++)
                    chain[i] = chain[i] * 0.999F + 0.001F;
            kept[block] = chain[block % CHAINS];
        }
        best = fmax(best, (double)BLOCKS * TURNS * CHAINS / (tg_seconds() - start));
    }
    return kept[0] >= 0 ? best : 0;
}

static double square_roots_per_s(void)
{
    enum { BLOCKS = 64, TURNS = 20000, CHAINS = 32 };
    double best = 0, kept[BLOCKS];
    for (int round = 0; round < ROUNDS; round++) {
        const double start = tg_seconds();
#pragma omp parallel for
        for (int block = 0; block < BLOCKS; block++) {
            double chain[CHAINS];
            for (int i = 0; i < CHAINS; i++)
                chain[i] = i;
            for (int turn = 0; turn < TURNS; turn++)
                for (int i = 0; i < CHAINS; i++)
                    chain[i] = sqrt(chain[i] + 0.5);
            kept[block] = chain[block % CHAINS];
        }
        best = fmax(best, (double)BLOCKS * TURNS * CHAINS / (tg_seconds() - start));
    }
    return kept[0] >= 0 ? best : 0;
}

static double bytes_per_s(void)
{
    const size_t n = (size_t)1 << 23;
    float *a = tg_alloc(n, sizeof *a), *b = tg_alloc(n, sizeof *b);
    double best = 0;
    for (int round = 0; a && b && round < ROUNDS; round++) {
        const double start = tg_seconds();
#pragma omp parallel for
        for (size_t i = 0; i < n; i++)
            a[i] = 0.5F * a[i] + b[i];
        best = fmax(best, 12 * (double)n / (tg_seconds() - start));
    }
    tg_free(a);
    tg_free(b);
    return best;
}

static void report(const char *what, const char *geometry, double seconds, const char *items, double n,
                   const char *ceiling, double ceiling_s)
{
    printf("{\"name\": \"%s/%s\", \"ms\": %.2f, \"%s_per_s\": %.3g, \"ceiling\": \"%s\", \"ratio\": %.4f}\n", what,
           geometry, 1e3 * seconds, items, n / seconds, ceiling, ceiling_s / seconds);
}

static tg_code bench_simulate(double roots, tg_error *e)
{
    const char *phantom = tg_embedded_text("rods-disc.yaml"),
               *scanner = tg_embedded_text("scanner-fan-equispaced.yaml");
    tg_code code = TG_OK;
    tg_phantom p = {0};
    tg_scanner s = {0};
    double best_s = INFINITY;
    TG_TRY(tg_phantom_parse(phantom, strlen(phantom), "rods-disc.yaml", &p, e));
    TG_TRY(tg_scanner_parse(scanner, strlen(scanner), "scanner-fan-equispaced.yaml", &s, e));
    for (int round = 0; round < ROUNDS; round++) {
        tg_sinogram made = {0};
        const double start = tg_seconds();
        TG_TRY(tg_simulate(&p, &s, NULL, &made, NULL, e));
        best_s = fmin(best_s, tg_seconds() - start);
        tg_sinogram_free(&made);
    }
    const double rays = (double)s.scan.views * (double)s.scan.channels * s.subrays;
    report("simulate", "fan-equispaced", best_s, "rays", rays, "square-root", rays * (double)p.n_solids / roots);
done:
    tg_scanner_free(&s);
    tg_phantom_free(&p);
    return code;
}

static tg_code bench(tg_geometry geometry, const char *name, double adds, double bytes, tg_error *e)
{
    static float line[VIEWS * CHANNELS], slice[PIXELS * PIXELS];
    static double angle_rad[VIEWS], weight[VIEWS];
    static const double centre[2];
    tg_code code = TG_OK;
    tg_scan scan = {.geometry = geometry,
                    .channels = CHANNELS,
                    .views = VIEWS,
                    .rows = 1,
                    .channel_zero = 0.5 * (CHANNELS - 1),
                    .channel_step = 0.5,
                    .angle_rad = angle_rad};
    if (geometry != TG_PARALLEL) {
        scan.source_axis_mm = 570;
        scan.source_detector_mm = 1040;
        scan.channel_step *= geometry == TG_FAN_EQUIANGULAR ? 1 / 570.0 : 1040 / 570.0;
    }
    for (size_t i = 0; i < VIEWS; i++) {
        angle_rad[i] = 2 * M_PI * (double)i / VIEWS;
        weight[i] = M_PI / VIEWS;
    }
    for (size_t i = 0; i < (size_t)VIEWS * CHANNELS; i++)
        line[i] = (float)(i % 101);
    const tg_grid grid = tg_grid_square(PIXELS, 250, centre);
    tg_kernel kernel = {0};
    tg_filter *filter = NULL;
    tg_backprojector *b = NULL;
    float *filtered = NULL;
    double best_filter_s = INFINITY, best_s = INFINITY;
    TG_TRY(tg_kernel_read("hann", &kernel, e));
    TG_TRY(tg_filter_create(&scan, &kernel, &filter, e));
    TG_TRY(tg_backprojector_create(&scan, &grid, tg_filter_stride(filter), &b, e));
    TG_TRY(TG_NEW(filtered, VIEWS * tg_filter_stride(filter), e));
    for (int round = 0; round < ROUNDS; round++) {
        const double start = tg_seconds();
        tg_filter_apply(filter, weight, line, filtered);
        const double middle = tg_seconds();
        tg_backproject_rows(b, filtered, 0, PIXELS, slice);
        best_filter_s = fmin(best_filter_s, middle - start);
        best_s = fmin(best_s, tg_seconds() - middle);
    }
    const double samples = (double)VIEWS * CHANNELS, updates = (double)VIEWS * PIXELS * PIXELS;
    report("filter", name, best_filter_s, "samples", samples, "triad",
           4 * (samples + (double)VIEWS * (double)tg_filter_stride(filter)) / bytes);
    report("backproject", name, best_s, "updates", updates, "multiply-add", 2 * updates / adds);
done:
    tg_kernel_free(&kernel);
    tg_filter_free(filter);
    tg_backprojector_free(b);
    tg_free(filtered);
    return code;
}

int main(void)
{
    tg_error e = {0};
    const double adds = multiply_adds_per_s(), roots = square_roots_per_s(), bytes = bytes_per_s();
    printf("{\"name\": \"ceiling\", \"multiply_adds_per_s\": %.3g, \"square_roots_per_s\": %.3g, \"bytes_per_s\": "
           "%.3g}\n",
           adds, roots, bytes);
    tg_code code = bench_simulate(roots, &e);
    if (code == TG_OK) code = bench(TG_PARALLEL, "parallel", adds, bytes, &e);
    if (code == TG_OK) code = bench(TG_FAN_EQUIANGULAR, "fan-equiangular", adds, bytes, &e);
    if (code == TG_OK) code = bench(TG_FAN_EQUISPACED, "fan-equispaced", adds, bytes, &e);
    if (code != TG_OK) fprintf(stderr, "bench: %s\n", e.message[0].what);
    return (int)code;
}
