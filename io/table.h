#ifndef TG_TABLE_H
#define TG_TABLE_H
/** Tables for a page of 80 columns. */
#include "io/spelling.h"

#include <stdio.h>

enum { TG_COLUMNS = 6 };

typedef struct {
    char cell[TG_COLUMNS][TG_WORD];
} tg_row;

/** Fill a cell, printf-like; what does not fit is cut. */
void tg_cell(char cell[TG_WORD], const char *format, ...) __attribute__((format(printf, 2, 3)));

/** Print rows below a heading. A column without any text is left out. A row with nothing but a name runs across the
 *  columns. Where the page is too narrow a long name stands in a line of its own above the rest of its row; if that is
 *  not enough the widest columns shrink, and what they cannot hold ends in ~.  @param row  {n} */
void tg_table_print(FILE *out, const tg_row *head, const tg_row *row, size_t n);

#endif
