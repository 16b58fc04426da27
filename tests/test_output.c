/* Files appear under their names only when complete, and nothing of another's is overwritten. */
#include "io/fits.h"
#include "io/input.h"
#include "io/json.h"
#include "io/memory.h"
#include "io/output.h"
#include "io/png.h"
#include "tests/near.h"
#include "tests/scratch.h"

#include <signal.h>
#include <sys/resource.h>
#include <sys/stat.h>

static void put(const char *path, const char *text)
{
    FILE *out = fopen(path, "wb");
    ck_assert_ptr_nonnull(out);
    fputs(text, out);
    fclose(out);
}

static bool says(const tg_error *e, const char *fragment)
{
    return e->count == 1 && strstr(e->message[0].what, fragment);
}

START_TEST(written_beside)
{
    tg_error e = {0};
    tg_output o;
    const char *path = scratch("a.csv");
    put(path, "old");
    CK_OK(tg_output_begin(path, &o, &e));
    ck_assert_str_ne(o.beside, o.path);
    ck_assert_int_eq(strncmp(o.beside, scratch_folder, strlen(scratch_folder)), 0); /* same file system */
    put(o.beside, "new");
    char *text = NULL;
    size_t n;
    CK_OK(tg_read_file(path, 100, &text, &n, &e));
    ck_assert_str_eq(text, "old");
    tg_free(text);
    CK_OK(tg_output_commit(&o, &e));
    CK_OK(tg_read_file(path, 100, &text, &n, &e));
    ck_assert_str_eq(text, "new");
    tg_free(text);
    ck_assert_ptr_null(o.beside);
    tg_output_drop(&o); /* after a commit it does nothing */
    ck_assert_uint_eq(scratch_files(), 1);
}
END_TEST

START_TEST(dropped)
{
    tg_error e = {0};
    tg_output a, b;
    CK_OK(tg_output_begin(scratch("a.csv"), &a, &e));
    CK_OK(tg_output_begin(scratch("a.csv"), &b, &e)); /* two writers do not meet */
    ck_assert_str_ne(a.beside, b.beside);
    ck_assert_uint_eq(scratch_files(), 2);
    tg_output_drop(&a);
    tg_output_drop(&b);
    tg_output_drop(&b);
    ck_assert_uint_eq(scratch_files(), 0);
    CK_OK(tg_output_begin(scratch("a.csv"), &a, &e));
    remove(a.beside);
    ck_assert_int_eq(tg_output_commit(&a, &e), TG_MACHINE); /* what was to be named is gone */
    ck_assert(says(&e, "cannot write"));
    ck_assert_uint_eq(scratch_files(), 0);
}
END_TEST

START_TEST(permissions)
{
    tg_error e = {0};
    struct stat st;
    const mode_t mask = umask(027);
    CK_OK(tg_output_write(scratch("a.txt"), "text", 4, &e));
    umask(mask);
    ck_assert_int_eq(stat(scratch("a.txt"), &st), 0);
    ck_assert_uint_eq(st.st_mode & 0777, 0640);
    ck_assert_int_eq(st.st_size, 4);
}
END_TEST

START_TEST(links)
{
    tg_error e = {0};
    struct stat st;
    put(scratch("real.txt"), "old");
    ck_assert_int_eq(symlink("real.txt", scratch("link.txt")), 0);
    CK_OK(tg_output_write(scratch("link.txt"), "newer", 5, &e));
    ck_assert_int_eq(lstat(scratch("link.txt"), &st), 0);
    ck_assert(S_ISLNK(st.st_mode));
    ck_assert_int_eq(stat(scratch("real.txt"), &st), 0);
    ck_assert_int_eq(st.st_size, 5);
}
END_TEST

START_TEST(refused)
{
    tg_error e = {0};
    tg_output o;
    ck_assert_int_eq(tg_output_begin(scratch("no/a.txt"), &o, &e), TG_USAGE);
    ck_assert(says(&e, "folder does not exist"));
    e = (tg_error){0};
    ck_assert_int_eq(tg_output_begin("/dev/null", &o, &e), TG_USAGE);
    ck_assert(says(&e, "not a plain file"));
    e = (tg_error){0};
    ck_assert_int_eq(tg_output_begin(scratch_folder, &o, &e), TG_USAGE);
    e = (tg_error){0};
    ck_assert_int_eq(tg_output_allowed("/dev/null", true, NULL, 0, &e), TG_USAGE);
    ck_assert_int_eq(access("/dev/null", F_OK), 0);
    if (geteuid() != 0) { /* root may write anywhere */
        e = (tg_error){0};
        ck_assert_int_eq(chmod(scratch_folder, 0500), 0);
        ck_assert_int_eq(tg_output_begin(scratch("a.txt"), &o, &e), TG_MACHINE);
        ck_assert(says(&e, "Permission denied"));
        ck_assert_int_eq(chmod(scratch_folder, 0700), 0);
    }
}
END_TEST

