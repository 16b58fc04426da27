#include "io/command.h"

#include "io/memory.h"
#include "io/process.h"
#include "io/version.h"

#include <ctype.h>
#include <errno.h>
#include <fcntl.h>
#include <omp.h>
#include <popt.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum { WIDTH = 80, MOST_OPTIONS = 64 };

static const char cautions[] =
    "Not for diagnosis. Exposures only by trained staff under local rules. Acceptance decisions belong to the "
    "responsible qualified expert.";

/* Options of every command. The first two belong to commands that write. */
typedef struct {
    tg_text output;
    tg_number force, check, quiet, threads, help;
} common;

static const tg_field common_fields[] = {
    TG_ROW(common, "output", TG_PATH, output, .what = "where the result goes"),
    TG_ROW(common, "force", TG_SWITCH, force, .standard = "false",
           .what = "replace files that this program did not write"),
    TG_ROW(common, "check", TG_SWITCH, check, .standard = "false",
           .what = "check all inputs and say what the work would take, but do nothing"),
    TG_ROW(common, "quiet", TG_SWITCH, quiet, .standard = "false",
           .what = "no progress and no warnings, only results and errors"),
    TG_ROW(common, "threads", TG_INTEGER, threads, .what = "threads to work with; not given: all processors", .low = 1,
           .high = 1024),
    TG_ROW(common, "help", TG_SWITCH, help, .standard = "false", .what = "this text"),
    {0},
};

static const tg_field no_fields[] = {{0}};

static const tg_field *fields_of(const tg_command *c)
{
    return c->fields ? c->fields : no_fields;
}

static const tg_field *common_of(const tg_command *c)
{
    return common_fields + (c->output ? 0 : 2);
}

/* ---- help ---- */

/* Words of a text between columns `from` and WIDTH; the cursor stands in column `column`. */
static void wrap(int column, int from, const char *text)
{
    const char *gap = "";
    while (*text) {
        const int n = (int)strcspn(text, " ");
        if (column + (int)strlen(gap) + n > WIDTH) {
            printf("\n%*s", from, "");
            column = from;
            gap = "";
        }
        printf("%s%.*s", gap, n, text);
        column += (int)strlen(gap) + n;
        gap = " ";
        text += n + (text[n] == ' ');
    }
    printf("\n");
}

/* A label and its text beside it from a column, or below where the label is long. */
static void print_item(const char *label, int from, const char *text)
{
    const int column = printf("  %s", label);
    if (column > from - 2)
        printf("\n%*s", from, "");
    else
        printf("%*s", from - column, "");
    wrap(from, from, text);
}

static const char *placeholder(const tg_field *f)
{
    switch (f->kind) {
    case TG_NUMBER: return " X";
    case TG_INTEGER: return " N";
    case TG_CHOICE:
    case TG_TEXT: return " WORD";
    case TG_PATH: return " FILE";
    case TG_VECTOR2: return " X,Y";
    case TG_VECTOR3: return " X,Y,Z";
    default: return "";
    }
}

static bool is_option(const tg_field *f)
{
    return f->kind != TG_GROUP && f->kind != TG_LIST && f->kind != TG_LINE;
}

/* The limits of a number, the words of a choice, the unit of a vector; "" where the placeholder says enough. */
static const char *limits(const tg_field *f, char out[256])
{
    switch (f->kind) {
    case TG_NUMBER: return tg_field_range(f, out) + strlen("a number");
    case TG_INTEGER: return tg_field_range(f, out) + strlen("a whole number");
    case TG_CHOICE: return tg_field_range(f, out);
    case TG_TEXT: tg_words_list(f->words, " or ", out, 256); return out;
    case TG_VECTOR2:
    case TG_VECTOR3: snprintf(out, 256, f->unit ? "in %s" : "%s", f->unit ? f->unit : ""); return out;
    default: return "";
    }
}

static void print_option(const tg_field *f, const char *file)
{
    char label[96], room[256], text[800];
    const char *range = limits(f, room);
    range += *range == ' ';
    const bool output = !strcmp(f->key, "output");
    snprintf(label, sizeof label, "%s--%s%s%s", output ? "-o, " : "", f->key, output ? " " : placeholder(f),
             output ? file : "");
    const bool standard = f->standard && f->kind != TG_SWITCH;
    snprintf(text, sizeof text, "%s%s%s%s%s%s", f->what, *range ? "; " : "", range, f->required ? "; required" : "",
             standard ? "; default " : "", standard ? f->standard : "");
    print_item(label, 28, text);
}

/* Command lines as a shell reads them, long ones broken with a backslash. */
static void print_example(const char *text)
{
    int column = printf("  ");
    while (*text) {
        const int n = (int)strcspn(text, " \n");
        if (column + n > WIDTH - 2) column = printf("\\\n      ") - 2;
        column += printf("%.*s", n, text);
        text += n;
        if (*text == '\n')
            column = printf("\n  ") - 1;
        else if (*text)
            column += printf(" ");
        text += *text != '\0';
    }
    printf("\n");
}

