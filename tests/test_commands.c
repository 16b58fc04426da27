/* The program as its users meet it: exit statuses, messages, help. $TOMOGAUGE names it. */
#include "io/version.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <spawn.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

extern char **environ;

static char program[4096], phantoms[4096];
static char out[65536], err[65536]; /* what the last run printed */

static void setup(void)
{
    const char *given = getenv("TOMOGAUGE");
    ck_assert_msg(given && realpath(given, program), "TOMOGAUGE must name the program");
    ck_assert_ptr_nonnull(realpath("phantoms", phantoms));
    scratch_begin();
    ck_assert_int_eq(chdir(scratch_folder), 0);
}

static void teardown(void)
{
    ck_assert_int_eq(chdir(phantoms), 0);
    ck_assert_int_eq(chdir(".."), 0);
    scratch_end();
}

static void slurp(const char *path, char *text, size_t size)
{
    FILE *f = fopen(path, "rb");
    ck_assert_ptr_nonnull(f);
    const size_t n = fread(text, 1, size - 1, f);
    text[n] = '\0';
    fclose(f);
}

/* Run the program through a shell in the folder of the test; `arguments` may redirect. */
static int run(const char *arguments)
{
    char command[3 * 4096];
    snprintf(command, sizeof command, "PHANTOMS=%s; { '%s' %s; } >out 2>err </dev/null", phantoms, program, arguments);
    const int status = system(command);
    ck_assert_msg(WIFEXITED(status), "%s did not exit", arguments);
    slurp("out", out, sizeof out);
    slurp("err", err, sizeof err);
    return WEXITSTATUS(status);
}

static void assert_narrow(const char *text)
{
    for (const char *line = text; *line;) {
        const int n = (int)strcspn(line, "\n");
        ck_assert_msg(n <= 80, "%d columns: %.*s", n, n, line);
        line += n + (line[n] == '\n');
    }
}

/* Exactly this one line on standard error. */
static void assert_message(const char *message)
{
    char want[1024];
    snprintf(want, sizeof want, TG_PROGRAM ": %s\n", message);
    ck_assert_str_eq(err, want);
}

START_TEST(help_of_the_program)
{
    ck_assert_int_eq(run("--help"), 0);
    assert_narrow(out);
    ck_assert_ptr_nonnull(strstr(out, "Usage: tomogauge COMMAND"));
    ck_assert_ptr_nonnull(strstr(out, "Exit status:"));
    ck_assert_ptr_nonnull(strstr(out, "Not for diagnosis."));
    ck_assert_str_eq(err, "");
    char help[sizeof out];
    strcpy(help, out);
    ck_assert_int_eq(run(""), 2); /* nothing was asked: a script should notice */
    ck_assert_str_eq(out, help);
    ck_assert_int_eq(run("--version"), 0);
    ck_assert_str_eq(out, TG_PROGRAM " " TG_VERSION "\n");
}
END_TEST

/* The names under "Commands:" in the help. @return how many */
static int list_commands(char name[16][32])
{
    char help[sizeof out];
    run("--help");
    strcpy(help, out);
    const char *from = strstr(help, "Commands:\n");
    int n = 0;
    for (from = strchr(from, '\n') + 1; *from != '\n'; from = strchr(from, '\n') + 1)
        if (from[2] != ' ') ck_assert_int_eq(sscanf(from, " %31s", name[n++]), 1);
    return n;
}

START_TEST(help_of_every_command)
{
    char name[16][32];
    const int n = list_commands(name);
    ck_assert_int_ge(n, 1);
    for (int i = 0; i < n; i++) {
        char arguments[600], usage[600];
        snprintf(arguments, sizeof arguments, "%s --help", name[i]);
        snprintf(usage, sizeof usage, "Usage: tomogauge %s ", name[i]);
        ck_assert_int_eq(run(arguments), 0);
        assert_narrow(out);
        ck_assert_msg(strstr(out, usage) == out, "%s: %s", name[i], out);
        ck_assert_ptr_nonnull(strstr(out, "--threads N"));
        ck_assert_ptr_nonnull(strstr(out, "Example:\n  tomogauge "));
        ck_assert_ptr_nonnull(strstr(out, "Not for diagnosis."));
        ck_assert_str_eq(err, "");
    }
}
END_TEST

