#ifndef TG_EMBEDDED_H
#define TG_EMBEDDED_H
#include <stddef.h>

/** A file built into the program (scripts/embed writes the table): example descriptions, and what pages are made of. */
typedef struct {
    const char *name;           /* "rods-disc.yaml"; NULL ends the table */
    const unsigned char *bytes; /* {n}, and a NUL behind them */
    size_t n;
} tg_embedded;

extern const tg_embedded tg_embedded_files[];

/** The text of a file by name; NULL when there is none. */
const char *tg_embedded_text(const char *name);

#endif