static void print_help(const tg_command *c)
{
    char usage[256];
    snprintf(usage, sizeof usage, "Usage: %s %s%s%s%s%s%s [options]", TG_PROGRAM, c->name, c->operands ? " " : "",
             c->operands ? c->operands : "",
             !c->output           ? ""
             : c->output_required ? " -o "
                                  : " [-o ",
             c->output ? c->output : "", c->output && !c->output_required ? "]" : "");
    wrap(0, 7, usage);
    printf("\n");
    wrap(0, 0, c->what);
    printf("\nOptions:\n");
    for (const tg_field *f = fields_of(c); f->key; f++)
        if (is_option(f)) print_option(f, "");
    for (const tg_field *f = common_of(c); f->key; f++)
        print_option(f, c->output);
    printf("\nExample:\n");
    print_example(c->example);
    printf("\n");
    wrap(0, 0, cautions);
}

static void print_overview(const tg_command *const *commands)
{
    static const char *const exits[][2] = {
        {"0", "done, and nothing fails"},
        {"1", "a figure fails its specification"},
        {"2", "the command line is wrong"},
        {"3", "an input is wrong or unreadable"},
        {"4", "the machine let it down: memory, disk"},
        {"5", "nothing fails, but something is inconclusive or could not be measured"},
    };
    wrap(0, 0,
         TG_PROGRAM " reconstructs CT scans of test phantoms, measures the images against a specification and says "
                    "pass, fail or inconclusive, with an uncertainty on every figure.");
    printf("\nUsage: %s COMMAND [options] FILE...\n       %s COMMAND --help\n       %s --version\n\nCommands:\n",
           TG_PROGRAM, TG_PROGRAM, TG_PROGRAM);
    for (const tg_command *const *c = commands; *c; c++)
        print_item((*c)->name, 16, (*c)->what);
    printf("\nExit status:\n");
    for (size_t i = 0; i < sizeof exits / sizeof *exits; i++)
        print_item(exits[i][0], 6, exits[i][1]);
    printf("\n");
    wrap(0, 0, cautions);
}

/* ---- messages ---- */

/* Text from files may hold anything; a message stays one line and leaves the terminal alone. */
static void print_plain(const char *text)
{
    for (; *text; text++)
        fputc(iscntrl((unsigned char)*text) ? '?' : *text, stderr);
}

static void print_messages(const tg_error *e, bool quiet)
{
    const size_t kept = e->count < TG_MESSAGES ? e->count : TG_MESSAGES;
    for (size_t i = 0; i < kept; i++) {
        const tg_message *m = &e->message[i];
        if (m->warning && quiet) continue;
        fprintf(stderr, "%s: ", TG_PROGRAM);
        print_plain(m->file);
        if (m->line) fprintf(stderr, ":%d", m->line);
        if (m->file[0]) fprintf(stderr, ": ");
        if (m->warning) fprintf(stderr, "warning: ");
        print_plain(m->what);
        fprintf(stderr, "\n");
    }
    if (e->count > kept) fprintf(stderr, "%s: and %zu more\n", TG_PROGRAM, e->count - kept);
}

/* ---- progress and interrupts ---- */

static volatile sig_atomic_t stopped; /* the signal that asked for an end */

static void stop(int number)
{
    stopped = number;
}

/* A second interrupt does not wait for the clean-up. What was ignored from the start stays ignored. */
static void catch_interrupts(void)
{
    static const int numbers[] = {SIGINT, SIGTERM, SIGHUP};
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
        struct sigaction old, catching = {.sa_handler = stop, .sa_flags = SA_RESTART | (int)SA_RESETHAND};
        sigemptyset(&catching.sa_mask);
        if (sigaction(numbers[i], NULL, &old) == 0 && old.sa_handler != SIG_IGN) sigaction(numbers[i], &catching, NULL);
    }
}

typedef struct {
    bool visible;
    char what[32];       /* the piece of work under way */
    double begun, drawn; /* [s] when it began, when the bar was last drawn */
} bar;

static void erase(bar *b)
{
    if (b->drawn > 0) fprintf(stderr, "\r%*s\r", WIDTH - 1, "");
    b->drawn = 0;
}

static void draw(bar *b, double done, double now)
{
    enum { CELLS = 24 };
    static const char full[CELLS + 1] = "########################", empty[CELLS + 1] = "........................";
    const double passed = now - b->begun;
    const int cells = (int)(done * CELLS);
    fprintf(stderr, "\r%-28s [%.*s%.*s] %3.0f %%", b->what, cells, full, CELLS - cells, empty, 100 * done);
    if (passed > 2 && done > 0.02)
        fprintf(stderr, " %6.0f s left", passed * (1 - done) / done);
    else
        fprintf(stderr, "%14s", "");
    fflush(stderr);
    b->drawn = now;
}

