#include "io/fields.h"

#include "io/memory.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void *at(const tg_field *field, void *base)
{
    return (char *)base + field->at;
}

static const void *at_const(const tg_field *field, const void *base)
{
    return (const char *)base + field->at;
}

/* How a kind is stored. */
typedef enum { NUMBER, TEXT, VECTOR, LIST, LINE, GROUP } stored;

static stored stored_as(const tg_field *field)
{
    switch (field->kind) {
    case TG_NUMBER:
    case TG_INTEGER:
    case TG_SWITCH:
    case TG_CHOICE: return NUMBER;
    case TG_TEXT:
    case TG_PATH: return TEXT;
    case TG_VECTOR2:
    case TG_VECTOR3: return VECTOR;
    case TG_LIST: return LIST;
    case TG_LINE: return LINE;
    case TG_GROUP: break;
    }
    return GROUP;
}

static int components(const tg_field *field)
{
    return field->kind == TG_VECTOR2 ? 2 : 3;
}

/* ---- ranges ---- */

/* Append to a text of 256 bytes, which stays terminated. */
static void append(char out[256], const char *format, ...) __attribute__((format(printf, 2, 3)));
static void append(char out[256], const char *format, ...)
{
    const size_t n = strlen(out);
    va_list args;
    va_start(args, format);
    vsnprintf(out + n, 256 - n, format, args);
    va_end(args);
}

static const double MOST_WHOLE = 0x1p53; /* of whole numbers; a limit that large is none */

static bool has_low(const tg_field *f)
{
    return (f->low != 0 || f->high != 0) && f->low > -DBL_MAX;
}

static bool has_high(const tg_field *f)
{
    return (f->low != 0 || f->high != 0) && f->high < (f->kind == TG_INTEGER ? MOST_WHOLE : DBL_MAX);
}

static bool in_range(const tg_field *f, double v)
{
    return !(has_low(f) && v < f->low) && !(has_high(f) && v > f->high);
}

static void append_limits(const tg_field *f, char out[256])
{
    if (has_low(f) && f->low == TG_ABOVE_ZERO)
        append(out, has_high(f) ? " above 0 and up to %.10g" : " above 0", f->high);
    else if (has_low(f) && has_high(f))
        append(out, " from %.10g to %.10g", f->low, f->high);
    else if (has_low(f))
        append(out, " from %.10g upwards", f->low);
    else if (has_high(f))
        append(out, " up to %.10g", f->high);
    else if (f->unit)
        append(out, " in");
    if (f->unit) append(out, " %s", f->unit);
}

static void append_words(const char *words, char out[256])
{
    const size_t n = strlen(out);
    tg_words_list(words, " or ", out + n, 256 - n);
}

const char *tg_field_range(const tg_field *field, char out[256])
{
    out[0] = '\0';
    switch (field->kind) {
    case TG_NUMBER:
    case TG_INTEGER:
        append(out, field->kind == TG_NUMBER ? "a number" : "a whole number");
        append_limits(field, out);
        if (field->words) {
            append(out, " or ");
            append_words(field->words, out);
        }
        break;
    case TG_SWITCH: append(out, "true or false"); break;
    case TG_CHOICE: append_words(field->words, out); break;
    case TG_TEXT: append(out, "a text"); break;
    case TG_PATH: append(out, "the name of a file"); break;
    case TG_VECTOR2:
    case TG_VECTOR3:
        append(out, field->kind == TG_VECTOR2 ? "[x, y]" : "[x, y, z]");
        if (has_low(field) || has_high(field)) append(out, ", each");
        append_limits(field, out);
        break;
    case TG_GROUP: append(out, "a mapping of keys to values"); break;
    case TG_LIST: append(out, "a list of mappings"); break;
    case TG_LINE: break;
    }
    return out;
}

/* ---- text to value ---- */

/* Where a text stands, for messages. */
typedef struct {
    const tg_field *field;
    const char *file;
    int line;
    tg_error *e;
} place;

/* A wrong value; a command line (no file) calls the key by its option. */
static tg_code wrong(const place *p, const char *format, ...) __attribute__((format(printf, 2, 3)));
static tg_code wrong(const place *p, const char *format, ...)
{
    char what[400];
    va_list args;
    va_start(args, format);
    vsnprintf(what, sizeof what, format, args);
    va_end(args);
    return tg_fail(p->e, p->file ? TG_INPUT : TG_USAGE, p->file, p->line, "%s%s: %s", p->file ? "" : "--",
                   p->field->key, what);
}

static const char *skip_digits(const char *s)
{
    while (*s >= '0' && *s <= '9')
        s++;
    return s;
}

static const char *skip_blanks(const char *s)
{
    return s + strspn(s, " \t");
}

/* The end of the decimal number that a text begins with; the text itself when it begins with none. */
static const char *number_end(const char *text)
{
    const char *s = text + (*text == '+' || *text == '-');
    const char *end = skip_digits(s);
    bool digits = end > s;
    if (*end == '.') {
        const char *fraction = skip_digits(end + 1);
        digits = digits || fraction > end + 1;
        end = fraction;
    }
    if (!digits) return text;
    if (*end == 'e' || *end == 'E') {
        const char *power = end + 1 + (end[1] == '+' || end[1] == '-');
        if (skip_digits(power) > power) end = skip_digits(power);
    }
    return end;
}

