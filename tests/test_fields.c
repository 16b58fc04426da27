#include "io/fields.h"

#include "tests/near.h"

#include <stdlib.h>
#include <string.h>

typedef struct {
    tg_number x, n, on, shape, nominal, free_number;
    tg_text name, path;
    tg_vector centre, corner;
    struct {
        tg_number kv;
    } beam;
    tg_list list;
    int line;
} sample;

typedef struct {
    tg_text name;
} item;

static const tg_field item_fields[] = {TG_ROW(item, "name", TG_TEXT, name, .what = "name"), {0}};
static const tg_field beam_fields[] = {
    {.key = "kv", .kind = TG_NUMBER, .unit = "kV", .standard = "120", .what = "tube voltage", .low = 10, .high = 600},
    {0},
};
static const tg_field fields[] = {
    TG_LINE_AT(sample),
    TG_ROW(sample, "radius", TG_NUMBER, x, .unit = "mm", .what = "radius", .low = TG_ABOVE_ZERO, .high = DBL_MAX),
    TG_ROW(sample, "pixels", TG_INTEGER, n, .standard = "512", .what = "pixels", .low = 1, .high = 4096),
    TG_ROW(sample, "noise", TG_SWITCH, on, .standard = "false", .what = "noise"),
    TG_ROW(sample, "shape", TG_CHOICE, shape, .words = "cylinder sphere box", .standard = "sphere", .what = "shape"),
    TG_ROW(sample, "nominal", TG_NUMBER, nominal, .words = "computed", .unit = "HU", .what = "nominal value"),
    TG_ROW(sample, "shift", TG_NUMBER, free_number, .what = "shift"),
    TG_ROW(sample, "name", TG_TEXT, name, .what = "name", .required = true),
    TG_ROW(sample, "scan", TG_PATH, path, .what = "scan"),
    TG_ROW(sample, "centre", TG_VECTOR3, centre, .unit = "mm", .standard = "0,0,0", .what = "centre"),
    TG_ROW(sample, "corner", TG_VECTOR2, corner, .unit = "mm", .what = "corner", .low = -5, .high = 5),
    TG_ROW(sample, "beam", TG_GROUP, beam, .what = "beam", .item = beam_fields),
    TG_ROW(sample, "list", TG_LIST, list, .what = "list", .item = item_fields, .item_size = sizeof(item)),
    {0},
};

static tg_error e;
static sample s;

static void setup(void)
{
    e = (tg_error){0};
    s = (sample){0};
    CK_OK(tg_fields_default(fields, &s, &e));
}

static void teardown(void)
{
    tg_fields_free(fields, &s);
}

static tg_code set(const char *key, const char *text)
{
    e = (tg_error){0};
    return tg_field_set(tg_fields_find(fields, key), &s, text, "p.yaml", 7, &e);
}

START_TEST(defaults_stand_and_count_as_not_given)
{
    ck_assert(isnan(s.x.v) && s.x.line == 0);
    ck_assert(s.n.v == 512 && s.n.line == 0);
    ck_assert(s.on.v == 0 && s.shape.v == 1);
    ck_assert_ptr_null(s.name.v);
    ck_assert(s.centre.v[2] == 0 && isnan(s.corner.v[0]) && isnan(s.corner.v[1]));
    ck_assert(s.beam.kv.v == 120);
    ck_assert(s.list.v == NULL && s.list.n == 0);
}
END_TEST

START_TEST(numbers_are_read_as_written)
{
    static const struct {
        const char *text;
        double v;
    } good[] = {{"8", 8},      {"8.5", 8.5},     {"+.5", .5}, {"5.", 5},
                {"1e3", 1000}, {"2.5E-2", .025}, {" 7 ", 7},  {"007", 7}};
    for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
        CK_OK(set("radius", good[i].text));
        ck_assert_msg(s.x.v == good[i].v && s.x.line == 7, "%s became %g", good[i].text, s.x.v);
    }
    CK_OK(set("shift", "-12.25"));
    ck_assert(s.free_number.v == -12.25);
}
END_TEST

