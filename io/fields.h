#ifndef TG_FIELDS_H
#define TG_FIELDS_H
/** One table of fields per description: the same row serves the YAML reader, the command line and its help, the
 *  keywords of a file and the parameters recorded with a result, so a key, its unit, range, default and sentence
 *  are written once. */
#include "io/error.h"
#include "io/spelling.h"

#include <float.h>

/** Values as they were given. line 0: not given, v holds the default. */
typedef struct {
    double v;
    int line;
} tg_number;
typedef struct {
    char *v; /* owned; NULL: none */
    int line;
} tg_text;
typedef struct {
    double v[3];
    int line;
} tg_vector;
typedef struct {
    void *v; /* {n} items of tg_field.item_size bytes, owned */
    size_t n;
    int line;
} tg_list;

typedef enum {
    TG_NUMBER,  /* tg_number: a finite decimal number, or one of `words`: then v = NaN and line is given */
    TG_INTEGER, /* tg_number holding a whole number of at most 2^53 */
    TG_SWITCH,  /* tg_number: true or false; on a command line the bare option */
    TG_CHOICE,  /* tg_number: the index of one of `words` */
    TG_TEXT,    /* tg_text */
    TG_PATH,    /* tg_text: in a description, relative to the file that holds it; resolved on reading */
    TG_VECTOR2, /* tg_vector: [x, y]; on a command line x,y */
    TG_VECTOR3, /* tg_vector: [x, y, z] */
    TG_GROUP,   /* a mapping with its own table `item`, stored in place at `at` */
    TG_LIST,    /* tg_list of mappings with the table `item` */
    TG_LINE     /* int: the line where the mapping itself starts; the first row of a table, see TG_LINE_AT */
} tg_kind;

#define TG_ABOVE_ZERO DBL_TRUE_MIN /* as `low`: any number greater than zero */

typedef struct tg_field {
    const char *key; /* NULL ends a table */
    tg_kind kind;
    size_t at;                   /* offsetof the value in the struct */
    const char *unit;            /* "mm"; NULL: none */
    const char *words;           /* "cylinder sphere": of TG_CHOICE, special ones of TG_NUMBER, known ones of TG_TEXT */
    const char *standard;        /* the default as one would write it; NULL: none (NaN, NULL, or an empty list) */
    const char *what;            /* one sentence without a full stop, for --help and error messages; never NULL */
    double low, high;            /* inclusive; both 0: any; +-DBL_MAX: no such limit. Of each component of a vector */
    const struct tg_field *item; /* TG_GROUP, TG_LIST */
    size_t item_size;            /* TG_LIST */
    bool required;
} tg_field;

/** A row of a table for a value that is a member of a struct; the rest as designated initialisers: .unit = "mm". */
#define TG_ROW(type, key_, kind_, member, ...) \
    { \
        .key = (key_), .kind = (kind_), .at = offsetof(type, member), __VA_ARGS__ \
    }

/** The first row of a table: stores the line of a mapping in the int member `line` of a struct. */
#define TG_LINE_AT(type) \
    { \
        .key = "", .kind = TG_LINE, .at = offsetof(type, line), .what = "" \
    }

/** Fill a zeroed struct with the defaults of its table.
 *  @return TG_OK or TG_MACHINE */
tg_code tg_fields_default(const tg_field *fields, void *base, tg_error *e);

/** Release every text and list that the table owns; the struct is then all zero values. */
void tg_fields_free(const tg_field *fields, void *base);

/** The row of a key, or NULL. */
const tg_field *tg_fields_find(const tg_field *fields, const char *key);

/** The line where a value was given; 0: it was not, and the default stands. */
int tg_field_line(const tg_field *field, const void *base);

/** What a value may be, for people: "0.1 to 20 mm", "above 0 mm", "cylinder, sphere or box", "a number or computed".
 *  @return out */
const char *tg_field_range(const tg_field *field, char out[256]);

/** Convert and check one text (not TG_GROUP or TG_LIST) and store it; the old value is released.
 *  @param text       a vector is written "x,y,z"
 *  @param file,line  where the user wrote it (line 0, as on a command line: 1 is stored, so that it counts as given)
 *  @return TG_OK, TG_INPUT (TG_USAGE where file is NULL), TG_MACHINE */
tg_code tg_field_set(const tg_field *field, void *base, const char *text, const char *file, int line, tg_error *e);

/** Report an unknown key with the nearest known one. */
tg_code tg_fields_unknown(const tg_field *fields, const char *key, const char *file, int line, tg_error *e);

/** The values as "key=value key=value", defaults included, lists left out: for provenance records.
 *  @return bytes that the full text needs, as snprintf does */
size_t tg_fields_text(const tg_field *fields, const void *base, char *out, size_t size);

#endif
