#ifndef TG_ERROR_H
#define TG_ERROR_H
#include <stdbool.h>
#include <stddef.h>

/** What a call answers; each value is also the program's exit status. */
typedef enum {
    TG_OK = 0,
    TG_FAILS = 1,    /* a figure fails its specification */
    TG_USAGE = 2,    /* the command line is wrong */
    TG_INPUT = 3,    /* an input is wrong or unreadable */
    TG_MACHINE = 4,  /* memory, disk or the system let it down */
    TG_OPEN = 5,     /* nothing fails, but something is inconclusive or could not be measured */
    TG_STOPPED = 130 /* interrupted by the user */
} tg_code;

enum { TG_MESSAGES = 20 };

/** One sentence for the user: which of their files, which line of it, what is wrong and what to do. */
typedef struct {
    char file[256]; /* "": no file */
    int line;       /* 0: no line */
    bool warning;   /* the work goes on */
    char what[512];
} tg_message;

/** All that a call has to say. Zero-initialise it; the caller owns it; functions only add to it.
 *  Messages beyond TG_MESSAGES are counted but not kept. */
typedef struct {
    tg_code code; /* that of the first failure, TG_OK while there are only warnings */
    size_t count; /* messages reported, kept or not */
    tg_message message[TG_MESSAGES];
} tg_error;

/** Add a failure.
 *  @param e     may be NULL: only the code is answered
 *  @param file  the user's file, or NULL
 *  @param line  its line, or 0
 *  @return code, so that `return tg_fail(...)` reads well */
tg_code tg_fail(tg_error *e, tg_code code, const char *file, int line, const char *format, ...)
    __attribute__((format(printf, 5, 6)));

/** Add a warning; the code stays as it is. e may be NULL. */
void tg_warn(tg_error *e, const char *file, int line, const char *format, ...) __attribute__((format(printf, 4, 5)));

/** Add the messages that a step of the work kept to itself.  @param file  of those that name none, or NULL */
void tg_hand_on(const tg_error *from, const char *file, tg_error *to);

/** Take a code into account while work goes on to find further faults: the first failure stands, but for TG_MACHINE. */
void tg_note(tg_code *code, tg_code found);

/** Run a call inside a function that has `tg_code code` and a label `done`. */
#define TG_TRY(call) \
    do { \
        if ((code = (call)) != TG_OK) goto done; \
    } while (0)

#endif
