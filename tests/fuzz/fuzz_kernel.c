/* Any bytes as a kernel: as what stands on a command line, and as a kernel file. */
#include "recon/kernel.h"

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* A refusal says why; a kernel answers finite numbers, and 0 beyond its end. */
static void check(const char *text)
{
    tg_error e = {0};
    tg_kernel k;
    const tg_code code = tg_kernel_read(text, &k, &e);
    if (code != e.code || (code != TG_OK && !e.message[0].what[0])) abort();
    if (code != TG_OK) return;
    for (double fraction = 0; fraction <= 2.5; fraction += 0.0625)
        if (!isfinite(tg_kernel_response(&k, fraction))) abort();
    const double end = tg_kernel_end(&k);
    if (!(end > 0) || (isfinite(end) && tg_kernel_response(&k, nextafter(end, 3)) != 0)) abort();
    tg_kernel_free(&k);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    char text[65] = "";
    memcpy(text, data, size < 64 ? size : 64);
    if (!strchr(text, '/')) check(text); /* no wandering through the file system */
    char path[] = "/dev/shm/tomogauge-fuzz-XXXXXX";
    const int file = mkstemp(path);
    if (file < 0) return 0;
    const bool written = write(file, data, size) == (ssize_t)size;
    close(file);
    if (written) check(path);
    unlink(path);
    return 0;
}
