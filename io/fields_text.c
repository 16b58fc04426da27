#include "io/fields.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* A text in a buffer that may be too small: then only its length goes on growing. */
typedef struct {
    char *out;
    size_t size, length;
} written;

static void put(written *w, const char *format, ...) __attribute__((format(printf, 2, 3)));
static void put(written *w, const char *format, ...)
{
    const bool room = w->length < w->size;
    va_list args;
    va_start(args, format);
    const int n = vsnprintf(room ? w->out + w->length : NULL, room ? w->size - w->length : 0, format, args);
    va_end(args);
    w->length += n > 0 ? (size_t)n : 0;
}

/* The shortest text that reads back as the same number. */
static void put_number(written *w, double v)
{
    char text[32];
    for (int digits = 6; digits <= 17; digits++) {
        snprintf(text, sizeof text, "%.*g", digits, v);
        if (strtod(text, NULL) == v) break;
    }
    put(w, "%s", text);
}

static void put_key(written *w, const char *prefix, const tg_field *f)
{
    put(w, "%s%s%s=", w->length ? " " : "", prefix, f->key);
}

static void put_text(written *w, const char *prefix, const tg_field *f, const tg_text *text)
{
    if (!text->v) return;
    const char *quote = strpbrk(text->v, " \t\n=") ? "'" : "";
    put_key(w, prefix, f);
    put(w, "%s%s%s", quote, text->v, quote);
}

static void put_vector(written *w, const char *prefix, const tg_field *f, const tg_vector *vector)
{
    if (isnan(vector->v[0])) return;
    put_key(w, prefix, f);
    for (int i = 0; i < (f->kind == TG_VECTOR2 ? 2 : 3); i++) {
        if (i) put(w, ",");
        put_number(w, vector->v[i]);
    }
}

static void put_plain(written *w, const char *prefix, const tg_field *f, const tg_number *number)
{
    const bool none = isnan(number->v);
    char word[TG_WORD];
    if (none && !number->line) return;
    put_key(w, prefix, f);
    if (f->kind == TG_SWITCH)
        put(w, number->v != 0 ? "true" : "false");
    else if (none || f->kind == TG_CHOICE)
        put(w, "%s", tg_word_at(f->words, none ? 0 : (int)number->v, word));
    else
        put_number(w, number->v);
}

static void put_fields(written *w, const char *prefix, const tg_field *fields, const void *base)
{
    for (const tg_field *f = fields; f->key; f++) {
        const void *value = (const char *)base + f->at;
        char inner[128];
        switch (f->kind) {
        case TG_NUMBER:
        case TG_INTEGER:
        case TG_SWITCH:
        case TG_CHOICE: put_plain(w, prefix, f, value); break;
        case TG_TEXT:
        case TG_PATH: put_text(w, prefix, f, value); break;
        case TG_VECTOR2:
        case TG_VECTOR3: put_vector(w, prefix, f, value); break;
        case TG_GROUP:
            snprintf(inner, sizeof inner, "%s%s.", prefix, f->key);
            put_fields(w, inner, f->item, value);
            break;
        case TG_LIST:
        case TG_LINE: break;
        }
    }
}

size_t tg_fields_text(const tg_field *fields, const void *base, char *out, size_t size)
{
    written w = {out, size, 0};
    if (size) out[0] = '\0';
    put_fields(&w, "", fields, base);
    return w.length;
}
