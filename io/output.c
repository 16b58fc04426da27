#include "io/output.h"
#include "io/memory.h"
#include "io/version.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

/* How the program's own files begin, and the mark it leaves in them. */
static const struct {
    const char *start, *mark;
} own_files[] = {
    {"SIMPLE  =", "CREATOR = '" TG_PROGRAM " "},      {"\x89PNG", TG_PROGRAM " "},
    {"{", "\"program\": \"" TG_PROGRAM "\""},         {"<!DOCTYPE html>", "<!-- written by " TG_PROGRAM " "},
    {"reconstruction,measure,where,value,unit,", ""},
};

/* Like strstr, where the text may hold NULs. */
static bool holds(const char *text, size_t n, const char *mark)
{
    const size_t length = strlen(mark);
    for (size_t i = 0; i + length <= n; i++)
        if (!memcmp(text + i, mark, length)) return true;
    return false;
}

static bool is_own(const char *path)
{
    char text[16384];
    FILE *in = fopen(path, "rb");
    if (!in) return false;
    const size_t n = fread(text, 1, sizeof text, in);
    fclose(in);
    for (size_t i = 0; i < sizeof own_files / sizeof *own_files; i++) {
        const size_t start = strlen(own_files[i].start);
        if (n >= start && !memcmp(text, own_files[i].start, start)) return holds(text, n, own_files[i].mark);
    }
    return false;
}

/* Length of the folder's part of a path, its last slash included. */
static int folder_length(const char *path)
{
    const char *slash = strrchr(path, '/');
    return slash ? (int)(slash + 1 - path) : 0;
}

static tg_code fail_write(const char *path, tg_error *e)
{
    const int why = errno;
    if (why == ENOENT || why == ENOTDIR)
        return tg_fail(e, TG_USAGE, path, 0, "its folder does not exist; make it first");
    return tg_fail(e, TG_MACHINE, path, 0, "cannot write: %s", strerror(why));
}

/* Is a new file possible? The folder is looked at by its "." so that a file of its name is none. */
static tg_code check_folder_of(const char *path, tg_error *e)
{
    const int n = folder_length(path);
    const size_t bytes = (size_t)n + 2;
    char *folder = tg_alloc(bytes, 1);
    if (!folder) return tg_no_memory(e, bytes, 1);
    snprintf(folder, bytes, "%.*s.", n, path);
    const tg_code code = access(folder, W_OK | X_OK) ? fail_write(path, e) : TG_OK;
    tg_free(folder);
    return code;
}

tg_code tg_output_folder_allowed(const char *path, tg_error *e)
{
    struct stat st;
    tg_code code = TG_OK;
    char *part = tg_copy_text(path);
    if (!part) return tg_no_memory(e, 1, strlen(path));
    for (;;) { /* up to what stands already */
        size_t n = strlen(part);
        while (n > 1 && part[n - 1] == '/')
            n--;
        part[n] = '\0';
        if (!n || !stat(part, &st)) break;
        part[folder_length(part)] = '\0';
    }
    if (*part && !S_ISDIR(st.st_mode))
        code = tg_fail(e, TG_USAGE, part, 0, "cannot make the folder: a file of that name stands there");
    else if (access(*part ? part : ".", W_OK | X_OK))
        code = tg_fail(e, TG_MACHINE, path, 0, "cannot make the folder: %s", strerror(errno));
    tg_free(part);
    return code;
}

tg_code tg_output_allowed(const char *path, bool force, const char *const *inputs, size_t n, tg_error *e)
{
    struct stat out, in;
    if (stat(path, &out)) return check_folder_of(path, e);
    if (!S_ISREG(out.st_mode)) return tg_fail(e, TG_USAGE, path, 0, "is not a plain file; write to another name");
    if (force) return TG_OK;
    for (size_t i = 0; i < n; i++)
        if (!stat(inputs[i], &in) && in.st_dev == out.st_dev && in.st_ino == out.st_ino)
            return tg_fail(e, TG_USAGE, path, 0, "is an input too; write to another name, or add --force");
    if (out.st_size == 0 || is_own(path)) return TG_OK;
    return tg_fail(e, TG_USAGE, path, 0,
                   "stands already and was not written by " TG_PROGRAM "; write to another name, or add --force");
}

