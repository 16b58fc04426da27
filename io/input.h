#ifndef TG_INPUT_FILE_H
#define TG_INPUT_FILE_H
#include "io/error.h"

/** What went into a result: the user's path and a checksum of what was read. */
typedef struct {
    char *path, *sum; /* "DATASUM 2503531142" for FITS, "CRC-32 3610a686" for other files; owned */
} tg_input;
typedef struct {
    tg_input *input; /* {n}, owned */
    size_t n;
} tg_inputs;

/** How an output was made: goes into its header. */
typedef struct {
    const char *command;    /* "reconstruct" */
    const char *parameters; /* key=value ..., from tg_fields_text */
    const tg_inputs *inputs;
} tg_provenance;

/** Add a file that was read; a path that stands already is kept once. */
tg_code tg_inputs_add(tg_inputs *in, const char *path, tg_error *e);
void tg_inputs_free(tg_inputs *in);

/** The whole of a file, NUL-terminated.
 *  @param most   bytes; a larger file is refused
 *  @param text   set on success, tg_free
 *  @param bytes  set on success, without the NUL; may be NULL */
tg_code tg_read_file(const char *path, size_t most, char **text, size_t *bytes, tg_error *e);

#endif
