#include "io/yaml.h"

#include "tests/near.h"
#include "tests/scratch.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct {
    tg_text name;
    tg_number radius;
    tg_vector centre;
    int line;
} part;

typedef struct {
    tg_text name, scan;
    tg_number seed;
    struct {
        tg_number kv;
    } beam;
    tg_list parts;
    int line;
} thing;

static const tg_field part_fields[] = {
    TG_LINE_AT(part),
    {.key = "name", .kind = TG_TEXT, .at = offsetof(part, name), .what = "name of the part", .required = true},
    {.key = "radius", .kind = TG_NUMBER, .at = offsetof(part, radius), .unit = "mm", .standard = "1", .what = "radius"},
    {.key = "centre", .kind = TG_VECTOR3, .at = offsetof(part, centre), .unit = "mm", .what = "middle"},
    {0},
};
static const tg_field beam_fields[] = {
    {.key = "kv", .kind = TG_NUMBER, .unit = "kV", .standard = "120", .what = "tube voltage", .low = 10, .high = 600},
    {0},
};
static const tg_field fields[] = {
    TG_LINE_AT(thing),
    {.key = "thing", .kind = TG_TEXT, .at = offsetof(thing, name), .what = "name of the thing", .required = true},
    {.key = "scan", .kind = TG_PATH, .at = offsetof(thing, scan), .what = "file"},
    {.key = "seed", .kind = TG_INTEGER, .at = offsetof(thing, seed), .standard = "1", .what = "seed"},
    {.key = "beam", .kind = TG_GROUP, .at = offsetof(thing, beam), .what = "beam", .item = beam_fields},
    {.key = "parts",
     .kind = TG_LIST,
     .at = offsetof(thing, parts),
     .what = "its parts",
     .item = part_fields,
     .item_size = sizeof(part),
     .required = true},
    {0},
};

static tg_error e;
static thing t;

static void setup(void)
{
    e = (tg_error){0};
    t = (thing){0};
}

static tg_code parse(const char *text)
{
    return tg_yaml_parse(text, strlen(text), "dir/t.yaml", fields, &t, &e);
}

START_TEST(a_description_is_read_with_its_lines)
{
    CK_OK(parse("# a comment\n"
                "thing: 'two words'   # another\n"
                "scan: data/scan.fits\n"
                "beam: {kv: 80}\n"
                "parts:\n"
                "  - name: first\n"
                "    radius: 8\n"
                "  - {name: second, centre: [1, -2.5,\n"
                "     3e1]}\n"
                "  -\n"
                "    name: third\n"));
    ck_assert_str_eq(t.name.v, "two words");
    ck_assert_int_eq(t.name.line, 2);
    ck_assert_int_eq(t.line, 2);
    ck_assert_str_eq(t.scan.v, "dir/data/scan.fits");
    ck_assert(t.seed.v == 1 && t.seed.line == 0);
    ck_assert(t.beam.kv.v == 80 && t.beam.kv.line == 4);
    ck_assert_uint_eq(t.parts.n, 3);
    ck_assert_int_eq(t.parts.line, 5);
    const part *p = t.parts.v;
    ck_assert_str_eq(p[0].name.v, "first");
    ck_assert(p[0].radius.v == 8 && p[0].radius.line == 7 && isnan(p[0].centre.v[0]));
    ck_assert_str_eq(p[1].name.v, "second");
    ck_assert(p[1].radius.v == 1 && p[1].radius.line == 0);
    ck_assert(p[1].centre.v[0] == 1 && p[1].centre.v[1] == -2.5 && p[1].centre.v[2] == 30);
    ck_assert(p[0].line == 6 && p[1].line == 8 && p[2].line == 11);
    tg_fields_free(fields, &t);
}
END_TEST

