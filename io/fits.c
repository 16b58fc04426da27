#include "io/fits_file.h"
#include "io/memory.h"
#include "io/version.h"

#include <errno.h>
#include <fitsio.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>
#include <sys/stat.h>
#include <unistd.h>

enum { AXIS_MOST = 1 << 20 };

/* cfitsio takes arrays and texts that it does not change as if it did. */
static void *unconst(const void *p)
{
    void *q;
    memcpy(&q, &p, sizeof q);
    return q;
}

static tg_code fail_status(tg_fits *f, int status, const char *doing)
{
    char text[FLEN_STATUS];
    fits_get_errstatus(status, text);
    fits_clear_errmsg();
    if (status == MEMORY_ALLOCATION) return tg_fail(f->e, TG_MACHINE, f->path, 0, "%s: no memory", doing);
    return tg_fail(f->e, TG_INPUT, f->path, 0, "%s: %s (FITS status %d)", doing, text, status);
}

/* cfitsio reads through compression and past the end of cut buffers; so look at the file itself first. */
static tg_code check_magic(const char *path, tg_error *e)
{
    struct stat st;
    char start[10] = "";
    if (stat(path, &st)) return tg_fail(e, TG_INPUT, path, 0, "cannot open: %s", strerror(errno));
    if (!S_ISREG(st.st_mode)) return tg_fail(e, TG_INPUT, path, 0, "is not a file");
    FILE *in = fopen(path, "rb");
    if (!in) return tg_fail(e, TG_INPUT, path, 0, "cannot open: %s", strerror(errno));
    const size_t got = fread(start, 1, 9, in);
    fclose(in);
    if (!strncmp(start, "\x1f\x8b", 2) || !strncmp(start, "BZh", 3) || !strncmp(start, "PK\3\4", 4))
        return tg_fail(e, TG_INPUT, path, 0, "is compressed; unpack it first");
    if (got < 9 || strcmp(start, "SIMPLE  =") != 0)
        return tg_fail(e, TG_INPUT, path, 0, "is not a FITS file: it does not begin with 'SIMPLE  ='");
    return TG_OK;
}

bool tg_fits_magic(const char *path)
{
    return check_magic(path, NULL) == TG_OK;
}

/* The data of the HDU, in whole blocks of 2880 bytes, must lie in the file before cfitsio is asked for them. */
static tg_code check_length(tg_fits *f, size_t bytes)
{
    enum { BLOCK = 2880 };
    struct stat st;
    LONGLONG start, end;
    int status = 0;
    if (fits_get_hduaddrll(f->handle, NULL, &start, &end, &status)) return fail_status(f, status, "header");
    if (stat(f->path, &st)) return tg_fail(f->e, TG_INPUT, f->path, 0, "cannot open: %s", strerror(errno));
    bytes = (bytes + BLOCK - 1) / BLOCK * BLOCK;
    if (start < 0 || st.st_size < start || (size_t)(st.st_size - start) < bytes)
        return tg_fail(f->e, TG_INPUT, f->path, 0,
                       "is cut short: its header announces %zu bytes of data, %lld are there; copy or export it again",
                       bytes, (long long)(st.st_size > start ? st.st_size - start : 0));
    return TG_OK;
}

/* Shape of the image HDU it stands at, bounded. */
static tg_code describe(tg_fits *f)
{
    LONGLONG n[3] = {1, 1, 1};
    int status = 0;
    if (fits_is_compressed_image(f->handle, &status))
        return tg_fail(f->e, TG_INPUT, f->path, 0, "its image is tile-compressed; unpack it first (funpack)");
    if (fits_get_img_paramll(f->handle, 3, &f->bitpix, &f->axes, n, &status)) return fail_status(f, status, "header");
    if (f->axes > 3) return tg_fail(f->e, TG_INPUT, f->path, 0, "has %d axes; at most 3 are read", f->axes);
    size_t bytes = (size_t)abs(f->bitpix) / 8;
    for (int i = 0; i < 3; i++) {
        if (n[i] < 1 || n[i] > AXIS_MOST)
            return tg_fail(f->e, TG_INPUT, f->path, 0, "NAXIS%d = %lld is outside 1 to %d", i + 1, n[i], AXIS_MOST);
        f->n[i] = (size_t)n[i];
        if (!tg_multiply(bytes, f->n[i], &bytes)) return tg_no_memory(f->e, f->n[0], f->n[1]);
    }
    return check_length(f, bytes);
}

