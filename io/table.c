#include "io/table.h"

#include <stdarg.h>
#include <string.h>

enum { PAGE = 80, GAP = 2, NAME = 24 };

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

/* Names alone in a row run across the others' columns. */
static bool heading(const tg_row *r)
{
    for (int c = 1; c < TG_COLUMNS; c++)
        if (*r->cell[c]) return false;
    return true;
}

static void widen(int width[TG_COLUMNS], const tg_row *r, bool filled_only)
{
    for (int c = 0; c < TG_COLUMNS; c++) {
        const int n = (int)strlen(r->cell[c]);
        if (n > width[c] && (width[c] || !filled_only)) width[c] = n;
    }
}

/* Narrower columns where the page asks for it: names first, which can stand in a line of their own, then the widest. */
static void fit(int width[TG_COLUMNS])
{
    int sum = 0;
    for (int c = 0; c < TG_COLUMNS; c++)
        sum += width[c] ? width[c] + GAP : 0;
    for (; sum > PAGE && width[0] > NAME; sum--)
        width[0]--;
    for (; sum > PAGE; sum--) {
        int widest = 1;
        for (int c = 2; c < TG_COLUMNS; c++)
            if (width[c] > width[widest]) widest = c;
        width[widest]--;
    }
}

static void print_folded(FILE *out, const tg_row *r, const int width[TG_COLUMNS])
{
    tg_row rest = *r;
    if ((int)strlen(r->cell[0]) > width[0] || heading(r)) {
        fprintf(out, "%*s%s\n", GAP, "", r->cell[0]);
        *rest.cell[0] = '\0';
    }
    if (!heading(r)) print_row(out, &rest, width);
}

void tg_table_print(FILE *out, const tg_row *head, const tg_row *row, size_t n)
{
    int width[TG_COLUMNS] = {0};
    for (size_t i = 0; i < n; i++)
        if (!heading(&row[i])) widen(width, &row[i], false);
    widen(width, head, true);
    fit(width);
    print_row(out, head, width);
    for (size_t i = 0; i < n; i++)
        print_folded(out, &row[i], width);
}