/* One fault in a file: where it is told, and how. */
static const struct {
    const char *text;
    int line;
    const char *what;
} fault[] = {
    {"", 1, "is empty; tomogauge show --example prints files to start from"},
    {"# only a comment\n", 1, "is empty; tomogauge show --example prints files to start from"},
    {"---\n...\n", 1, "is empty; tomogauge show --example prints files to start from"},
    {"- a\n- b\n", 1, "a description is a mapping, such as `thing: ...`"},
    {"\njust words\n", 2, "a description is a mapping, such as `thing: ...`"},
    {"thing: a\nparts: [{name: b}]\n---\nthing: b\n", 3, "a second document begins here; keep one document in a file"},
    {"thing: &a b\n", 1, "anchors and aliases (& and *) are not used here; write it out"},
    {"thing: b\nparts: [*a]\n", 2, "anchors and aliases (& and *) are not used here; write it out"},
    {"thing: b\nparts: &p [{name: b}]\n", 2, "anchors and aliases (& and *) are not used here; write it out"},
    {"thing: b\nparts: [&p {name: b}]\n", 2, "anchors and aliases (& and *) are not used here; write it out"},
    {"thing: !!str b\n", 1, "tags (!) are not used here; leave them out"},
    {"thing: b\nparts: [{name: c}]\nseed: 8 mm\n", 3, "seed: '8 mm' is not a whole number; write a whole number"},
    {"thing: b\nparts: [{name: c}]\nthing: d\n", 3, "thing: stands on line 1 already; keep one"},
    {"thing: b\nparts: [{name: c}]\nsede: 1\n", 3, "unknown key 'sede'; did you mean 'seed'?"},
    {"thing: b\nparts: [{name: c}]\n<<: {seed: 1}\n", 3,
     "unknown key '<<'; known here: thing, scan, seed, beam, parts"},
    {"thing: b\nparts: [{name: c}]\n? [a, b]\n: c\n", 3, "a key is a single word, not a list or mapping"},
    {"thing: b\nparts:\n  - {name: c}\n  - {radius: 2}\n", 4, "name is missing: name of the part"},
    {"\n\nparts: [{name: c}]\n", 3, "thing is missing: name of the thing"},
    {"thing: b\nparts: []\n", 2, "parts: the list is empty; write at least one item"},
    {"thing: b\nparts: {name: c}\n", 2, "parts: is a mapping; write a list of mappings"},
    {"thing: b\nparts:\n", 2, "parts: is a single value; write a list of mappings"},
    {"thing: b\nparts: [{name: c},\n d]\n", 3, "parts: an item is a mapping, such as {name: ...}"},
    {"thing: b\nparts: [{name: [c]}]\n", 2, "name: is a list; write a text"},
    {"thing: b\nbeam: 3\nparts: [{name: c}]\n", 2, "beam: is a single value; write a mapping of keys to values"},
    {"thing: b\nparts: [{name: c, centre: 3}]\n", 2, "centre: is a single value; write [x, y, z] in mm"},
    {"thing: b\nparts: [{name: c, centre: [1, 2]}]\n", 2, "centre: '1,2' does not hold 3 numbers; write [x, y, z]"},
    {"thing: b\nparts: [{name: c, centre: [1, 2, {}]}]\n", 2,
     "centre: holds something else than numbers; write [x, y, z] in mm"},
    {"thing: b\nparts: [{name: c, centre: ['1,2', 3]}]\n", 2,
     "centre: holds something else than numbers; write [x, y, z] in mm"},
    {"thing: b\nparts: [{name: c, radius: }]\n", 2, "radius: has no value; write a number in mm, or leave it out"},
    {"thing: b\nbeam: {kv: 5}\nparts: [{name: c}]\n", 2, "kv: 5 is out of range; write a number from 10 to 600 kV"},
    {"thing: \"a\\0b\"\nparts: [{name: c}]\n", 1, "thing: holds a NUL character; leave it out"},
};

START_TEST(a_fault_is_told_with_its_line)
{
    ck_assert_int_eq(parse(fault[_i].text), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, fault[_i].what);
    ck_assert_str_eq(e.message[0].file, "dir/t.yaml");
    ck_assert_int_eq(e.message[0].line, fault[_i].line);
    ck_assert_uint_eq(e.count, 1);
    const thing zero = {0};
    ck_assert_msg(!memcmp(&t, &zero, sizeof t), "not released on failure");
}
END_TEST

/* libyaml words these itself: only the place and our advice are fixed. */
START_TEST(what_is_no_yaml_is_told_with_its_line)
{
    static const struct {
        const char *text;
        size_t bytes;
        int line;
        const char *part;
    } bad[] = {
        {"thing: a\nparts: [{name: c}\n", 26, 3, "close brackets"},
        {"thing: a\n\tseed: 1\n", 18, 2, "indent with spaces"},
        {"thing: a: b\n", 12, 1, "quote texts"},
        {"thing: a\nseed: \xff\n", 16, 2, "UTF-8"},
        {"thing: a\nseed: \0\n", 17, 2, "UTF-8"},
        {"thing: a\nseed: \x01\n", 17, 2, "UTF-8"},
    };
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        e = (tg_error){0};
        ck_assert_int_eq(tg_yaml_parse(bad[i].text, bad[i].bytes, "t", fields, &t, &e), TG_INPUT);
        ck_assert_msg(strstr(e.message[0].what, bad[i].part), "%zu: %s", i, e.message[0].what);
        ck_assert_int_eq(e.message[0].line, bad[i].line);
    }
}
END_TEST