/* Say what is wrong with a text that is no number, as helpfully as it lets us. */
static tg_code no_number(const place *p, const char *text, const char *end)
{
    const tg_field *f = p->field;
    const int n = end - text < 32 ? (int)(end - text) : 32;
    const char *rest = skip_blanks(end);
    char near[TG_WORD], range[256];
    const char *kind = f->kind == TG_INTEGER ? "a whole number" : "a number";
    if (end > text && f->unit && !strcmp(rest, f->unit))
        return wrong(p, "'%s' is not %s; write %.*s, in %s", tg_show(text).text, kind, n, text, f->unit);
    if (end > text && end[0] == ',' && skip_digits(end + 1) > end + 1 && !*skip_digits(end + 1)) {
        const tg_shown fraction = tg_show(end + 1);
        if (strlen(end + 1) == 3) /* perhaps thousands are meant */
            return wrong(p, "'%s' is not %s; write %.*s.%s or %.*s%s", tg_show(text).text, kind, n, text, fraction.text,
                         n, text, fraction.text);
        return wrong(p, "'%s' is not %s; write %.*s.%s", tg_show(text).text, kind, n, text, fraction.text);
    }
    if (f->words && tg_nearest(text, f->words, near))
        return wrong(p, "'%s' is not known; did you mean '%s'?", tg_show(text).text, near);
    return wrong(p, "'%s' is not %s; write %s", tg_show(text).text, kind, tg_field_range(f, range));
}

static tg_code read_number(const place *p, const char *text, double *v)
{
    const tg_field *f = p->field;
    char range[256];
    text = skip_blanks(text);
    const char *end = number_end(text);
    if (end == text || *skip_blanks(end)) return no_number(p, text, end);
    char *stop;
    const double x = strtod(text, &stop);
    if (stop != end) return no_number(p, text, end); /* the process left the "C" locale */
    if (!isfinite(x)) return wrong(p, "'%s' is too large; write %s", tg_show(text).text, tg_field_range(f, range));
    if (f->kind == TG_INTEGER && (x != floor(x) || fabs(x) > MOST_WHOLE))
        return wrong(p, "'%s' is not a whole number; write %s", tg_show(text).text, tg_field_range(f, range));
    if (!in_range(f, x)) return wrong(p, "%s is out of range; write %s", tg_show(text).text, tg_field_range(f, range));
    *v = x;
    return TG_OK;
}

static tg_code read_switch(const place *p, const char *text, double *v)
{
    const int i = tg_word_index(text, "false true no yes");
    if (i < 0) return wrong(p, "'%s' is not true or false", tg_show(text).text);
    *v = i % 2;
    return TG_OK;
}

static tg_code read_choice(const place *p, const char *text, double *v)
{
    char near[TG_WORD], range[256];
    const int i = tg_word_index(text, p->field->words);
    if (i < 0 && tg_nearest(text, p->field->words, near))
        return wrong(p, "'%s' is not known; did you mean '%s'?", tg_show(text).text, near);
    if (i < 0) return wrong(p, "'%s' is not known; write %s", tg_show(text).text, tg_field_range(p->field, range));
    *v = i;
    return TG_OK;
}

static tg_code read_vector(const place *p, const char *text, tg_vector *out)
{
    const int want = components(p->field);
    tg_vector v = {{0}, 0};
    int n = 0;
    bool more = true;
    for (const char *from = text; more && n <= want; n++) {
        char part[TG_WORD] = "";
        const size_t length = strcspn(from, ",");
        if (length < sizeof part) memcpy(part, from, length); /* longer: left empty, which is no number */
        more = from[length];
        from += length + 1;
        const tg_code code = n < want ? read_number(p, part, &v.v[n]) : TG_OK;
        if (code != TG_OK) return code;
    }
    if (n != want)
        return wrong(p, "'%s' does not hold %d numbers; write %s", tg_show(text).text, want,
                     p->file ? (want == 2 ? "[x, y]" : "[x, y, z]") : (want == 2 ? "x,y" : "x,y,z"));
    *out = v;
    return TG_OK;
}

/* A copy of a path as seen from the folder of the description that holds it. */
static char *resolve(const char *path, const char *file)
{
    const char *slash = file ? strrchr(file, '/') : NULL;
    if (!slash || path[0] == '/') return tg_copy_text(path);
    const size_t folder = (size_t)(slash - file) + 1, n = strlen(path) + 1;
    char *joined = tg_alloc(folder + n, 1);
    if (!joined) return NULL;
    memcpy(joined, file, folder);
    memcpy(joined + folder, path, n);
    return joined;
}

