#include "io/fits_file.h"
#include "io/spelling.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

const tg_fits_unit tg_fits_lengths[] = {{"mm", 1}, {"cm", 10}, {"m", 1000}, {"um", 1e-3}, {NULL, 0}};
const tg_fits_unit tg_fits_angles[] = {{"deg", 1}, {"rad", 1 / TG_DEGREE}, {NULL, 0}};

double tg_fits_unit_size(const tg_fits_unit *units, const char *name)
{
    for (; units->name; units++)
        if (!strcmp(units->name, name)) return units->size;
    return NAN;
}

enum { KEY = 16 };
#define LEAST 1e-9
#define MOST 1e9 /* bounds of what an axis may hold, in any unit */

static const char *key_of(char key[KEY], const char *stem, int number)
{
    snprintf(key, KEY, "%s%d", stem, number);
    return key;
}

/* A word of the axis; where it is absent, the key joins the list of what is assumed. */
static tg_code word_of(tg_fits *f, const char *stem, int number, char word[TG_FITS_WORD], char missing[64])
{
    char key[KEY];
    const tg_code code = tg_fits_text(f, key_of(key, stem, number), word, TG_FITS_WORD);
    if (code == TG_OK && !word[0]) snprintf(missing + strlen(missing), 64 - strlen(missing), "%s ", key);
    return code;
}

tg_code tg_fits_axis_of(tg_fits *f, int number, tg_fits_axis *axis)
{
    tg_code code = TG_OK;
    char type[TG_FITS_WORD], unit[TG_FITS_WORD], key[KEY], missing[64] = "";
    double pixel = NAN, value = 0, step = NAN, size = 1;
    TG_TRY(word_of(f, "CTYPE", number, type, missing));
    TG_TRY(word_of(f, "CUNIT", number, unit, missing));
    if (type[0] && strcasecmp(type, axis->type) != 0)
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "CTYPE%d is '%s'; axis %d must be '%s'", number, tg_show(type).text,
                       number, axis->type));
    if (unit[0]) size = tg_fits_unit_size(axis->units, unit);
    if (isnan(size))
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "CUNIT%d is '%s', no unit of this axis; write '%s'", number,
                       tg_show(unit).text, axis->units->name));
    TG_TRY(tg_fits_number(f, key_of(key, "CRPIX", number), &pixel));
    if (isnan(pixel)) {
        snprintf(missing + strlen(missing), sizeof missing - strlen(missing), "CRPIX%d ", number);
        pixel = axis->pixel;
    }
    TG_TRY(tg_fits_number(f, key_of(key, "CRVAL", number), &value));
    TG_TRY(tg_fits_number(f, key_of(key, "CDELT", number), &step));
    if (axis->step_is && isnan(step))
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "%s is missing; write the %s in %s", key, axis->step_is,
                       axis->units->name));
    if (!isnan(step) && !(fabs(step) >= LEAST && fabs(step) <= MOST))
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "%s = %g is no step of an axis", key, step));
    if (fabs(pixel) > MOST || fabs(value) > MOST)
        TG_TRY(tg_fail(f->e, TG_INPUT, f->path, 0, "CRPIX%d or CRVAL%d lies far off the axis", number, number));
    if (missing[0])
        tg_warn(f->e, f->path, 0, "%smissing: axis %d is taken as %s in %s, pixel %.9g as its reference", missing,
                number, axis->type, axis->units->name, pixel);
    axis->pixel = pixel;
    axis->value = value * size;
    axis->step = isnan(step) ? axis->step : step * size;
done:
    return code;
}

double tg_fits_middle(size_t n)
{
    return 0.5 * ((double)n + 1);
}

double tg_fits_axis_zero(const tg_fits_axis *axis)
{
    return axis->pixel - 1 - axis->value / axis->step;
}

void tg_fits_put_axis(tg_fits *f, int number, const tg_fits_axis *axis)
{
    char key[KEY];
    tg_fits_put_text(f, key_of(key, "CTYPE", number), axis->type, NULL);
    tg_fits_put_text(f, key_of(key, "CUNIT", number), axis->units->name, NULL);
    tg_fits_put_number(f, key_of(key, "CRPIX", number), axis->pixel, "pixel of the reference, counted from 1");
    tg_fits_put_number(f, key_of(key, "CRVAL", number), axis->value, "coordinate of the reference");
    tg_fits_put_number(f, key_of(key, "CDELT", number), axis->step, "step");
}
