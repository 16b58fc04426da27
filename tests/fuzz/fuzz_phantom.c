/* Any bytes as a phantom and as a scanner; what is taken must answer rays with sound lengths. */
#include "phantoms/phantom.h"
#include "phantoms/scanner.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>

static void shoot(const tg_phantom *p)
{
    static const double point[][3] = {{0, 0, 0}, {-500, 3, 1}, {1e5, 1e5, -1e5}},
                        direction[][3] = {{1, 0, 0}, {0, 0, 1}, {0.6, -0.8, 0}, {0.48, 0.6, 0.64}};
    double mm[TG_MOST_SOLIDS];
    for (int i = 0; i < 3; i++)
        for (int k = 0; k < 4; k++) {
            tg_phantom_paths(p, point[i], direction[k], mm);
            for (size_t m = 0; m < p->n_materials; m++)
                if (!(mm[m] >= 0 && mm[m] < 1e9)) abort();
        }
    const int at = tg_phantom_solid_at(p, point[0]);
    if (at >= (int)p->n_solids) abort();
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    const char *text = (const char *)data;
    tg_error e = {0};
    tg_phantom p = {0};
    tg_scanner s = {0};
    tg_code code = tg_phantom_parse(text, size, "folder/fuzz.yaml", &p, &e);
    if ((code == TG_OK) != (e.code == TG_OK)) abort(); /* a refusal says why */
    if (code == TG_OK) {
        double mu[TG_MOST_SOLIDS];
        shoot(&p);
        if (tg_phantom_mu(&p, 70, mu, &e) == TG_OK)
            for (size_t m = 0; m < p.n_materials; m++)
                if (!(mu[m] >= 0 && mu[m] < 1e6)) abort();
    }
    e = (tg_error){0};
    code = tg_scanner_parse(text, size, "folder/fuzz.yaml", &s, &e);
    if ((code == TG_OK) != (e.code == TG_OK)) abort();
    if (code == TG_OK) {
        double point[2], direction[2];
        tg_scan_ray(&s.scan, s.scan.angle_rad[s.scan.views - 1], (double)s.scan.channels - 0.5, point, direction);
        if (!(fabs(hypot(direction[0], direction[1]) - 1) < 1e-9)) abort();
    }
    tg_phantom_free(&p);
    tg_scanner_free(&s);
    return 0;
}