/* @param given  the line to store with the value */
static tg_code set(const place *p, void *base, const char *text, int given)
{
    const tg_field *field = p->field;
    void *value = at(field, base);
    tg_code code = TG_OK;
    char range[256];
    if (!text[strspn(text, " \t\r\n")])
        return wrong(p, "has no value; write %s%s", tg_field_range(field, range),
                     field->required ? "" : ", or leave it out");
    switch (stored_as(field)) {
    case NUMBER: {
        double v = NAN;
        if (field->kind == TG_SWITCH)
            code = read_switch(p, text, &v);
        else if (field->kind == TG_CHOICE)
            code = read_choice(p, text, &v);
        else if (tg_word_index(text, field->words) < 0)
            code = read_number(p, text, &v);
        if (code == TG_OK) *(tg_number *)value = (tg_number){v, given};
        break;
    }
    case TEXT: {
        tg_text *old = value;
        char *copy = field->kind == TG_PATH ? resolve(text, p->file) : tg_copy_text(text);
        if (!copy) return tg_no_memory(p->e, strlen(text), 1);
        tg_free(old->v);
        *old = (tg_text){copy, given};
        break;
    }
    case VECTOR: {
        tg_vector v;
        code = read_vector(p, text, &v);
        v.line = given;
        if (code == TG_OK) *(tg_vector *)value = v;
        break;
    }
    case LIST:
    case LINE:
    case GROUP: return wrong(p, "'%s' is a single value; write %s", tg_show(text).text, tg_field_range(field, range));
    }
    return code;
}

tg_code tg_field_set(const tg_field *field, void *base, const char *text, const char *file, int line, tg_error *e)
{
    const place p = {field, file, line, e};
    return set(&p, base, text, line > 0 ? line : 1);
}

/* ---- tables ---- */

static void set_none(const tg_field *field, void *base, double none)
{
    void *value = at(field, base);
    switch (stored_as(field)) {
    case NUMBER: *(tg_number *)value = (tg_number){none, 0}; break;
    case TEXT: *(tg_text *)value = (tg_text){NULL, 0}; break;
    case VECTOR: *(tg_vector *)value = (tg_vector){{none, none, none}, 0}; break;
    case LIST: *(tg_list *)value = (tg_list){NULL, 0, 0}; break;
    case LINE: *(int *)value = 0; break;
    case GROUP: break;
    }
}

tg_code tg_fields_default(const tg_field *fields, void *base, tg_error *e)
{
    tg_code code = TG_OK;
    for (const tg_field *f = fields; f->key; f++) {
        const place p = {f, NULL, 0, e};
        if (f->kind == TG_GROUP)
            TG_TRY(tg_fields_default(f->item, at(f, base), e));
        else
            set_none(f, base, NAN);
        if (f->standard) TG_TRY(set(&p, base, f->standard, 0));
    }
done:
    if (code != TG_OK) tg_fields_free(fields, base);
    return code;
}

void tg_fields_free(const tg_field *fields, void *base)
{
    for (const tg_field *f = fields; f->key; f++) {
        void *value = at(f, base);
        if (f->kind == TG_GROUP) tg_fields_free(f->item, value);
        if (stored_as(f) == TEXT) tg_free(((tg_text *)value)->v);
        if (f->kind == TG_LIST) {
            const tg_list *list = value;
            for (size_t i = 0; i < list->n; i++)
                tg_fields_free(f->item, (char *)list->v + i * f->item_size);
            tg_free(list->v);
        }
        set_none(f, base, 0);
    }
}

const tg_field *tg_fields_find(const tg_field *fields, const char *key)
{
    for (const tg_field *f = fields; f->key; f++)
        if (f->kind != TG_LINE && !strcmp(f->key, key)) return f;
    return NULL;
}

int tg_field_line(const tg_field *field, const void *base)
{
    const void *value = at_const(field, base);
    switch (stored_as(field)) {
    case NUMBER: return ((const tg_number *)value)->line;
    case TEXT: return ((const tg_text *)value)->line;
    case VECTOR: return ((const tg_vector *)value)->line;
    case LIST: return ((const tg_list *)value)->line;
    case LINE: return *(const int *)value;
    case GROUP: break;
    }
    return 0;
}

tg_code tg_fields_unknown(const tg_field *fields, const char *key, const char *file, int line, tg_error *e)
{
    const char *dashes = file ? "" : "--", *what = file ? "key" : "option";
    const tg_code code = file ? TG_INPUT : TG_USAGE;
    char words[2048] = "", known[256] = "", near[TG_WORD];
    size_t n = 0;
    for (const tg_field *f = fields; f->key && n < sizeof words; f++)
        if (f->kind != TG_LINE) n += (size_t)snprintf(words + n, sizeof words - n, "%s ", f->key);
    if (tg_nearest(key, words, near))
        return tg_fail(e, code, file, line, "unknown %s '%s%s'; did you mean '%s%s'?", what, dashes, tg_show(key).text,
                       dashes, near);
    tg_words_list(words, ", ", known, sizeof known);
    return tg_fail(e, code, file, line, "unknown %s '%s%s'; known here: %s", what, dashes, tg_show(key).text, known);
}
