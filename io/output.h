#ifndef TG_OUTPUT_H
#define TG_OUTPUT_H
#include "io/error.h"

/** A file under way: written beside its final name, and named only when complete. */
typedef struct {
    char *path, *beside; /* final and temporary name, owned */
} tg_output;

/** May this path be written? Its folder must be there and writable. A file that the program did not write itself, or an
 *  input, is refused without force. The program knows its own files by the mark in them: FITS by the keyword CREATOR,
 *  JSON by "program", CSV and HTML by their first lines, PNG by its Software text.
 *  @param inputs  {n} paths that were read (compared by device and inode)
 *  @return TG_OK, TG_USAGE, TG_MACHINE */
tg_code tg_output_allowed(const char *path, bool force, const char *const *inputs, size_t n, tg_error *e);

/** Reserve a name in the same folder; nothing stands under `path` yet. */
tg_code tg_output_begin(const char *path, tg_output *o, tg_error *e);

/** Sync and rename to the final name; releases o. On failure the temporary file is gone. */
tg_code tg_output_commit(tg_output *o, tg_error *e);

/** Remove what was written; safe after commit and on a zeroed struct. */
void tg_output_drop(tg_output *o);

/** begin, write all bytes, commit. */
tg_code tg_output_write(const char *path, const void *bytes, size_t n, tg_error *e);

/** May a folder be made here, or written into where it stands? */
tg_code tg_output_folder_allowed(const char *path, tg_error *e);

/** Make a folder (and its parents) unless it stands. */
tg_code tg_output_folder(const char *path, tg_error *e);

#endif