static bool step(void *context, const char *what, double done)
{
    bar *b = context;
    if (!b->visible) return !stopped;
    const double now = tg_seconds();
    done = done > 0 ? (done < 1 ? done : 1) : 0;
    if (strncmp(b->what, what, sizeof b->what - 1)) {
        snprintf(b->what, sizeof b->what, "%s", what);
        b->begun = now;
    }
    if (now - b->begun > 0.3 && now - b->drawn > 0.1) draw(b, done, now); /* short work needs no bar */
    return !stopped;
}

/* ---- one command ---- */

/* All that its options said. */
typedef struct {
    const tg_command *command;
    common common;
    void *own; /* of command->size bytes */
    poptContext popt;
} parsed;

static void free_parsed(parsed *p)
{
    if (p->popt) poptFreeContext(p->popt);
    tg_fields_free(common_fields, &p->common);
    if (p->own) tg_fields_free(fields_of(p->command), p->own);
    tg_free(p->own);
}

static tg_code unknown_option(const tg_command *c, const char *option, tg_error *e)
{
    char name[TG_WORD], near[TG_WORD], words[2048] = "";
    const char *bare = option + strspn(option, "-");
    snprintf(name, sizeof name, "%.*s", (int)strcspn(bare, "="), bare);
    size_t n = 0;
    const tg_field *const tables[] = {fields_of(c), common_of(c)};
    for (int t = 0; t < 2; t++)
        for (const tg_field *f = tables[t]; f->key && n < sizeof words; f++)
            if (is_option(f)) n += (size_t)snprintf(words + n, sizeof words - n, "%s ", f->key);
    if (tg_nearest(name, words, near))
        return tg_fail(e, TG_USAGE, NULL, 0, "unknown option '%s'; did you mean '--%s'?", tg_show(option).text, near);
    return tg_fail(e, TG_USAGE, NULL, 0, "unknown option '%s'; '%s %s --help' lists them", tg_show(option).text,
                   TG_PROGRAM, c->name);
}

static tg_code bad_option(const parsed *p, int problem, tg_error *e)
{
    const char *option = poptBadOption(p->popt, 0);
    if (problem == POPT_ERROR_BADOPT) return unknown_option(p->command, option, e);
    if (problem == POPT_ERROR_NOARG)
        return tg_fail(e, TG_USAGE, NULL, 0, "%s needs a value; '%s %s --help' says which", tg_show(option).text,
                       TG_PROGRAM, p->command->name);
    if (problem == POPT_ERROR_UNWANTEDARG)
        return tg_fail(e, TG_USAGE, NULL, 0, "%s takes no value", tg_show(option).text);
    return tg_fail(e, TG_USAGE, NULL, 0, "%s: %s", tg_show(option).text, poptStrerror(problem));
}

static size_t add_options(const tg_field *fields, size_t n, struct poptOption *option, const tg_field **row)
{
    for (const tg_field *f = fields; f->key && n < MOST_OPTIONS; f++) {
        if (!is_option(f)) continue;
        row[n] = f;
        option[n] = (struct poptOption){
            .longName = f->key, .argInfo = f->kind == TG_SWITCH ? POPT_ARG_NONE : POPT_ARG_STRING, .val = (int)n + 1};
        if (!strcmp(f->key, "output")) option[n].shortName = 'o';
        if (!strcmp(f->key, "help")) option[n].shortName = 'h';
        n++;
    }
    return n;
}

static tg_code read_options(parsed *p, int argc, const char **argv, tg_error *e)
{
    struct poptOption option[MOST_OPTIONS + 1] = {{0}};
    const tg_field *row[MOST_OPTIONS];
    tg_code code = TG_OK;
    const size_t own = add_options(fields_of(p->command), 0, option, row);
    add_options(common_of(p->command), own, option, row);
    p->popt = poptGetContext(TG_PROGRAM, argc, argv, option, POPT_CONTEXT_NO_EXEC);
    if (!p->popt) return tg_no_memory(e, 1, sizeof option);
    int value;
    while ((value = poptGetNextOpt(p->popt)) > 0) {
        char *text = poptGetOptArg(p->popt);
        const size_t i = (size_t)value - 1;
        const tg_code answer =
            tg_field_set(row[i], i < own ? p->own : (void *)&p->common, text ? text : "true", NULL, 0, e);
        free(text);
        if (answer != TG_OK) code = answer;
    }
    return value < -1 ? bad_option(p, value, e) : code;
}

