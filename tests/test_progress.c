#include "io/progress.h"

#include "tests/near.h"

#include <omp.h>

START_TEST(steps_grow_while_they_are_short)
{
    ck_assert_uint_eq(tg_progress_items(0, 0), (size_t)omp_get_max_threads()); /* no thread idles */
    ck_assert_uint_eq(tg_progress_items(8, 0.01), 16);
    ck_assert_uint_eq(tg_progress_items(8, 0.09), 8);
    ck_assert_uint_eq(tg_progress_items(8, 60), 8); /* a single view may take that long: no thread shall idle */
}
END_TEST

START_TEST(the_clock_goes_forward)
{
    const double start = tg_seconds();
    ck_assert(tg_seconds() >= start && start > 0);
}
END_TEST

Suite *suite_progress(void);
Suite *suite_progress(void)
{
    SUITE_BEGIN("progress", 10);
    tcase_add_test(tcase, steps_grow_while_they_are_short);
    tcase_add_test(tcase, the_clock_goes_forward);
    return suite;
}
