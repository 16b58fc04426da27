#include "io/table.h"

#include <stdarg.h>
#include <string.h>

enum { PAGE = 80, GAP = 2 };

void tg_cell(char cell[TG_WORD], const char *format, ...)
{
    va_list args;
    va_start(args, format);
    vsnprintf(cell, TG_WORD, format, args);
    va_end(args);
}

static void print_row(FILE *out, const tg_row *r, const int width[TG_COLUMNS])
{
    char text[TG_COLUMNS * (TG_WORD + GAP) + 1] = "";
    size_t n = 0;
    for (int c = 0; c < TG_COLUMNS; c++) {
        if (!width[c]) continue;
        const bool cut = (int)strlen(r->cell[c]) > width[c];
        n += (size_t)snprintf(text + n, sizeof text - n, "%*s%-*.*s%s", GAP, "", cut ? 0 : width[c], width[c] - cut,
                              r->cell[c], cut ? "~" : "");
    }
    while (n && text[n - 1] == ' ')
        n--;
    fprintf(out, "%.*s\n", (int)n, text);
}

static void widen(int width[TG_COLUMNS], const tg_row *r, bool filled_only)
{
    for (int c = 0; c < TG_COLUMNS; c++) {
        const int n = (int)strlen(r->cell[c]);
        if (n > width[c] && (width[c] || !filled_only)) width[c] = n;
    }
}

void tg_table_print(FILE *out, const tg_row *head, const tg_row *row, size_t n)
{
    int width[TG_COLUMNS] = {0}, sum = 0;
    for (size_t i = 0; i < n; i++)
        widen(width, &row[i], false);
    widen(width, head, true);
    for (int c = 0; c < TG_COLUMNS; c++)
        sum += width[c] ? width[c] + GAP : 0;
    for (; sum > PAGE; sum--) {
        int widest = 1; /* the first column holds names: it stays whole */
        for (int c = 2; c < TG_COLUMNS; c++)
            if (width[c] > width[widest]) widest = c;
        width[widest]--;
    }
    print_row(out, head, width);
    for (size_t i = 0; i < n; i++)
        print_row(out, &row[i], width);
}
