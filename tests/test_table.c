#include "io/table.h"

#include "tests/near.h"

#include <stdlib.h>
#include <string.h>

static char *printed; /* by the last table */

static void print(const tg_row *head, const tg_row *row, size_t n)
{
    size_t size;
    free(printed);
    FILE *out = open_memstream(&printed, &size);
    ck_assert_ptr_nonnull(out);
    tg_table_print(out, head, row, n);
    fclose(out);
}

static void teardown(void)
{
    free(printed);
    printed = NULL;
}

START_TEST(columns_are_as_wide_as_their_cells)
{
    const tg_row head = {{"name", "empty", "value"}};
    const tg_row row[] = {{{"body", "", "1"}}, {{"long-name", "", "12"}}};
    print(&head, row, 2);
    ck_assert_str_eq(printed, "  name       value\n"
                              "  body       1\n"
                              "  long-name  12\n");
}
END_TEST

START_TEST(long_names_are_folded_and_wide_columns_cut)
{
    const tg_row head = {{"name", "a", "b"}};
    tg_row row[2] = {{{"short", "1", "2"}}};
    for (int c = 0; c < 3; c++)
        memset(row[1].cell[c], 'x', 40);
    print(&head, row, 2);
    /* 80 - 3 gaps of 2 - 24 for names leaves 50: 25 each, the last of them ~ */
    ck_assert_str_eq(printed, "  name                      a                          b\n"
                              "  short                     1                          2\n"
                              "  xxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxxx\n"
                              "                            xxxxxxxxxxxxxxxxxxxxxxxx~  xxxxxxxxxxxxxxxxxxxxxxxx~\n");
}
END_TEST

START_TEST(a_name_alone_runs_across_the_columns)
{
    const tg_row head = {{"measure, where", "value"}};
    const tg_row row[] = {{{"a measure of a long name [lp/cm]"}}, {{"  body", "1"}}};
    print(&head, row, 2);
    ck_assert_str_eq(printed, "  measure, where  value\n"
                              "  a measure of a long name [lp/cm]\n"
                              "    body          1\n");
}
END_TEST

START_TEST(a_cell_cuts_what_does_not_fit)
{
    char cell[TG_WORD];
    tg_cell(cell, "%0100d", 0);
    ck_assert_uint_eq(strlen(cell), TG_WORD - 1);
}
END_TEST

Suite *suite_table(void);
Suite *suite_table(void)
{
    SUITE_BEGIN("table", 10);
    tcase_add_checked_fixture(tcase, NULL, teardown);
    tcase_add_test(tcase, columns_are_as_wide_as_their_cells);
    tcase_add_test(tcase, long_names_are_folded_and_wide_columns_cut);
    tcase_add_test(tcase, a_name_alone_runs_across_the_columns);
    tcase_add_test(tcase, a_cell_cuts_what_does_not_fit);
    return suite;
}
