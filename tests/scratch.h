#ifndef TG_SCRATCH_H
#define TG_SCRATCH_H
/** A folder for the files of one test; the tests of a suite run one after the other in one process. */
#include <check.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static char scratch_folder[64];

static inline void scratch_begin(void)
{
    strcpy(scratch_folder, "/tmp/tomogauge-test-XXXXXX");
    ck_assert_ptr_nonnull(mkdtemp(scratch_folder));
}

/** Path of a file in the folder; two are valid at a time. */
static inline const char *scratch(const char *name)
{
    static char path[2][384];
    static int next;
    next = !next;
    snprintf(path[next], sizeof path[next], "%s/%s", scratch_folder, name);
    return path[next];
}

/** How many files stand there. */
static inline size_t scratch_files(void)
{
    size_t n = 0;
    DIR *folder = opendir(scratch_folder);
    ck_assert_ptr_nonnull(folder);
    for (const struct dirent *d; (d = readdir(folder));)
        n += strcmp(d->d_name, ".") != 0 && strcmp(d->d_name, "..") != 0;
    closedir(folder);
    return n;
}

/** A file with this text. @return its path */
static inline const char *scratch_write(const char *name, const char *text)
{
    const char *path = scratch(name);
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(text, file), 0);
    ck_assert_int_eq(fclose(file), 0);
    return path;
}

/** Remove a file, or a folder with all in it. */
static inline void scratch_remove(const char *path)
{
    DIR *folder = opendir(path);
    for (const struct dirent *d; folder && (d = readdir(folder));) {
        char inner[512];
        if (!strcmp(d->d_name, ".") || !strcmp(d->d_name, "..")) continue;
        snprintf(inner, sizeof inner, "%.250s/%s", path, d->d_name);
        scratch_remove(inner);
    }
    if (folder) closedir(folder);
    ck_assert_int_eq(remove(path), 0);
}

static inline void scratch_end(void)
{
    scratch_remove(scratch_folder);
}

#endif
