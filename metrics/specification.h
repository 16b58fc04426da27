#ifndef TG_SPECIFICATION_H
#define TG_SPECIFICATION_H
#include "io/fields.h"
#include "io/image.h"
#include "metrics/target.h"

/** One line of a specification. `in` and `at` both name a solid: whichever reads better. */
typedef struct {
    tg_text measure, in, at, source;
    tg_number by;      /* choice */
    tg_number nominal; /* NaN with a line: "computed" */
    tg_number tolerance, low, high;
    int line;
} tg_check;

/** What the image must be for the specification to speak of it; not given: any. */
typedef struct {
    tg_text kernel, method;
    tg_number kv, energy, slice;
} tg_conditions;

typedef struct {
    tg_text name;
    char *path;
    tg_conditions conditions;
    tg_number unit; /* choice HU or 1/mm: that of limits on CT numbers and what is made of them */
    tg_list checks; /* of tg_check */
} tg_specification;

/** Read and check one: measures known, solids in the phantom (NULL: not looked at), limits that make sense. */
tg_code tg_specification_read(const char *path, const tg_phantom *phantom, tg_specification *s, tg_error *e);
void tg_specification_free(tg_specification *s);

/** The solid that a check looks at. */
const char *tg_check_solid(const tg_check *c);

/** Report a solid that the phantom does not have, with the nearest one. */
tg_code tg_solid_unknown(const tg_phantom *phantom, const char *key, const tg_text *name, const char *path,
                         tg_error *e);

/** @param why  {200} what differs  @return false: no specification for these conditions */
bool tg_specification_covers(const tg_specification *s, const tg_image *image, char why[200]);

#endif