tg_code tg_fits_open(tg_fits *f, const char *path, tg_error *e)
{
    tg_code code = TG_OK;
    fitsfile *handle = NULL;
    char disk[FLEN_FILENAME];
    int status = 0, type, axes = 0;
    *f = (tg_fits){.path = path, .e = e};
    TG_TRY(check_magic(path, e));
    /* "./": a leading ~ or blank is part of the name */
    if (snprintf(disk, sizeof disk, "%s%s", path[0] == '/' ? "" : "./", path) >= (int)sizeof disk)
        return tg_fail(e, TG_INPUT, path, 0, "the path is longer than %zu bytes", sizeof disk - 3);
    fits_open_diskfile(&handle, disk, READONLY, &status);
    f->handle = handle;
    while (!status) {
        if (!fits_get_hdu_type(handle, &type, &status) && type == IMAGE_HDU) fits_get_img_dim(handle, &axes, &status);
        if (axes) break;
        fits_movrel_hdu(handle, 1, NULL, &status);
    }
    if (status == END_OF_FILE)
        code = tg_fail(e, TG_INPUT, path, 0, "holds no image");
    else if (status)
        code = fail_status(f, status, "header");
    else
        code = describe(f);
done:
    fits_clear_errmsg();
    if (code != TG_OK) tg_fits_close(f);
    return code;
}

tg_code tg_fits_extension(tg_fits *f, const char *name, bool *found)
{
    int status = 0, type = ANY_HDU;
    fits_movnam_hdu(f->handle, ANY_HDU, unconst(name), 0, &status);
    *found = status == 0;
    if (status) fits_clear_errmsg();
    if (status == BAD_HDU_NUM) return TG_OK;
    if (status || fits_get_hdu_type(f->handle, &type, &status)) return fail_status(f, status, name);
    return type == IMAGE_HDU ? describe(f) : TG_OK;
}

tg_code tg_fits_number(tg_fits *f, const char *key, double *v)
{
    int status = 0;
    double read;
    fits_read_key(f->handle, TDOUBLE, key, &read, NULL, &status);
    fits_clear_errmsg();
    if (status == KEY_NO_EXIST) return TG_OK;
    if (status || !isfinite(read)) return tg_fail(f->e, TG_INPUT, f->path, 0, "%s is not a number", key);
    *v = read;
    return TG_OK;
}

tg_code tg_fits_text(tg_fits *f, const char *key, char *text, size_t size)
{
    int status = 0;
    char *read = NULL;
    tg_code code = TG_OK;
    text[0] = '\0';
    fits_read_key_longstr(f->handle, key, &read, NULL, &status);
    fits_clear_errmsg();
    if (status == KEY_NO_EXIST || status == VALUE_UNDEFINED) goto done;
    if (status || !read)
        code = tg_fail(f->e, TG_INPUT, f->path, 0, "%s is not a text", key);
    else if (strlen(read) >= size)
        code = tg_fail(f->e, TG_INPUT, f->path, 0, "%s is longer than %zu bytes", key, size - 1);
    else
        memcpy(text, read, strlen(read) + 1);
done:
    status = 0; /* or nothing is released */
    if (read) fits_free_memory(read, &status);
    return code;
}

/* A file without DATASUM has nothing to check. */
static tg_code check_sum(tg_fits *f)
{
    int status = 0, data = 0, hdu = 0;
    if (fits_verify_chksum(f->handle, &data, &hdu, &status)) return fail_status(f, status, "DATASUM");
    if (data < 0)
        return tg_fail(
            f->e, TG_INPUT, f->path, 0,
            "its data do not match its DATASUM: it was damaged, or changed without a new sum; copy or export "
            "it again");
    return TG_OK;
}

tg_code tg_fits_samples(tg_fits *f, float *v)
{
    int status = 0, blanks;
    float none = NAN;
    const tg_code code = check_sum(f);
    if (code != TG_OK) return code;
    /* floats carry their own NaN; asking cfitsio to look for it would flush denormals to zero */
    fits_read_img(f->handle, TFLOAT, 1, (LONGLONG)(f->n[0] * f->n[1] * f->n[2]), f->bitpix > 0 ? &none : NULL, v,
                  &blanks, &status);
    return status ? fail_status(f, status, "data") : TG_OK;
}