/* Wrong command lines: status 2 and one line that says what to do. */
static const struct {
    const char *arguments, *message;
} misuse[] = {
    {"simulat", "unknown command 'simulat'; did you mean 'simulate'?"},
    {"xyzzy", "unknown command 'xyzzy'; 'tomogauge --help' lists them"},
    {"simulate --photns 3", "unknown option '--photns'; did you mean '--photons'?"},
    {"simulate --forc", "unknown option '--forc'; did you mean '--force'?"},
    {"simulate --xyzzy=3", "unknown option '--xyzzy=3'; 'tomogauge simulate --help' lists them"},
    {"simulate --photons", "--photons needs a value; 'tomogauge simulate --help' says which"},
    {"simulate --check=3", "--check=3 takes no value"},
    {"simulate --photons 8,5", "--photons: '8,5' is not a number; write 8.5"},
    {"simulate --threads 0", "--threads: 0 is out of range; write a whole number from 1 to 1024"},
    {"simulate --threads 1.5", "--threads: '1.5' is not a whole number; write a whole number from 1 to 1024"},
    {"simulate a.yaml -o b", "simulate needs PHANTOM.yaml SCANNER.yaml; 'tomogauge simulate --help' shows an example"},
    {"simulate a b c -o d", "'c' is one file too many; simulate takes PHANTOM.yaml SCANNER.yaml"},
    {"simulate a b", "option -o is missing: say where the result goes, -o SINO.fits"},
};

START_TEST(a_wrong_command_line_ends_with_2)
{
    ck_assert_int_eq(run(misuse[_i].arguments), 2);
    assert_message(misuse[_i].message);
    ck_assert_str_eq(out, "");
}
END_TEST

START_TEST(a_wrong_input_ends_with_3)
{
    scratch_write("p.yaml", "phantom: p\nmaterials:\n  - {name: water, mu: 0.02}\nsolids:\n"
                            "  - {name: body, shape: cylindr, material: water, radius: 8 mm, length: 10}\n");
    ck_assert_int_eq(run("simulate p.yaml $PHANTOMS/scanner-parallel.yaml -o s.fits"), 3);
    ck_assert_str_eq(err, "tomogauge: p.yaml:5: shape: 'cylindr' is not known; did you mean 'cylinder'?\n"
                          "tomogauge: p.yaml:5: radius: '8 mm' is not a number; write 8, in mm\n");
    ck_assert_int_ne(access("s.fits", F_OK), 0);
    ck_assert_int_eq(run("simulate none.yaml $PHANTOMS/scanner-parallel.yaml -o s.fits"), 3);
    ck_assert_ptr_nonnull(strstr(err, "tomogauge: none.yaml: "));
}
END_TEST

START_TEST(messages_are_plain_lines_and_counted)
{
    char text[4096] = "phantom: p\nmaterials:\n  - name: water\n";
    for (int i = 0; i < 30; i++)
        snprintf(text + strlen(text), sizeof text - strlen(text), "    \"\\e[2J\\n%d\": 1\n", i);
    scratch_write("p.yaml", text);
    ck_assert_int_eq(run("simulate p.yaml $PHANTOMS/scanner-parallel.yaml -o s.fits"), 3);
    int lines = 0;
    for (const char *s = err; *s; s++) {
        lines += *s == '\n';
        ck_assert_msg(*s == '\n' || (unsigned char)*s >= ' ', "control character %d in a message", *s);
    }
    ck_assert_int_eq(lines, 21);
    ck_assert_ptr_nonnull(strstr(err, "\ntomogauge: and "));
}
END_TEST

START_TEST(what_cannot_be_printed_ends_with_4)
{
    ck_assert_int_eq(run("--help >/dev/full"), 4);
    assert_message("cannot write to standard output: No space left on device");
    ck_assert_int_eq(run("--help >&-"), 4);
    ck_assert_int_eq(run("--version 2>&-"), 0);
}
END_TEST