/* The message for a text that must be refused; the value must stay as it was. */
static const struct {
    const char *key, *text, *what;
} refused[] = {
    {"radius", "8 mm", "radius: '8 mm' is not a number; write 8, in mm"},
    {"radius", "8mm", "radius: '8mm' is not a number; write 8, in mm"},
    {"radius", "8 cm", "radius: '8 cm' is not a number; write a number above 0 mm"},
    {"radius", "8,5", "radius: '8,5' is not a number; write 8.5"},
    {"radius", "1,500", "radius: '1,500' is not a number; write 1.500 or 1500"},
    {"radius", "nan", "radius: 'nan' is not a number; write a number above 0 mm"},
    {"radius", "inf", "radius: 'inf' is not a number; write a number above 0 mm"},
    {"radius", "0x10", "radius: '0x10' is not a number; write a number above 0 mm"},
    {"radius", "1e", "radius: '1e' is not a number; write a number above 0 mm"},
    {"radius", ".", "radius: '.' is not a number; write a number above 0 mm"},
    {"radius", "--8", "radius: '--8' is not a number; write a number above 0 mm"},
    {"radius", "1e999", "radius: '1e999' is too large; write a number above 0 mm"},
    {"radius", "0", "radius: 0 is out of range; write a number above 0 mm"},
    {"radius", "1e-999", "radius: 1e-999 is out of range; write a number above 0 mm"},
    {"radius", "-3", "radius: -3 is out of range; write a number above 0 mm"},
    {"radius", "", "radius: has no value; write a number above 0 mm, or leave it out"},
    {"radius", "8\n\033[2J", "radius: '8??[2J' is not a number; write a number above 0 mm"},
    {"pixels", "984.5", "pixels: '984.5' is not a whole number; write a whole number from 1 to 4096"},
    {"pixels", "4097", "pixels: 4097 is out of range; write a whole number from 1 to 4096"},
    {"shift", "x", "shift: 'x' is not a number; write a number"},
    {"nominal", "computd", "nominal: 'computd' is not known; did you mean 'computed'?"},
    {"nominal", "water", "nominal: 'water' is not a number; write a number in HU or computed"},
    {"noise", "maybe", "noise: 'maybe' is not true or false"},
    {"noise", "1", "noise: '1' is not true or false"},
    {"shape", "Box", "shape: 'Box' is not known; did you mean 'box'?"},
    {"shape", "ellipse", "shape: 'ellipse' is not known; write cylinder, sphere or box"},
    {"name", " ", "name: has no value; write a text"},
    {"centre", "1,2", "centre: '1,2' does not hold 3 numbers; write [x, y, z]"},
    {"centre", "1,2,3,4", "centre: '1,2,3,4' does not hold 3 numbers; write [x, y, z]"},
    {"centre", "1,,3", "centre: '' is not a number; write [x, y, z] in mm"},
    {"centre", "1,2,3 mm", "centre: '3 mm' is not a number; write 3, in mm"},
    {"corner", "1,9", "corner: 9 is out of range; write [x, y], each from -5 to 5 mm"},
    {"beam", "120", "beam: '120' is a single value; write a mapping of keys to values"},
    {"list", "a", "list: 'a' is a single value; write a list of mappings"},
};

START_TEST(refusals_say_what_to_do)
{
    CK_OK(set("radius", "42"));
    ck_assert_int_eq(set(refused[_i].key, refused[_i].text), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, refused[_i].what);
    ck_assert_str_eq(e.message[0].file, "p.yaml");
    ck_assert_int_eq(e.message[0].line, 7);
    ck_assert_uint_eq(e.count, 1);
    ck_assert(s.x.v == 42 && s.n.v == 512 && s.shape.v == 1 && s.centre.v[0] == 0 && !s.name.v);
}
END_TEST

