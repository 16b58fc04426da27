#include "io/json.h"
#include "io/memory.h"
#include "tests/near.h"

#include <stdio.h>
#include <string.h>

/* Compares the text of {"k": value} with what RFC 8259 says; takes the object over. */
static void check(tg_json *j, const char *want)
{
    tg_error e = {0};
    char *text = NULL;
    CK_OK(tg_json_text(j, &text, &e));
    ck_assert_str_eq(text, want);
    tg_free(text);
    tg_json_free(j);
}

START_TEST(numbers)
{
    static const struct {
        double v;
        const char *text;
    } rows[] = {{1.0 / 3, "0.333333333"},
                {-2.5e-7, "-2.5e-7"},
                {938.25, "938.25"},
                {1234567890.5, "1.23456789e9"},
                {42, "42"},
                {-3, "-3"},
                {9007199254740991.0, "9007199254740991"},
                {1e300, "1e300"},
                {NAN, "null"},
                {INFINITY, "null"},
                {-INFINITY, "null"}};
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        char want[64];
        tg_json *j = tg_json_object();
        tg_json_set_number(j, "k", rows[i].v);
        snprintf(want, sizeof want, "{\n  \"k\": %s\n}\n", rows[i].text);
        check(j, want);
    }
}
END_TEST

START_TEST(texts)
{
    static const struct {
        const char *v, *text;
    } rows[] = {{"plain", "\"plain\""},
                {NULL, "null"},
                {"", "\"\""},
                {"quote \" back \\ line \n tab \t", "\"quote \\\" back \\\\ line \\n tab \\t\""},
                {"1/mm", "\"1/mm\""},
                {"</script>", "\"<\\/script>\""},
                {"<!-- <script>", "\"\\u003c!-- <script>\""},
                {"a < b", "\"a < b\""},
                {"\xc3\xa9\xe2\x82\xac\xf0\x9f\x98\x80", "\"\xc3\xa9\xe2\x82\xac\xf0\x9f\x98\x80\""},
                {"a\xff"
                 "b",
                 "\"a\xef\xbf\xbd"
                 "b\""},
                {"\xc3", "\"\xef\xbf\xbd\""},                                                  /* cut short */
                {"\xc0\xaf", "\"\xef\xbf\xbd\xef\xbf\xbd\""},                                  /* overlong "/" */
                {"\xed\xa0\x80", "\"\xef\xbf\xbd\xef\xbf\xbd\xef\xbf\xbd\""},                  /* surrogate */
                {"\xf4\x90\x80\x80", "\"\xef\xbf\xbd\xef\xbf\xbd\xef\xbf\xbd\xef\xbf\xbd\""}}; /* above 10FFFF */
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        char want[96];
        tg_json *j = tg_json_object();
        tg_json_set_text(j, "k", rows[i].v);
        snprintf(want, sizeof want, "{\n  \"k\": %s\n}\n", rows[i].text);
        check(j, want);
    }
}
END_TEST

/* Keys stay in the order they were set; a key set twice keeps its place and takes the later value. */
START_TEST(structure)
{
    tg_json *j = tg_json_object(), *a = tg_json_array(), *inner = tg_json_object();
    tg_json_set_number(j, "z", 1);
    tg_json_set_number(j, "a", 2);
    tg_json_set_number(j, "z", 3);
    tg_json_set_text(inner, "n", "x");
    tg_json_add_number(a, 0.5);
    tg_json_add_text(a, "t");
    tg_json_add(a, inner);
    tg_json_add(a, tg_json_array());
    tg_json_set(j, "list", a);
    check(j, "{\n  \"z\": 3,\n  \"a\": 2,\n  \"list\": [\n    0.5,\n    \"t\",\n    {\n      \"n\": \"x\"\n    },\n    "
             "[]\n  ]\n}\n");
}
END_TEST

/* What could not be had is noticed once, at the end, however deep it was. */
START_TEST(lost)
{
    tg_error e = {0};
    char *text = NULL;
    tg_json *j = tg_json_object(), *a = tg_json_array();
    tg_json_set_number(NULL, "k", 1);
    tg_json_set_text(NULL, "k", "v");
    tg_json_add_number(NULL, 1);
    tg_json_add_text(NULL, "v");
    tg_json_add(NULL, tg_json_object());
    tg_json_set(NULL, "k", tg_json_object());
    tg_json_free(NULL);
    ck_assert_int_eq(tg_json_text(NULL, &text, &e), TG_MACHINE);
    tg_json_add(a, NULL);
    tg_json_set(j, "list", a);
    ck_assert_int_eq(tg_json_text(j, &text, &e), TG_MACHINE);
    ck_assert_ptr_null(text);
    tg_json_free(j);
}
END_TEST

Suite *suite_json(void);
Suite *suite_json(void)
{
    SUITE_BEGIN("json", 5);
    tcase_add_test(tcase, numbers);
    tcase_add_test(tcase, texts);
    tcase_add_test(tcase, structure);
    tcase_add_test(tcase, lost);
    return suite;
}