START_TEST(a_scan_is_simulated_and_nothing_foreign_is_replaced)
{
    scratch_write("scanner.yaml", "scanner: small\ngeometry: parallel\nchannels: 64\npitch: 4\nviews: 90\narc: 180\n");
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o s.fits --threads 2"), 0);
    ck_assert_str_eq(err, ""); /* no bar where no terminal is */
    ck_assert_int_eq(access("s.fits", F_OK), 0);
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o s.fits"), 0); /* its own file */
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o scanner.yaml"), 2);
    scratch_write("mine.txt", "mine\n");
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o mine.txt"), 2);
    char text[16];
    slurp("mine.txt", text, sizeof text);
    ck_assert_str_eq(text, "mine\n");
    ck_assert_int_eq(run("simulate --force $PHANTOMS/water-disc.yaml scanner.yaml -o mine.txt"), 0);
    ck_assert_int_eq(run("simulate --check $PHANTOMS/water-disc.yaml scanner.yaml"), 0);
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o none/s.fits"), 2);
}
END_TEST

/* A machine without pseudo-terminals (a bare root folder) cannot show what happens on one. */
static bool has_terminals(void)
{
    const int terminal = posix_openpt(O_RDWR | O_NOCTTY);
    if (terminal >= 0) close(terminal);
    if (terminal < 0) fputs("commands: no pseudo-terminal here, interrupts not tested\n", stderr);
    return terminal >= 0;
}

/* Start the program with a terminal as its standard error. @return the process; *terminal: our end */
static pid_t start_on_terminal(char **argv, int *terminal)
{
    *terminal = posix_openpt(O_RDWR | O_NOCTTY);
    ck_assert_int_ge(*terminal, 0);
    ck_assert_int_eq(grantpt(*terminal), 0);
    ck_assert_int_eq(unlockpt(*terminal), 0);
    posix_spawn_file_actions_t actions;
    posix_spawn_file_actions_init(&actions);
    posix_spawn_file_actions_addopen(&actions, 2, ptsname(*terminal), O_RDWR | O_NOCTTY, 0);
    pid_t child;
    ck_assert_int_eq(posix_spawn(&child, program, &actions, NULL, argv, environ), 0);
    posix_spawn_file_actions_destroy(&actions);
    return child;
}

/* Wait until a terminal shows a text, at most 20 s. */
static bool shows(int terminal, const char *text)
{
    size_t n = 0;
    err[0] = '\0';
    for (struct pollfd p = {.fd = terminal, .events = POLLIN}; poll(&p, 1, 20000) > 0;) {
        const ssize_t got = read(terminal, err + n, sizeof err - 1 - n);
        if (got <= 0) return false;
        n += (size_t)got;
        err[n] = '\0';
        if (strstr(err, text)) return true;
    }
    return false;
}

START_TEST(an_interrupt_cleans_up_and_ends_as_interrupts_do)
{
    if (!has_terminals()) return;
    /* a minute of work: it must be stopped */
    scratch_write("scanner.yaml", "scanner: slow\ngeometry: parallel\nchannels: 500\npitch: 0.5\nviews: 20000\n"
                                  "subrays: 25\n");
    char phantom[8192];
    snprintf(phantom, sizeof phantom, "%s/rods-disc.yaml", phantoms);
    char *argv[] = {program,        (char[]){"simulate"}, phantom, (char[]){"scanner.yaml"},
                    (char[]){"-o"}, (char[]){"s.fits"},   NULL};
    static const int number[] = {SIGINT, SIGTERM};
    for (int i = 0; i < 2; i++) {
        int terminal, status;
        const pid_t child = start_on_terminal(argv, &terminal);
        const bool bar = shows(terminal, " %");
        kill(child, number[i]);
        while (bar && shows(terminal, "\r")) {
        } /* until it closes its end */
        ck_assert_int_eq(waitpid(child, &status, 0), child);
        close(terminal);
        ck_assert_msg(bar, "no progress within 20 s: %s", err);
        ck_assert_msg(WIFSIGNALED(status) && WTERMSIG(status) == number[i], "status %d", status);
        ck_assert_uint_eq(scratch_files(), 1); /* the scanner: nothing is left */
    }
}
END_TEST