/* Each kind of file the program writes is known as its own; others are not. */
START_TEST(own_files)
{
    tg_error e = {0};
    const tg_grid g = {{4, 4, 1}, {1, 1, 1}, {0, 0, 0}};
    const tg_scan scan = {.channels = 2, .views = 1, .rows = 1, .channel_step = 1, .angle_rad = (double[]){0}};
    const tg_window window = {.level = 0, .width = 1, .bits = 8};
    tg_image image;
    tg_sinogram s;
    tg_json *j = tg_json_object();
    tg_json_set_text(j, "program", "tomogauge");
    CK_OK(tg_image_create(&g, TG_HU, &image, &e));
    CK_OK(tg_sinogram_create(&scan, &s, &e));
    CK_OK(tg_fits_write_image(scratch("i.fits"), &image, NULL, &e));
    CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, NULL, &e));
    CK_OK(tg_png_write(scratch("i.png"), &image, 0, &window, &e));
    CK_OK(tg_json_write(scratch("r.json"), j, &e));
    put(scratch("r.html"), "<!DOCTYPE html>\n<!-- written by tomogauge 0.1.0 -->\n<html>");
    put(scratch("r.csv"), "reconstruction,measure,where,value,unit,uncertainty\r\n");
    put(scratch("empty"), "");
    static const char *const own[] = {"i.fits", "s.fits", "i.png", "r.json", "r.html", "r.csv", "empty", "absent"};
    for (size_t i = 0; i < sizeof own / sizeof *own; i++)
        CK_OK(tg_output_allowed(scratch(own[i]), false, NULL, 0, &e));
    static const char *const foreign[] = {"SIMPLE  =                    T",   "{\"program\": \"another\"}",
                                          "<!DOCTYPE html>\n<p>of tomogauge", "a,b\n1,2\n",
                                          "job: mine, for tomogauge 0.1.0\n", "\x89PNG\r\n"};
    for (size_t i = 0; i < sizeof foreign / sizeof *foreign; i++) {
        e = (tg_error){0};
        put(scratch("foreign"), foreign[i]);
        ck_assert_int_eq(tg_output_allowed(scratch("foreign"), false, NULL, 0, &e), TG_USAGE);
        ck_assert(says(&e, "not written by tomogauge") && says(&e, "--force"));
        CK_OK(tg_output_allowed(scratch("foreign"), true, NULL, 0, &e));
    }
    tg_json_free(j);
    tg_image_free(&image);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(inputs_are_kept)
{
    tg_error e = {0};
    char input[400], other[400];
    snprintf(input, sizeof input, "%s/s.json", scratch_folder);
    snprintf(other, sizeof other, "%s/./s.json", scratch_folder); /* the same file by another name */
    const char *const inputs[] = {"absent", input};
    put(input, "{\"program\": \"tomogauge\"}");
    CK_OK(tg_output_allowed(other, false, inputs, 1, &e));
    ck_assert_int_eq(tg_output_allowed(other, false, inputs, 2, &e), TG_USAGE);
    ck_assert(says(&e, "is an input too"));
    e = (tg_error){0};
    CK_OK(tg_output_allowed(other, true, inputs, 2, &e));
}
END_TEST

START_TEST(folders)
{
    tg_error e = {0};
    struct stat st;
    char deep[400];
    snprintf(deep, sizeof deep, "%s/a/b//c/", scratch_folder);
    CK_OK(tg_output_folder(deep, &e));
    ck_assert(!stat(deep, &st) && S_ISDIR(st.st_mode));
    CK_OK(tg_output_folder(deep, &e)); /* it stands */
    CK_OK(tg_output_folder("/", &e));
    CK_OK(tg_output_folder(".", &e));
    for (int i = 0; i < 3; i++) {
        static const char *const parts[] = {"a/b/c", "a/b", "a"};
        ck_assert_int_eq(rmdir(scratch(parts[i])), 0);
    }
    put(scratch("file"), "");
    snprintf(deep, sizeof deep, "%s/file/c", scratch_folder);
    ck_assert_int_eq(tg_output_folder(deep, &e), TG_USAGE);
    ck_assert(says(&e, "a file of that name"));
}
END_TEST

