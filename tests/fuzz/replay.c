/* Runs a fuzzer's function on files instead of random bytes: the corpus in the ordinary test run. */
#include "io/process.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

static int replay(const char *path)
{
    FILE *f = fopen(path, "rb");
    long size = -1;
    uint8_t *data = NULL;
    if (f && !fseek(f, 0, SEEK_END)) size = ftell(f);
    if (size >= 0) data = malloc((size_t)size + 1);
    const int good = data && !fseek(f, 0, SEEK_SET) && fread(data, 1, (size_t)size, f) == (size_t)size;
    if (good)
        LLVMFuzzerTestOneInput(data, (size_t)size);
    else
        fprintf(stderr, "%s: cannot be read\n", path);
    if (f) fclose(f);
    free(data);
    return good;
}

int main(int argc, char **argv)
{
    int good = 1;
    tg_process_start();
    for (int i = 1; i < argc; i++)
        good &= replay(argv[i]);
    printf("%d inputs replayed\n", argc - 1);
    return good && argc > 1 ? EXIT_SUCCESS : EXIT_FAILURE;
}