static void assert_shows(const char *text)
{
    ck_assert_msg(strstr(out, text), "no '%s' in: %s", text, out);
}

START_TEST(show_tells_what_a_description_holds)
{
    static const struct {
        const char *name, *text;
    } file[] = {
        {"rods-disc.yaml", "Phantom rods-disc: 9 solids of 9 materials"},
        {"rods-disc.yaml", "  ptfe-rod              cylinder  ptfe              49, 9, 0     18, 18, 60\n"},
        {"ramp-block.yaml",
         "  ramp-right  box       aluminium  0, 20, 0     80, 20, 0.2   14 deg\n"}, /* ramp: atan 1/4 */
        {"scanner-fan-equiangular.yaml", "  source to axis      560 mm\n"},
        {"scanner-fan-equiangular.yaml",
         "  channels            736, pitch 0.390954 mm at the axis\n"}, /* 560 x 0.04 deg */
        {"spec-wire-edge-disc.yaml", "  mtf50      wire   wire  computed  +- 0.5\n"},
        {"demo-job.yaml", "\n  reconstruction  method  kernel "},
    };
    for (size_t i = 0; i < sizeof file / sizeof *file; i++) {
        char arguments[200];
        snprintf(arguments, sizeof arguments, "show $PHANTOMS/%s", file[i].name);
        ck_assert_msg(run(arguments) == 0, "%s: %s", file[i].name, err);
        assert_narrow(out);
        assert_shows(file[i].text);
    }
    /* water at 60 keV: 0.2059 cm2/g (Hubbell and Seltzer 1995); xraylib's tables agree within 0.3 % */
    ck_assert_int_eq(run("show --energy 60 $PHANTOMS/water-disc.yaml"), 0);
    double density, mu, hu;
    ck_assert_int_eq(sscanf(strstr(strstr(out, "density"), "  water"), " water %lf %lf %lf", &density, &mu, &hu), 3);
    CK_NEAR(mu, 0.02059, 3e-3, 0, "NIST");
    ck_assert(density == 1 && hu == 0);
}
END_TEST

START_TEST(show_prints_examples)
{
    ck_assert_int_eq(run("show --example rods-disc"), 0);
    char file[sizeof out], path[8192];
    snprintf(path, sizeof path, "%s/rods-disc.yaml", phantoms);
    slurp(path, file, sizeof file);
    ck_assert_str_eq(out, file);
    ck_assert_int_eq(run("show --example rod-disc"), 2);
    assert_message("--example: there is no 'rod-disc'; did you mean 'rods-disc'?");
    ck_assert_int_eq(run("show --example xyzzy"), 2);
    ck_assert_ptr_nonnull(strstr(err, "there are: acrylic-disc, "));
}
END_TEST

START_TEST(show_knows_other_files_and_refuses_the_rest)
{
    scratch_write("kernel.txt", "# fraction and window\n0 1\n0.5 0.5\n1 0\n");
    ck_assert_int_eq(run("show kernel.txt"), 0);
    assert_shows("Kernel file: 3 rows");
    scratch_write("letter.txt", "Dear reader\n");
    ck_assert_int_eq(run("show letter.txt"), 3);
    ck_assert_int_eq(run("show ."), 3);
    ck_assert_int_eq(run("show none"), 3);
    ck_assert_int_eq(run("show"), 2);
    assert_message("show needs a FILE or --example NAME");
    ck_assert_int_eq(run("show --png kernel.txt -o k.png"), 2);
    ck_assert_int_eq(run("show kernel.txt -o k.png"), 2);
    assert_message("a picture needs both: --png -o FILE.png");
}
END_TEST