tg_code tg_output_begin(const char *path, tg_output *o, tg_error *e)
{
    tg_code code = TG_OK;
    struct stat st;
    *o = (tg_output){0};
    if (!stat(path, &st) && !S_ISREG(st.st_mode))
        return tg_fail(e, TG_USAGE, path, 0, "is not a plain file; write to another name");
    char *real = realpath(path, NULL); /* behind a link the file is replaced, not the link */
    o->path = tg_copy_text(real ? real : path);
    const size_t size = (o->path ? strlen(o->path) : 0) + 48;
    o->beside = tg_alloc(size, 1);
    free(real);
    if (!o->path || !o->beside) TG_TRY(tg_no_memory(e, 1, size));
    const int folder = folder_length(o->path);
    int file = -1;
    for (int i = 0; i < 100 && file < 0; i++) {
        snprintf(o->beside, size, "%.*s.%s.%ld-%d.part", folder, o->path, o->path + folder, (long)getpid(), i);
        file = open(o->beside, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
        if (file < 0 && errno != EEXIST) break;
    }
    if (file < 0) {
        code = fail_write(path, e);
        tg_free(o->beside); /* another's, or none */
        o->beside = NULL;
        goto done;
    }
    close(file);
done:
    if (code != TG_OK) tg_output_drop(o);
    return code;
}

/* Wait until a file or folder is on the disk. */
static bool sync_path(const char *path, int flags)
{
    const int file = open(path, flags | O_CLOEXEC);
    if (file < 0) return false;
    const bool synced = fsync(file) == 0;
    return close(file) == 0 && synced;
}

tg_code tg_output_commit(tg_output *o, tg_error *e)
{
    tg_code code = TG_OK;
    if (!sync_path(o->beside, O_RDWR) || rename(o->beside, o->path)) {
        code = tg_fail(e, TG_MACHINE, o->path, 0, "cannot write: %s", strerror(errno));
    } else {
        tg_free(o->beside);
        o->beside = NULL;
        const int folder = folder_length(o->path);
        o->path[folder] = '\0'; /* not every file system syncs folders: the file itself is complete */
        (void)sync_path(folder ? o->path : ".", O_RDONLY);
    }
    tg_output_drop(o);
    return code;
}

void tg_output_drop(tg_output *o)
{
    if (o->beside) remove(o->beside);
    tg_free(o->beside);
    tg_free(o->path);
    *o = (tg_output){0};
}

tg_code tg_output_write(const char *path, const void *bytes, size_t n, tg_error *e)
{
    tg_output o;
    tg_code code = tg_output_begin(path, &o, e);
    if (code != TG_OK) return code;
    FILE *out = fopen(o.beside, "wb");
    bool good = out && fwrite(bytes, 1, n, out) == n;
    if (out) good = fclose(out) == 0 && good;
    if (good) return tg_output_commit(&o, e);
    code = tg_fail(e, TG_MACHINE, path, 0, "cannot write: %s", strerror(errno));
    tg_output_drop(&o);
    return code;
}

tg_code tg_output_folder(const char *path, tg_error *e)
{
    struct stat st;
    char *part = tg_copy_text(path);
    if (!part) return tg_no_memory(e, 1, strlen(path));
    tg_code code = TG_OK;
    for (char *c = part + 1; code == TG_OK && c[-1]; c++) { /* each parent, then the whole */
        const char was = *c;
        if (was != '/' && was != '\0') continue;
        *c = '\0';
        if (mkdir(part, 0777) && (errno != EEXIST || stat(part, &st) || !S_ISDIR(st.st_mode)))
            code = tg_fail(e, errno == EEXIST ? TG_USAGE : TG_MACHINE, part, 0, "cannot make the folder: %s",
                           errno == EEXIST ? "a file of that name stands there" : strerror(errno));
        *c = was;
        if (!was) break;
    }
    tg_free(part);
    return code;
}
