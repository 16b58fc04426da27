#ifndef TG_COMMAND_H
#define TG_COMMAND_H
/** The program's side of a command: options from field tables, --help, messages, interrupts. Not part of the library.
 */
#include "io/fields.h"
#include "io/input.h"
#include "io/progress.h"

/** What every command is called with. */
typedef struct {
    char **operand; /* {n} */
    int n;
    bool check; /* --check: validate, estimate, run nothing */
    bool force; /* --force: replace what stands in the way */
    bool quiet;
    int threads;
    char *output; /* -o, NULL: not given */
    const tg_progress *progress;
    tg_code verdict; /* set by the command: TG_OK, TG_FAILS or TG_OPEN, when it ran without error */
} tg_call;

typedef struct {
    const char *name;       /* "reconstruct" */
    const char *operands;   /* "SINO.fits" */
    const char *what;       /* one sentence */
    const char *example;    /* one or two command lines that work on a fresh checkout */
    const tg_field *fields; /* options of its own, each a --key */
    size_t size;            /* of the struct that the fields fill */
    int least, most;        /* operands */
    const char *output;     /* what -o takes ("IMAGE.fits"), NULL: the command has no -o */
    bool output_required;
    tg_code (*run)(tg_call *call, const void *options, tg_error *e);
} tg_command;

/** The program: pick the command, read options, run it, print messages, answer the exit status.
 *  @param commands  ends with a NULL name */
int tg_program(const tg_command *commands, int argc, char **argv);

#endif