START_TEST(a_scan_becomes_an_image_and_a_picture)
{
    scratch_write("scanner.yaml", "scanner: small\ngeometry: parallel\nchannels: 64\npitch: 4\nviews: 90\narc: 180\n");
    ck_assert_int_eq(run("simulate $PHANTOMS/water-disc.yaml scanner.yaml -o s.fits"), 0);
    ck_assert_int_eq(run("show s.fits"), 0);
    assert_narrow(out);
    assert_shows("  channels            64, pitch 4 mm at the axis\n");
    assert_shows("  views               90 from 0 deg in steps of 2 deg\n");
    assert_shows("  scanner that scanned it: small\n");
    ck_assert_int_eq(run("reconstruct s.fits --pixels 32 --kernel hann@0.9 -o i.fits"), 0);
    ck_assert_int_eq(run("show i.fits"), 0);
    assert_narrow(out);
    assert_shows("  pixels              32 x 32 of 7.875 x 7.875 mm\n"); /* 63 pitches wide */
    assert_shows("  kernel              hann@0.9\n");
    ck_assert_int_eq(run("show --png i.fits -o i.png --level 0 --width 100"), 0);
    char png[64];
    slurp("i.png", png, sizeof png);
    ck_assert_int_eq(memcmp(png, "\x89PNG", 4), 0);
    ck_assert_int_eq(run("show --png s.fits -o j.png"), 2);
    ck_assert_int_eq(run("show --png i.fits -o j.png --slice 2"), 2);
    assert_message("--slice: the image has 1 of them");
    ck_assert_int_eq(run("show --png i.fits -o i.fits"), 2); /* not over its input */
}
END_TEST

/* Files that stand where others belong: one line says what the file is. */
static const struct {
    const char *command;
    int status;
    const char *says;
} swapped[] = {
    {"simulate scanner.yaml scanner.yaml -o x.fits", 3, "scanner.yaml:1: is not a description of a phantom"},
    {"simulate s.fits scanner.yaml -o x.fits", 3, "s.fits: is a FITS file; a description in YAML is expected here"},
    {"simulate . scanner.yaml -o x.fits", 3, ".: is not a file"},
    {"reconstruct i.fits -o x.fits", 3, "i.fits: is an image; a sinogram is expected here"},
    {"measure s.fits --phantom p.yaml", 3, "s.fits: is a sinogram; an image is expected here: reconstruct it first"},
    {"measure i.fits j.fits --phantom p.yaml --check", 3,
     "j.fits: is no repeat of the first image, it lies on another"},
    {"measure i.fits i.fits --phantom p.yaml", 3, "i.fits: is named twice"},
    {"measure i.fits ./i.fits --phantom p.yaml", 3, "./i.fits: holds the same pixels as i.fits"},
    {"evaluate p.yaml -o x", 3, "p.yaml:1: is not a description of a job"},
    {"reconstruct one.fits -o x.fits", 3, "one.fits: no view between"},
    {"reconstruct s.fits --kernel han -o x.fits", 2, "--kernel: 'han' is no window"},
    {"reconstruct s.fits --method fpb -o x.fits", 2, "--method: 'fpb' is not known; did you mean 'fbp'?"},
    /* told before the work, not after it */
    {"reconstruct none.fits -o none/x.fits", 2, "none/x.fits: its folder does not exist"},
    {"reconstruct none.fits -o p.yaml", 2, "p.yaml: stands already"},
    {"evaluate job.yaml --check -o p.yaml", 2, "p.yaml: cannot make the folder: a file of that name stands there"},
    {"evaluate job.yaml --check -o p.yaml/x", 2, "p.yaml: cannot make the folder: a file of that name stands there"},
};

START_TEST(swapped_files_are_told_in_one_line)
{
    scratch_write("p.yaml", "phantom: p\nmaterials: [{name: water, hu: 0}]\n"
                            "solids: [{name: body, shape: cylinder, material: water, radius: 50, length: 20}]\n");
    scratch_write("scanner.yaml", "scanner: small\ngeometry: parallel\nchannels: 64\npitch: 4\nviews: 90\narc: 180\n");
    scratch_write("one.yaml", "scanner: one\ngeometry: parallel\nchannels: 64\npitch: 4\nviews: 1\n");
    scratch_write("job.yaml", "job: j\nphantom: p.yaml\nscanner: scanner.yaml\nreconstructions: [{name: a}]\n");
    ck_assert_int_eq(run("simulate p.yaml scanner.yaml -o s.fits"), 0);
    ck_assert_int_eq(run("simulate p.yaml one.yaml -o one.fits"), 0);
    ck_assert_int_eq(run("reconstruct s.fits --pixels 16 -o i.fits"), 0);
    ck_assert_int_eq(run("reconstruct s.fits --pixels 17 -o j.fits"), 0);
    ck_assert_int_eq(run(swapped[_i].command), swapped[_i].status);
    ck_assert_msg(!strncmp(err, TG_PROGRAM ": ", 11) && !strncmp(err + 11, swapped[_i].says, strlen(swapped[_i].says)),
                  "%s\nsays %s", swapped[_i].command, err);
    ck_assert_ptr_eq(strchr(err, '\n') + 1, strchr(err, '\0'));
    ck_assert_int_ne(access("x.fits", F_OK), 0);
}
END_TEST