/* A full disk, by the limit on the size of a file: the write fails, and nothing is left. */
START_TEST(full_disk)
{
    tg_error e = {0};
    struct rlimit was, small = {4096, RLIM_INFINITY};
    static char bytes[100000];
    const tg_grid g = {{100, 100, 1}, {1, 1, 1}, {0, 0, 0}};
    tg_image image;
    CK_OK(tg_image_create(&g, TG_HU, &image, &e));
    ck_assert_int_eq(getrlimit(RLIMIT_FSIZE, &was), 0);
    small.rlim_max = was.rlim_max;
    void (*handler)(int) = signal(SIGXFSZ, SIG_IGN);
    ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &small), 0);
    const tg_code plain = tg_output_write(scratch("a.txt"), bytes, sizeof bytes, &e);
    const tg_code fits = tg_fits_write_image(scratch("a.fits"), &image, NULL, &e);
    setrlimit(RLIMIT_FSIZE, &was);
    signal(SIGXFSZ, handler);
    ck_assert_int_eq(plain, TG_MACHINE);
    ck_assert_int_eq(fits, TG_MACHINE);
    ck_assert_uint_eq(e.count, 2);
    ck_assert_ptr_nonnull(strstr(e.message[0].what, "File too large"));
    ck_assert_ptr_nonnull(strstr(e.message[1].what, "is the disk full?"));
    ck_assert_uint_eq(scratch_files(), 0);
    tg_image_free(&image);
}
END_TEST

/* CRC-32 of "123456789" is CBF43926 (the check value of its published parameters). */
START_TEST(inputs)
{
    tg_error e = {0};
    tg_inputs in = {0};
    char sum[16], want[32];
    const tg_scan scan = {.channels = 2, .views = 1, .rows = 1, .channel_step = 1, .angle_rad = (double[]){0}};
    tg_sinogram s;
    CK_OK(tg_sinogram_create(&scan, &s, &e));
    s.v[1] = 3;
    CK_OK(tg_fits_write_sinogram(scratch("s.fits"), &s, NULL, &e));
    put(scratch("p.yaml"), "123456789");
    CK_OK(tg_inputs_add(&in, scratch("p.yaml"), &e));
    CK_OK(tg_inputs_add(&in, scratch("s.fits"), &e));
    CK_OK(tg_inputs_add(&in, scratch("p.yaml"), &e)); /* once */
    ck_assert_uint_eq(in.n, 2);
    ck_assert_str_eq(in.input[0].sum, "CRC-32 cbf43926");
    CK_OK(tg_fits_datasum(scratch("s.fits"), sum, &e));
    ck_assert_str_eq(sum, "1077936128"); /* one word: 3.0f is 40400000 hexadecimal */
    snprintf(want, sizeof want, "DATASUM %s", sum);
    ck_assert_str_eq(in.input[1].sum, want);
    ck_assert_int_eq(tg_inputs_add(&in, scratch("absent"), &e), TG_INPUT);
    ck_assert(says(&e, "No such file"));
    ck_assert_uint_eq(in.n, 2);
    tg_inputs_free(&in);
    tg_inputs_free(&in);
    tg_sinogram_free(&s);
}
END_TEST

START_TEST(whole_files)
{
    tg_error e = {0};
    char *text = NULL;
    size_t n = 0;
    put(scratch("a.txt"), "four");
    CK_OK(tg_read_file(scratch("a.txt"), 4, &text, &n, &e));
    ck_assert_uint_eq(n, 4);
    ck_assert_str_eq(text, "four");
    tg_free(text);
    text = NULL;
    ck_assert_int_eq(tg_read_file(scratch("a.txt"), 3, &text, &n, &e), TG_INPUT);
    ck_assert(says(&e, "at most 3"));
    e = (tg_error){0};
    ck_assert_int_eq(tg_read_file(scratch_folder, 1000, &text, &n, &e), TG_INPUT);
    ck_assert_ptr_null(text);
    e = (tg_error){0};
    ck_assert_int_eq(tg_read_file(scratch("absent"), 3, &text, &n, &e), TG_INPUT);
}
END_TEST

Suite *suite_output(void);
Suite *suite_output(void)
{
    SUITE_BEGIN("output", 10);
    tcase_add_checked_fixture(tcase, scratch_begin, scratch_end);
    tcase_add_test(tcase, written_beside);
    tcase_add_test(tcase, dropped);
    tcase_add_test(tcase, permissions);
    tcase_add_test(tcase, links);
    tcase_add_test(tcase, refused);
    tcase_add_test(tcase, own_files);
    tcase_add_test(tcase, inputs_are_kept);
    tcase_add_test(tcase, folders);
    tcase_add_test(tcase, full_disk);
    tcase_add_test(tcase, inputs);
    tcase_add_test(tcase, whole_files);
    return suite;
}
