#ifndef TG_COMMAND_H
#define TG_COMMAND_H
/** The program's side of a command: options from field tables, --help, messages, interrupts. Not part of the library.
 */
#include "io/fields.h"
#include "io/progress.h"

/** What every command is called with. */
typedef struct {
    const char **operand; /* {n} */
    int n;
    bool check;         /* --check: validate, estimate, run nothing */
    bool force;         /* --force: replace what stands in the way */
    const char *output; /* -o, NULL: not given */
    const tg_progress *progress;
    tg_code verdict; /* set by the command: TG_OK, TG_FAILS or TG_OPEN, when it ran without error */
} tg_call;

typedef struct {
    const char *name;       /* "reconstruct" */
    const char *operands;   /* "SINO.fits" */
    const char *what;       /* one sentence, without capital and full stop */
    const char *example;    /* one or two command lines that work on a fresh checkout */
    const tg_field *fields; /* options of its own, each a --key */
    size_t size;            /* of the struct that the fields fill */
    int least, most;        /* operands */
    const char *output;     /* what -o takes ("IMAGE.fits"), NULL: the command has no -o */
    bool output_required;
    tg_code (*run)(tg_call *call, const void *options, tg_error *e);
} tg_command;

/** The program: pick the command, read options, run it, print messages, answer the exit status.
 *  --help, --quiet, --threads and interrupts are seen to here; so are write errors of standard output.
 *  @param commands  ends with NULL */
int tg_program(const tg_command *const *commands, int argc, char **argv);

/* The commands, each on the lowest floor that can do its whole job: NAME_command.c. */
extern const tg_command tg_simulate_command, tg_reconstruct_command, tg_measure_command, tg_evaluate_command,
    tg_show_command;

#endif