/* Exit statuses of a job: the scan is water, so 0 HU passes, 100 HU fails, and a body is no wire. */
static const struct {
    const char *check, *verdict;
    int status;
} judged[] = {
    {"measure: ct-number, in: body, nominal: 0, tolerance: 50", "pass", 0},
    {"measure: ct-number, in: body, nominal: 100, tolerance: 50", "fail", 1},
    {"measure: mtf50, at: body, by: wire, low: 1", "inconclusive", 5},
};

START_TEST(the_verdict_is_the_exit_status)
{
    char text[256];
    scratch_write("p.yaml", "phantom: p\nmaterials: [{name: water, compound: \"Water, Liquid\"}]\n"
                            "solids: [{name: body, shape: cylinder, material: water, radius: 50, length: 20}]\n");
    scratch_write("scanner.yaml", "scanner: s\ngeometry: parallel\nchannels: 160\npitch: 0.8\nviews: 240\narc: 180\n"
                                  "photons: 1e6\n");
    scratch_write("j.yaml", "job: j\nphantom: p.yaml\nscanner: scanner.yaml\nspecification: s.yaml\n"
                            "reconstructions: [{name: a, pixels: 128}]\n");
    snprintf(text, sizeof text, "specification: s\nchecks: [{%s}]\n", judged[_i].check);
    scratch_write("s.yaml", text);
    ck_assert_int_eq(run("evaluate j.yaml --check -o done"), 0);
    ck_assert_int_ne(access("done", F_OK), 0); /* --check does nothing */
    ck_assert_int_eq(run("evaluate j.yaml -o done"), judged[_i].status);
    ck_assert_str_eq(err, "");
    assert_narrow(out);
    snprintf(text, sizeof text, "verdict: %s\n", judged[_i].verdict);
    ck_assert_ptr_eq(strstr(out, text), out);
    ck_assert_int_eq(access("done/report.html", F_OK), 0);
    ck_assert_int_eq(run("measure done/a.fits --phantom p.yaml --spec s.yaml"), judged[_i].status);
}
END_TEST

Suite *suite_commands(void);
Suite *suite_commands(void)
{
    SUITE_BEGIN("commands", 120);
    tcase_add_checked_fixture(tcase, setup, teardown);
    tcase_add_test(tcase, help_of_the_program);
    tcase_add_test(tcase, help_of_every_command);
    tcase_add_loop_test(tcase, a_wrong_command_line_ends_with_2, 0, sizeof misuse / sizeof *misuse);
    tcase_add_test(tcase, a_wrong_input_ends_with_3);
    tcase_add_test(tcase, messages_are_plain_lines_and_counted);
    tcase_add_test(tcase, what_cannot_be_printed_ends_with_4);
    tcase_add_test(tcase, a_scan_is_simulated_and_nothing_foreign_is_replaced);
    tcase_add_test(tcase, show_tells_what_a_description_holds);
    tcase_add_test(tcase, show_prints_examples);
    tcase_add_test(tcase, show_knows_other_files_and_refuses_the_rest);
    tcase_add_test(tcase, a_scan_becomes_an_image_and_a_picture);
    tcase_add_loop_test(tcase, swapped_files_are_told_in_one_line, 0, sizeof swapped / sizeof *swapped);
    tcase_add_loop_test(tcase, the_verdict_is_the_exit_status, 0, sizeof judged / sizeof *judged);
    tcase_add_test(tcase, an_interrupt_cleans_up_and_ends_as_interrupts_do);
    return suite;
}