START_TEST(a_command_line_is_a_wrong_use_and_names_the_option)
{
    const tg_field *radius = tg_fields_find(fields, "radius"), *corner = tg_fields_find(fields, "corner");
    ck_assert_int_eq(tg_field_set(radius, &s, "abc", NULL, 0, &e), TG_USAGE);
    ck_assert_str_eq(e.message[0].what, "--radius: 'abc' is not a number; write a number above 0 mm");
    ck_assert_int_eq(tg_field_set(corner, &s, "3", NULL, 0, &e), TG_USAGE);
    ck_assert_str_eq(e.message[1].what, "--corner: '3' does not hold 2 numbers; write x,y");
    ck_assert_int_eq(tg_fields_unknown(fields, "radios", NULL, 0, &e), TG_USAGE);
    ck_assert_str_eq(e.message[2].what, "unknown option '--radios'; did you mean '--radius'?");
    CK_OK(tg_field_set(radius, &s, "3", NULL, 0, &e));
    ck_assert_int_eq(tg_field_line(radius, &s), 1); /* given, though no line is known */
}
END_TEST

START_TEST(words_choices_and_switches)
{
    CK_OK(set("nominal", "computed"));
    ck_assert(isnan(s.nominal.v) && s.nominal.line == 7);
    CK_OK(set("shape", "box"));
    ck_assert(s.shape.v == 2);
    static const char *const on[] = {"false", "true", "no", "yes"};
    for (int i = 0; i < 4; i++) {
        CK_OK(set("noise", on[i]));
        ck_assert(s.on.v == i % 2);
    }
    CK_OK(set("pixels", "1")); /* limits are inclusive */
    CK_OK(set("pixels", "4096"));
    CK_OK(set("corner", "-5,5"));
    CK_OK(set("pixels", "1e3"));
    ck_assert(s.n.v == 1000);
    CK_OK(set("centre", "1, -2.5 ,3e0"));
    ck_assert(s.centre.v[0] == 1 && s.centre.v[1] == -2.5 && s.centre.v[2] == 3);
}
END_TEST

START_TEST(texts_and_paths)
{
    CK_OK(set("name", "first"));
    CK_OK(set("name", "second one")); /* the first is released: the address sanitizer would tell */
    ck_assert_str_eq(s.name.v, "second one");
    const tg_field *scan = tg_fields_find(fields, "scan");
    static const struct {
        const char *file, *text, *path;
    } path[] = {{"a/b/job.yaml", "scan.fits", "a/b/scan.fits"},
                {"a/job.yaml", "../s.fits", "a/../s.fits"},
                {"job.yaml", "s.fits", "s.fits"},
                {"a/job.yaml", "/s.fits", "/s.fits"},
                {NULL, "s.fits", "s.fits"},
                {"/job.yaml", "s.fits", "/s.fits"}};
    for (size_t i = 0; i < sizeof path / sizeof *path; i++) {
        CK_OK(tg_field_set(scan, &s, path[i].text, path[i].file, 1, &e));
        ck_assert_str_eq(s.path.v, path[i].path);
    }
}
END_TEST

START_TEST(unknown_keys_get_the_nearest)
{
    ck_assert_int_eq(tg_fields_unknown(fields, "cnetre", "p.yaml", 3, &e), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, "unknown key 'cnetre'; did you mean 'centre'?");
    tg_fields_unknown(beam_fields, "zzzzzz", "p.yaml", 3, &e);
    ck_assert_str_eq(e.message[1].what, "unknown key 'zzzzzz'; known here: kv");
    ck_assert_ptr_null(tg_fields_find(fields, "")); /* the row of the line has no key */
}
END_TEST

