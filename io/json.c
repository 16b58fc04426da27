#include "io/json.h"

#include "io/memory.h"
#include "io/output.h"

#include <jansson.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* `lost`: something that belongs into this value was not to be had; it passes on to whatever takes the value over. */
struct tg_json {
    json_t *value;
    bool lost;
};

static tg_json *wrap(json_t *value)
{
    tg_json *j = value ? tg_alloc(1, sizeof *j) : NULL;
    if (j)
        j->value = value;
    else
        json_decref(value);
    return j;
}

tg_json *tg_json_object(void)
{
    return wrap(json_object());
}

tg_json *tg_json_array(void)
{
    return wrap(json_array());
}

void tg_json_free(tg_json *j)
{
    if (j) json_decref(j->value);
    tg_free(j);
}

static json_t *number(double value)
{
    if (!isfinite(value)) return json_null();
    /* whole numbers, as counts and seeds, in full */
    if (value == rint(value) && fabs(value) <= 0x1p53) return json_integer((json_int_t)value);
    return json_real(value);
}

/* Bytes of the UTF-8 character that `s` begins with, 0 when it is none (RFC 3629: no overlong forms, surrogates or
 * values above 10FFFF). */
static size_t utf8_length(const unsigned char *s)
{
    static const struct {
        unsigned char first, last, low, high; /* lead bytes, range of the byte that follows */
        size_t length;
    } forms[] = {{0x01, 0x7f, 0, 0, 1},       {0xc2, 0xdf, 0x80, 0xbf, 2}, {0xe0, 0xe0, 0xa0, 0xbf, 3},
                 {0xe1, 0xec, 0x80, 0xbf, 3}, {0xed, 0xed, 0x80, 0x9f, 3}, {0xee, 0xef, 0x80, 0xbf, 3},
                 {0xf0, 0xf0, 0x90, 0xbf, 4}, {0xf1, 0xf3, 0x80, 0xbf, 4}, {0xf4, 0xf4, 0x80, 0x8f, 4}};
    for (size_t i = 0; i < sizeof forms / sizeof *forms; i++) {
        if (*s < forms[i].first || *s > forms[i].last) continue;
        if (forms[i].length > 1 && (s[1] < forms[i].low || s[1] > forms[i].high)) return 0;
        for (size_t k = 2; k < forms[i].length; k++)
            if (s[k] < 0x80 || s[k] > 0xbf) return 0;
        return forms[i].length;
    }
    return 0;
}

/* A text as JSON; a byte that is no UTF-8 becomes the replacement character. */
static json_t *text_of(const char *text)
{
    static const char replacement[] = "\xef\xbf\xbd";
    if (!text) return json_null();
    char *valid = tg_alloc(3 * strlen(text) + 1, 1), *to = valid;
    if (!valid) return NULL;
    while (*text) {
        const size_t n = utf8_length((const unsigned char *)text);
        memcpy(to, n ? text : replacement, n ? n : 3);
        to += n ? n : 3;
        text += n ? n : 1;
    }
    json_t *value = json_string(valid);
    tg_free(valid);
    return value;
}

static void set(tg_json *object, const char *key, json_t *value)
{
    if (!object)
        json_decref(value);
    else if (json_object_set_new(object->value, key, value))
        object->lost = true;
}

static void add(tg_json *array, json_t *value)
{
    if (!array)
        json_decref(value);
    else if (json_array_append_new(array->value, value))
        array->lost = true;
}

/* Take the JSON out of its wrapper; `into` inherits what it lost. */
static json_t *unwrap(tg_json *into, tg_json *j)
{
    json_t *value = j ? j->value : NULL;
    if (into && j && j->lost) into->lost = true;
    tg_free(j);
    return value;
}

void tg_json_set(tg_json *object, const char *key, tg_json *value)
{
    set(object, key, unwrap(object, value));
}

void tg_json_set_number(tg_json *object, const char *key, double value)
{
    set(object, key, number(value));
}

void tg_json_set_text(tg_json *object, const char *key, const char *value)
{
    set(object, key, text_of(value));
}

void tg_json_add(tg_json *array, tg_json *value)
{
    add(array, unwrap(array, value));
}

void tg_json_add_number(tg_json *array, double value)
{
    add(array, number(value));
}

void tg_json_add_text(tg_json *array, const char *value)
{
    add(array, text_of(value));
}

/* "<" stands in JSON texts only; "</" and "<!" would end or hide a page's script. */
static char *escape_tags(const char *json)
{
    size_t marks = 0;
    for (const char *c = json; *c; c++)
        marks += *c == '<';
    char *text = tg_alloc(strlen(json) + 5 * marks + 2, 1), *to = text;
    for (const char *c = json; text && *c; c++) {
        if (c[0] == '<' && c[1] == '!') {
            memcpy(to, "\\u003c", 6);
            to += 6;
        } else {
            *to++ = *c;
            if (c[0] == '<' && c[1] == '/') *to++ = '\\';
        }
    }
    if (text) *to = '\n';
    return text;
}

tg_code tg_json_text(const tg_json *j, char **text, tg_error *e)
{
    char *json = j && !j->lost ? json_dumps(j->value, JSON_INDENT(2) | JSON_REAL_PRECISION(9)) : NULL;
    char *escaped = json ? escape_tags(json) : NULL;
    free(json);
    if (!escaped) return tg_no_memory(e, 1, sizeof *j);
    *text = escaped;
    return TG_OK;
}

tg_code tg_json_write(const char *path, const tg_json *j, tg_error *e)
{
    char *text = NULL;
    tg_code code = tg_json_text(j, &text, e);
    if (code != TG_OK) return code;
    code = tg_output_write(path, text, strlen(text), e);
    tg_free(text);
    return code;
}