static tg_code check_usage(const parsed *p, tg_call *call, tg_error *e)
{
    const tg_command *c = p->command;
    for (const tg_field *f = fields_of(c); f->key; f++)
        if (f->required && !tg_field_line(f, p->own))
            tg_fail(e, TG_USAGE, NULL, 0, "option --%s is missing: %s", f->key, f->what);
    if (call->n < c->least)
        tg_fail(e, TG_USAGE, NULL, 0, "%s needs %s; '%s %s --help' shows an example", c->name, c->operands, TG_PROGRAM,
                c->name);
    if (call->n > c->most)
        tg_fail(e, TG_USAGE, NULL, 0, "'%s' is one file too many; %s takes %s", tg_show(call->operand[c->most]).text,
                c->name, c->operands ? c->operands : "none");
    if (c->output_required && !call->output && !call->check)
        tg_fail(e, TG_USAGE, NULL, 0, "option -o is missing: say where the result goes, -o %s", c->output);
    return e->code;
}

/* @return the verdict of the command, or what went wrong */
static tg_code run(const tg_command *c, int argc, const char **argv, bool *quiet, tg_error *e)
{
    parsed p = {.command = c};
    bar b = {0};
    const tg_progress progress = {step, &b};
    tg_code code = TG_OK;
    p.own = tg_alloc(1, c->size);
    if (!p.own) TG_TRY(tg_no_memory(e, 1, c->size));
    TG_TRY(tg_fields_default(common_fields, &p.common, e));
    TG_TRY(tg_fields_default(fields_of(c), p.own, e));
    TG_TRY(read_options(&p, argc, argv, e));
    if (p.common.help.v != 0) {
        print_help(c);
        goto done;
    }
    *quiet = p.common.quiet.v != 0;
    b.visible = !*quiet && isatty(STDERR_FILENO);
    if (p.common.threads.line) omp_set_num_threads((int)p.common.threads.v);
    tg_call call = {.operand = poptGetArgs(p.popt),
                    .check = p.common.check.v != 0,
                    .force = p.common.force.v != 0,
                    .output = p.common.output.v,
                    .progress = &progress};
    while (call.operand && call.operand[call.n])
        call.n++;
    TG_TRY(check_usage(&p, &call, e));
    code = c->run(&call, p.own, e);
    if (code == TG_OK) code = call.verdict;
done:
    erase(&b);
    free_parsed(&p);
    return code;
}

static tg_code unknown_command(const tg_command *const *commands, const char *name, tg_error *e)
{
    char words[512] = "", near[TG_WORD];
    size_t n = 0;
    for (const tg_command *const *c = commands; *c && n < sizeof words; c++)
        n += (size_t)snprintf(words + n, sizeof words - n, "%s ", (*c)->name);
    if (tg_nearest(name, words, near))
        return tg_fail(e, TG_USAGE, NULL, 0, "unknown command '%s'; did you mean '%s'?", tg_show(name).text, near);
    return tg_fail(e, TG_USAGE, NULL, 0, "unknown command '%s'; '%s --help' lists them", tg_show(name).text,
                   TG_PROGRAM);
}

/* A file opened later must not take the place of a standard stream that the caller closed. */
static void open_standard_streams(void)
{
    for (int fd = 0; fd < 3; fd++)
        if (fcntl(fd, F_GETFD) == -1 && open("/dev/null", fd == STDOUT_FILENO ? O_RDONLY : O_RDWR) != fd) return;
}

int tg_program(const tg_command *const *commands, int argc, char **argv)
{
    tg_error e = {0};
    tg_code code = TG_OK;
    bool quiet = false;
    const char *name = argc > 1 ? argv[1] : NULL;
    open_standard_streams();
    setvbuf(stdout, NULL, _IOFBF, 1 << 16); /* results follow when the progress bar has gone */
    tg_process_start();
    catch_interrupts();
    const tg_command *const *c = commands;
    while (name && *c && strcmp((*c)->name, name))
        c++;
    if (!name || !strcmp(name, "--help") || !strcmp(name, "-h")) {
        print_overview(commands);
        if (!name) code = TG_USAGE;
    } else if (!strcmp(name, "--version")) {
        printf("%s %s\n", TG_PROGRAM, TG_VERSION);
    } else if (!*c) {
        code = unknown_command(commands, name, &e);
    } else {
        code = run(*c, argc - 1, (const char **)(void *)(argv + 1), &quiet, &e);
    }
    errno = 0;
    if (fflush(stdout) || ferror(stdout))
        code = tg_fail(&e, TG_MACHINE, NULL, 0, "cannot write to standard output: %s", strerror(errno ? errno : EIO));
    print_messages(&e, quiet);
    if (stopped) { /* end as interrupts do: the shell must see it */
        signal(stopped, SIG_DFL);
        raise(stopped);
    }
    return (int)code;
}
