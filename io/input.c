#include "io/input.h"

#include "io/fits.h"
#include "io/memory.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>
#include <zlib.h>

static tg_code fail_read(const char *path, tg_error *e)
{
    return tg_fail(e, TG_INPUT, path, 0, "cannot read: %s", strerror(errno));
}

static tg_code crc_of(const char *path, char text[32], tg_error *e)
{
    unsigned char block[16384];
    size_t n;
    FILE *in = fopen(path, "rb");
    if (!in) return fail_read(path, e);
    uLong crc = crc32(0, NULL, 0);
    while ((n = fread(block, 1, sizeof block, in)) > 0)
        crc = crc32(crc, block, (uInt)n);
    const tg_code code = ferror(in) ? fail_read(path, e) : TG_OK;
    fclose(in);
    snprintf(text, 32, "CRC-32 %08lx", crc);
    return code;
}

static tg_code datasum_of(const char *path, char text[32], tg_error *e)
{
    char sum[16] = "";
    const tg_code code = tg_fits_datasum(path, sum, e);
    snprintf(text, 32, "DATASUM %s", sum);
    return code;
}

tg_code tg_inputs_add(tg_inputs *in, const char *path, tg_error *e)
{
    char sum[32];
    for (size_t i = 0; i < in->n; i++)
        if (!strcmp(in->input[i].path, path)) return TG_OK;
    const tg_code code = tg_fits_magic(path) ? datasum_of(path, sum, e) : crc_of(path, sum, e);
    if (code != TG_OK) return code;
    const tg_input added = {tg_copy_text(path), tg_copy_text(sum)};
    tg_input *item = added.path && added.sum ? tg_append(&in->input, &in->n, sizeof *item) : NULL;
    if (!item) {
        tg_free(added.path);
        tg_free(added.sum);
        return tg_no_memory(e, in->n + 1, sizeof *item);
    }
    *item = added;
    return TG_OK;
}

void tg_inputs_free(tg_inputs *in)
{
    for (size_t i = 0; i < in->n; i++) {
        tg_free(in->input[i].path);
        tg_free(in->input[i].sum);
    }
    tg_free(in->input);
    *in = (tg_inputs){0};
}

tg_code tg_read_file(const char *path, size_t most, char **text, size_t *bytes, tg_error *e)
{
    tg_code code = TG_OK;
    char *read = NULL;
    struct stat st;
    FILE *in = fopen(path, "rb");
    if (!in) return fail_read(path, e);
    if (fstat(fileno(in), &st)) TG_TRY(fail_read(path, e));
    if (!S_ISREG(st.st_mode)) TG_TRY(tg_fail(e, TG_INPUT, path, 0, "is not a file"));
    const size_t length = (size_t)st.st_size;
    if (length > most) TG_TRY(tg_fail(e, TG_INPUT, path, 0, "has %zu bytes; at most %zu are read", length, most));
    TG_TRY(TG_NEW(read, length + 1, e)); /* zeroed: ends with NUL */
    const size_t got = fread(read, 1, length, in);
    if (ferror(in)) TG_TRY(fail_read(path, e));
    *text = read;
    if (bytes) *bytes = got;
    read = NULL;
done:
    fclose(in);
    tg_free(read);
    return code;
}
