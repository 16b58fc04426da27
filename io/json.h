#ifndef TG_JSON_H
#define TG_JSON_H
#include "io/error.h"

/** A JSON value under construction. A NULL value is accepted everywhere and passes on: check once, at the end
 *  (tg_json_text and tg_json_write answer TG_MACHINE). Numbers are written with 9 significant digits,
 *  whole ones up to 2^53 in full, NaN and infinities as null; bytes that are no UTF-8 as U+FFFD. */
typedef struct tg_json tg_json;

tg_json *tg_json_object(void);
tg_json *tg_json_array(void);
void tg_json_free(tg_json *j);

void tg_json_set(tg_json *object, const char *key, tg_json *value); /* takes the value over */
void tg_json_set_number(tg_json *object, const char *key, double value);
void tg_json_set_text(tg_json *object, const char *key, const char *value); /* NULL: null */
void tg_json_add(tg_json *array, tg_json *value);                           /* takes the value over */
void tg_json_add_number(tg_json *array, double value);
void tg_json_add_text(tg_json *array, const char *value);

/** The text, indented, keys in the order they were set, "</" and "<!" escaped so that it can stand in a page.
 *  @param text  set on success, tg_free */
tg_code tg_json_text(const tg_json *j, char **text, tg_error *e);
tg_code tg_json_write(const char *path, const tg_json *j, tg_error *e);

#endif