START_TEST(all_faults_of_a_file_are_told_in_order)
{
    ck_assert_int_eq(parse("sed: 1\n"
                           "seed: 1.5\n"
                           "parts:\n"
                           "  - name: a\n"
                           "    radius: 8 mm\n"
                           "  - radius: x\n"
                           "    nam: b\n"),
                     TG_INPUT);
    static const int line[] = {1, 2, 5, 6, 7, 6, 1}; /* what is missing is known only at the end of its mapping */
    ck_assert_uint_eq(e.count, sizeof line / sizeof *line);
    for (size_t i = 0; i < e.count; i++)
        ck_assert_int_eq(e.message[i].line, line[i]);
}
END_TEST

START_TEST(more_faults_than_messages_are_counted)
{
    char text[2000] = "thing: a\nparts:\n  - name: b\n";
    for (int i = 0; i < 100; i++)
        snprintf(text + strlen(text), sizeof text - strlen(text), "    key%d: 1\n", i);
    ck_assert_int_eq(parse(text), TG_INPUT);
    ck_assert_uint_eq(e.count, 100);
}
END_TEST

START_TEST(another_description_is_told_once)
{
    ck_assert_int_eq(parse("scan: s\ngadget: a\ncolour: red\nweight: 3\n"), TG_INPUT);
    ck_assert_uint_eq(e.count, 1);
    ck_assert_int_eq(e.message[0].line, 1);
    ck_assert_ptr_nonnull(strstr(e.message[0].what, "not a description of a thing"));
    ck_assert_ptr_nonnull(strstr(e.message[0].what, "begins with 'scan'"));
    e = (tg_error){0};
    ck_assert_int_eq(parse("thing: a\nscan: s\ngadget: a\ncolour: red\n"), TG_INPUT); /* as many are known */
    ck_assert_uint_eq(e.count, 3);
}
END_TEST

/* {a: {a: ... }} of a depth. */
static char *nested(int depth)
{
    char *text = calloc((size_t)depth * 5 + 1, 1);
    ck_assert_ptr_nonnull(text);
    for (int i = 0; i < depth; i++)
        strcat(text, "{a: ");
    for (int i = 0; i < depth; i++)
        strcat(text, "}");
    return text;
}

START_TEST(nesting_stops_at_fifty)
{
    char *fifty = nested(50), *deeper = nested(51), *far = nested(20000);
    ck_assert_int_eq(parse(fifty), TG_INPUT);
    ck_assert_ptr_null(strstr(e.message[0].what, "nested"));
    e = (tg_error){0};
    ck_assert_int_eq(parse(deeper), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, "nested deeper than 50 levels; no description needs that");
    e = (tg_error){0};
    ck_assert_int_eq(parse(far), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, "nested deeper than 50 levels; no description needs that");
    free(fifty);
    free(deeper);
    free(far);
}
END_TEST

START_TEST(sizes_are_bounded)
{
    const size_t bytes = (1 << 20) + 1;
    char *text = malloc(bytes + 1);
    ck_assert_ptr_nonnull(text);
    memset(text, '#', bytes);
    text[bytes] = '\0';
    ck_assert_int_eq(parse(text), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, "larger than 1048576 bytes: not a description");

    e = (tg_error){0};
    strcpy(text, "thing: a\nparts: [");
    char *end = text + strlen(text);
    for (int i = 0; i < 10001; i++)
        end += sprintf(end, "{name: a},");
    strcpy(end, "]\n");
    ck_assert_int_eq(parse(text), TG_INPUT);
    ck_assert_str_eq(e.message[0].what, "parts: more than 10000 items");
    free(text);
}
END_TEST

START_TEST(a_file_is_read)
{
    scratch_begin();
    const char *path = scratch_write("t.yaml", "thing: a\nscan: s.fits\nparts: [{name: b}]\n");
    CK_OK(tg_yaml_read(path, fields, &t, &e));
    ck_assert_str_eq(t.scan.v, scratch("s.fits"));
    tg_fields_free(fields, &t);
    ck_assert_int_eq(remove(path), 0);
    ck_assert_int_eq(tg_yaml_read(path, fields, &t, &e), TG_INPUT);
    ck_assert_str_eq(e.message[0].file, path);
    scratch_end();
}
END_TEST

Suite *suite_yaml(void);
Suite *suite_yaml(void)
{
    SUITE_BEGIN("yaml", 20);
    tcase_add_checked_fixture(tcase, setup, NULL);
    tcase_add_test(tcase, a_description_is_read_with_its_lines);
    tcase_add_loop_test(tcase, a_fault_is_told_with_its_line, 0, sizeof fault / sizeof *fault);
    tcase_add_test(tcase, what_is_no_yaml_is_told_with_its_line);
    tcase_add_test(tcase, all_faults_of_a_file_are_told_in_order);
    tcase_add_test(tcase, more_faults_than_messages_are_counted);
    tcase_add_test(tcase, another_description_is_told_once);
    tcase_add_test(tcase, nesting_stops_at_fifty);
    tcase_add_test(tcase, sizes_are_bounded);
    tcase_add_test(tcase, a_file_is_read);
    return suite;
}