tg_code tg_fits_column(tg_fits *f, const char *name, size_t rows, double *v, char unit[TG_FITS_WORD])
{
    tg_code code;
    int status = 0, column, type = 0, kind = 0, blanks;
    LONGLONG have = 0, repeat = 0, width = 0, row_bytes = 0;
    char key[FLEN_KEYWORD];
    double none = NAN;
    if (fits_get_hdu_type(f->handle, &type, &status) || type == IMAGE_HDU ||
        fits_get_colnum(f->handle, CASEINSEN, unconst(name), &column, &status))
        return tg_fail(f->e, TG_INPUT, f->path, 0, "the extension has no column %s", name);
    fits_get_num_rowsll(f->handle, &have, &status);
    fits_get_coltypell(f->handle, column, &kind, &repeat, &width, &status);
    fits_read_key(f->handle, TLONGLONG, "NAXIS1", &row_bytes, NULL, &status);
    if (status) return fail_status(f, status, name);
    if (have < 0 || (size_t)have != rows || repeat != 1 || row_bytes < width)
        return tg_fail(f->e, TG_INPUT, f->path, 0, "column %s has %lld rows of %lld values; %zu of one are needed",
                       name, have, repeat, rows);
    if (row_bytes > AXIS_MOST) return tg_fail(f->e, TG_INPUT, f->path, 0, "rows of %lld bytes", row_bytes);
    if ((code = check_length(f, rows * (size_t)row_bytes)) != TG_OK || (code = check_sum(f)) != TG_OK) return code;
    fits_make_keyn("TUNIT", column, key, &status);
    if ((code = tg_fits_text(f, key, unit, TG_FITS_WORD)) != TG_OK) return code;
    fits_read_col(f->handle, TDOUBLE, column, 1, 1, have, &none, v, &blanks, &status);
    return status ? fail_status(f, status, name) : TG_OK;
}

void tg_fits_close(tg_fits *f)
{
    int status = 0;
    if (f->handle) fits_close_file(f->handle, &status);
    fits_clear_errmsg();
    tg_output_drop(&f->output);
    *f = (tg_fits){0};
}

tg_code tg_fits_datasum(const char *path, char text[16], tg_error *e)
{
    tg_fits f;
    unsigned long data = 0, hdu = 0;
    int status = 0;
    tg_code code = tg_fits_open(&f, path, e);
    if (code != TG_OK) return code;
    if (fits_get_chksum(f.handle, &data, &hdu, &status))
        code = fail_status(&f, status, "DATASUM");
    else
        snprintf(text, 16, "%lu", data & 0xffffffffUL);
    tg_fits_close(&f);
    return code;
}

tg_code tg_fits_what(const char *path, tg_fits_kind *kind, tg_error *e)
{
    tg_fits f;
    char type[TG_FITS_WORD], geometry[TG_FITS_WORD];
    tg_code code = tg_fits_open(&f, path, e);
    if (code != TG_OK) return code;
    TG_TRY(tg_fits_text(&f, "CTYPE1", type, sizeof type));
    TG_TRY(tg_fits_text(&f, "SCANGEOM", geometry, sizeof geometry));
    const bool image = !strcasecmp(type, "X"); /* images carry the keywords of their scan */
    if (!strcasecmp(type, "CHANNEL") || (geometry[0] && !image))
        *kind = TG_FITS_SINOGRAM;
    else
        *kind = f.axes >= 2 ? TG_FITS_IMAGE : TG_FITS_OTHER;
done:
    tg_fits_close(&f);
    return code;
}

tg_code tg_fits_refuse(tg_fits *f, const char *axis, const char *wrong)
{
    char type[TG_FITS_WORD];
    const tg_code code = tg_fits_text(f, "CTYPE1", type, sizeof type);
    return code == TG_OK && !strcasecmp(type, axis) ? tg_fail(f->e, TG_INPUT, f->path, 0, "%s", wrong) : code;
}

tg_code tg_fits_create(tg_fits *f, const char *path, int axes, const size_t n[3], tg_error *e)
{
    tg_code code = TG_OK;
    fitsfile *handle = NULL;
    char disk[FLEN_FILENAME];
    LONGLONG size[3];
    *f = (tg_fits){.path = path, .e = e, .axes = axes};
    for (int i = 0; i < 3; i++) {
        f->n[i] = n[i];
        size[i] = (LONGLONG)n[i];
    }
    TG_TRY(tg_output_begin(path, &f->output, e));
    if (snprintf(disk, sizeof disk, "%s%s", f->output.beside[0] == '/' ? "" : "./", f->output.beside) >=
        (int)sizeof disk)
        TG_TRY(tg_fail(e, TG_MACHINE, path, 0, "the path is longer than %zu bytes", sizeof disk - 3));
    remove(f->output.beside); /* the name is reserved; cfitsio only makes new files */
    fits_create_diskfile(&handle, disk, &f->status);
    f->handle = handle;
    fits_create_imgll(handle, FLOAT_IMG, axes, size, &f->status);
    tg_fits_put_text(f, "CREATOR", TG_PROGRAM " " TG_VERSION, "program that wrote this file");
    tg_fits_put_text(f, "LONGSTRN", "OGIP 1.0", "long texts go on in CONTINUE cards");
done:
    if (code != TG_OK) tg_fits_close(f);
    return code;
}

