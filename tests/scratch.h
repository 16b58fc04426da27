#ifndef TG_SCRATCH_H
#define TG_SCRATCH_H
/* A folder of a test's own, gone after it. */
#include <check.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

typedef struct {
    char path[200]; /* of the folder */
    char at[512];   /* of the file that was named last */
} Scratch;

static inline void scratch_make(Scratch *s)
{
    const char *base = getenv("TMPDIR");
    snprintf(s->path, sizeof s->path, "%.150s/tomogauge-test-XXXXXX", base && *base ? base : "/tmp");
    ck_assert_ptr_nonnull(mkdtemp(s->path));
}

/** The path of a name in the folder; good until the next call. */
static inline const char *scratch_path(Scratch *s, const char *name)
{
    snprintf(s->at, sizeof s->at, "%s/%s", s->path, name);
    return s->at;
}

static inline const char *scratch_write(Scratch *s, const char *name, const char *text)
{
    FILE *file = fopen(scratch_path(s, name), "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(text, file), 0);
    ck_assert_int_eq(fclose(file), 0);
    return s->at;
}

/** Remove the folder with its files and the folders in it. */
static inline void scratch_remove(const char *path)
{
    DIR *folder = opendir(path);
    if (!folder) {
        remove(path);
        return;
    }
    for (const struct dirent *d; (d = readdir(folder));) {
        char inner[1024];
        if (!strcmp(d->d_name, ".") || !strcmp(d->d_name, "..")) continue;
        snprintf(inner, sizeof inner, "%s/%s", path, d->d_name);
        scratch_remove(inner);
    }
    closedir(folder);
    rmdir(path);
}

#endif