START_TEST(nearest_words)
{
    /* distances by hand: a swap, a change, a loss and an addition count 1 each */
    static const struct {
        const char *word, *near;
    } w[] = {{"hnan", "hann"}, {"henn", "hann"}, {"han", "hann"},       {"hannn", "hann"}, {"HANN", "hann"},
             {"abcd", NULL},   {"", NULL},       {"cosinus", "cosine"}, {"h", NULL},       {"ramps", "ramp"}};
    for (size_t i = 0; i < sizeof w / sizeof *w; i++) {
        char near[TG_WORD] = "";
        const bool found = tg_nearest(w[i].word, "ramp hann cosine", near);
        ck_assert_msg(found == (w[i].near != NULL), "%s: %s", w[i].word, near);
        if (found) ck_assert_str_eq(near, w[i].near);
    }
    char long_word[200], near[TG_WORD];
    ck_assert(tg_nearest("fpb", "art fbp", near) && !strcmp(near, "fbp")); /* a swap is one step, not two */
    ck_assert(tg_nearest("xamp", "ramp lamp", near) && !strcmp(near, "ramp"));
    memset(long_word, 'a', sizeof long_word - 1);
    long_word[sizeof long_word - 1] = '\0';
    ck_assert(!tg_nearest(long_word, "ramp", near));
    ck_assert(!tg_nearest("ramp", NULL, near));
}
END_TEST

START_TEST(shown_texts_are_short_and_whole)
{
    ck_assert_str_eq(tg_show("a\tb\x7f").text, "a?b?");
    char text[100];
    text[0] = 'a';
    for (int i = 0; i < 49; i++)
        memcpy(text + 1 + 2 * i, "\xc3\xa9", 3); /* e with acute accent, two bytes each */
    const tg_shown shown = tg_show(text);
    const size_t n = strlen(shown.text);
    ck_assert(n < sizeof shown.text && !strcmp(shown.text + n - 3, "..."));
    ck_assert_uint_eq((n - 4) % 2, 0); /* not cut through a letter */
}
END_TEST

START_TEST(text_of_all_values_reads_back)
{
    CK_OK(set("radius", "0.1"));
    CK_OK(set("nominal", "computed"));
    CK_OK(set("name", "two words"));
    CK_OK(set("centre", "1,2,0.30000000000000004"));
    char text[300], small[8];
    const size_t n = tg_fields_text(fields, &s, text, sizeof text);
    ck_assert_str_eq(text, "radius=0.1 pixels=512 noise=false shape=sphere nominal=computed name='two words' "
                           "centre=1,2,0.30000000000000004 beam.kv=120");
    ck_assert_uint_eq(n, strlen(text));
    ck_assert_uint_eq(tg_fields_text(fields, &s, small, sizeof small), n);
    ck_assert_str_eq(small, "radius=");
    ck_assert_uint_eq(tg_fields_text(fields, &s, NULL, 0), n);
}
END_TEST

START_TEST(freed_tables_are_zero)
{
    CK_OK(set("name", "x"));
    tg_fields_free(fields, &s);
    ck_assert(s.name.v == NULL && s.x.v == 0 && s.n.v == 0 && s.centre.v[0] == 0 && s.beam.kv.v == 0);
    tg_fields_free(fields, &s); /* twice is fine */
}
END_TEST

START_TEST(without_an_error_struct_only_the_code_is_told)
{
    ck_assert_int_eq(tg_field_set(tg_fields_find(fields, "radius"), &s, "x", "p", 1, NULL), TG_INPUT);
    ck_assert_int_eq(tg_fields_unknown(fields, "x", "p", 1, NULL), TG_INPUT);
}
END_TEST

Suite *suite_fields(void);
Suite *suite_fields(void)
{
    SUITE_BEGIN("fields", 10);
    tcase_add_checked_fixture(tcase, setup, teardown);
    tcase_add_test(tcase, defaults_stand_and_count_as_not_given);
    tcase_add_test(tcase, numbers_are_read_as_written);
    tcase_add_loop_test(tcase, refusals_say_what_to_do, 0, sizeof refused / sizeof *refused);
    tcase_add_test(tcase, a_command_line_is_a_wrong_use_and_names_the_option);
    tcase_add_test(tcase, words_choices_and_switches);
    tcase_add_test(tcase, texts_and_paths);
    tcase_add_test(tcase, unknown_keys_get_the_nearest);
    tcase_add_test(tcase, nearest_words);
    tcase_add_test(tcase, shown_texts_are_short_and_whole);
    tcase_add_test(tcase, text_of_all_values_reads_back);
    tcase_add_test(tcase, freed_tables_are_zero);
    tcase_add_test(tcase, without_an_error_struct_only_the_code_is_told);
    return suite;
}
