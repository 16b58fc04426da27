/* Any bytes as a description: a table with every kind of field, filled or refused. */
#include "io/yaml.h"

#include <stdint.h>
#include <stdlib.h>

typedef struct {
    tg_text name;
    tg_vector centre;
    int line;
} item;

typedef struct {
    tg_text name, path;
    tg_number number, whole, on, choice;
    tg_vector corner;
    struct {
        tg_number kv;
    } beam;
    tg_list items;
} thing;

#define ROW(of, name, as, member, ...) \
    { \
        .key = name, .kind = as, .at = offsetof(of, member), .what = name, __VA_ARGS__ \
    }

static const tg_field item_fields[] = {
    TG_LINE_AT(item),
    ROW(item, "name", TG_TEXT, name, .required = true),
    ROW(item, "centre", TG_VECTOR3, centre, .standard = "0,0,0"),
    {0},
};
static const tg_field beam_fields[] = {{.key = "kv", .kind = TG_NUMBER, .what = "kv", .low = 10, .high = 600}, {0}};
static const tg_field fields[] = {
    ROW(thing, "name", TG_TEXT, name, .required = true),
    ROW(thing, "path", TG_PATH, path, .standard = "here"),
    ROW(thing, "number", TG_NUMBER, number, .words = "computed", .unit = "mm"),
    ROW(thing, "whole", TG_INTEGER, whole, .low = 1, .high = 9),
    ROW(thing, "on", TG_SWITCH, on, .standard = "false"),
    ROW(thing, "choice", TG_CHOICE, choice, .words = "cylinder sphere box"),
    ROW(thing, "corner", TG_VECTOR2, corner, .low = -5, .high = 5),
    ROW(thing, "beam", TG_GROUP, beam, .item = beam_fields),
    ROW(thing, "items", TG_LIST, items, .item = item_fields, .item_size = sizeof(item)),
    {0},
};

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    thing t = {0};
    tg_error e = {0};
    const tg_code code = tg_yaml_parse((const char *)data, size, "folder/fuzz.yaml", fields, &t, &e);
    if ((code == TG_OK) != (e.code == TG_OK)) abort(); /* a refusal says why */
    char text[64];
    if (code == TG_OK) tg_fields_text(fields, &t, text, sizeof text);
    tg_fields_free(fields, &t);
    return 0;
}