void tg_fits_put_number(tg_fits *f, const char *key, double v, const char *comment)
{
    char text[32];
    int digits = 15; /* the fewest from 15 that read back as the same number */
    while (digits < 17 && (snprintf(text, sizeof text, "%.*g", digits, v), strtod(text, NULL) != v))
        digits++;
    if (v == rint(v) && fabs(v) < 0x1p53)
        fits_update_key_lng(f->handle, key, (LONGLONG)v, comment, &f->status);
    else
        fits_update_key_dbl(f->handle, key, v, -digits, comment, &f->status);
}

void tg_fits_put_text(tg_fits *f, const char *key, const char *v, const char *comment)
{
    char *ascii = tg_copy_text(v);
    if (v && !ascii) f->code = tg_no_memory(f->e, 1, strlen(v));
    if (!ascii) return;
    for (char *c = ascii; *c; c++)
        if (*c < ' ' || *c > '~') *c = '?'; /* a header holds printable ASCII only */
    fits_update_key_longstr(f->handle, key, ascii, comment, &f->status);
    tg_free(ascii);
}

void tg_fits_put_made(tg_fits *f, const tg_provenance *made)
{
    char key[FLEN_KEYWORD];
    if (!made) return;
    tg_fits_put_text(f, "COMMAND", made->command, "what it was made with");
    tg_fits_put_text(f, "PARAMS", made->parameters, NULL);
    for (size_t i = 0; made->inputs && i < made->inputs->n && i < 999; i++) { /* INPUT999 is the longest keyword */
        char text[TG_FITS_LONG];
        snprintf(text, sizeof text, "%s %s", made->inputs->input[i].path, made->inputs->input[i].sum);
        fits_make_keyn("INPUT", (int)i + 1, key, &f->status);
        tg_fits_put_text(f, key, text, NULL);
    }
}

void tg_fits_put_samples(tg_fits *f, const float *v)
{
    fits_write_img(f->handle, TFLOAT, 1, (LONGLONG)(f->n[0] * f->n[1] * f->n[2]), unconst(v), &f->status);
}

/* DATASUM, then CHECKSUM (FITS 4.0, appendix J). cfitsio's own call stamps them with the time. */
static void put_sums(tg_fits *f)
{
    unsigned long data = 0, hdu = 0;
    char text[17];
    fits_update_key_str(f->handle, "CHECKSUM", "0000000000000000", "of the HDU", &f->status);
    fits_update_key_str(f->handle, "DATASUM", "0", "of the data", &f->status);
    fits_flush_file(f->handle, &f->status); /* ends the header and fills the last block */
    fits_get_chksum(f->handle, &data, &hdu, &f->status);
    snprintf(text, sizeof text, "%lu", data & 0xffffffffUL);
    fits_update_key_str(f->handle, "DATASUM", text, "&", &f->status);
    fits_get_chksum(f->handle, &data, &hdu, &f->status);
    fits_encode_chksum(hdu, 1, text);
    fits_update_key_str(f->handle, "CHECKSUM", text, "&", &f->status);
}

void tg_fits_put_column(tg_fits *f, const char *extension, const char *name, const char *unit, size_t rows,
                        const double *v)
{
    char *names[] = {unconst(name)}, *units[] = {unconst(unit)};
    char format[] = "1D", *formats[] = {format};
    put_sums(f);
    fits_create_tbl(f->handle, BINARY_TBL, 0, 1, names, formats, units, extension, &f->status);
    fits_write_col(f->handle, TDOUBLE, 1, 1, 1, (LONGLONG)rows, unconst(v), &f->status);
}

tg_code tg_fits_finish(tg_fits *f)
{
    tg_code code = TG_OK;
    int closing = 0;
    put_sums(f);
    if (f->handle) fits_close_file(f->handle, &closing);
    f->handle = NULL;
    if (!f->status) f->status = closing;
    if (f->code != TG_OK) {
        code = f->code;
    } else if (f->status) {
        char text[FLEN_STATUS];
        fits_get_errstatus(f->status, text);
        code = tg_fail(f->e, TG_MACHINE, f->path, 0, "cannot write: %s (FITS status %d); is the disk full?", text,
                       f->status);
    } else {
        code = tg_output_commit(&f->output, f->e);
    }
    tg_fits_close(f);
    return code;
}
