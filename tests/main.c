/* The runner: `check` runs every suite but the long ones, `check NAME` one of them. */
#include "io/process.h"

#include <check.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define SUITE(name) Suite *suite_##name(void);
#include "suites.h"
#undef SUITE

int main(int argc, char **argv)
{
    tg_process_start();
    static const struct {
        const char *name;
        Suite *(*make)(void);
    } suites[] = {
#define SUITE(name) {#name, suite_##name},
#include "suites.h"
#undef SUITE
    };
    SRunner *runner = srunner_create(NULL);
    srunner_set_fork_status(runner, CK_NOFORK); /* forking hangs once OpenMP has run */
    for (size_t i = 0; i < sizeof suites / sizeof *suites; i++)
        if (argc < 2 || !strcmp(argv[1], suites[i].name)) srunner_add_suite(runner, suites[i].make());
    srunner_run_all(runner, CK_NORMAL);
    const int failed = srunner_ntests_failed(runner), ran = srunner_ntests_run(runner);
    srunner_free(runner);
    printf("%d passed, %d failed\n", ran - failed, failed);
    return failed || !ran ? EXIT_FAILURE : EXIT_SUCCESS;
}
