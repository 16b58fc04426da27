#ifndef TG_YAML_H
#define TG_YAML_H
#include "io/fields.h"

/** Read a description: one YAML document, a mapping whose keys are the table's.
 *  All errors of the file are reported, each with its line: unknown or repeated keys, wrong types, impossible
 *  values, missing required keys, a second document, nesting deeper than 50, anchors and aliases.
 *  @param out  zeroed struct; on success release it with tg_fields_free, on failure it is released already
 *  @return TG_OK, TG_INPUT, TG_MACHINE */
tg_code tg_yaml_read(const char *path, const tg_field *fields, void *out, tg_error *e);

/** The same from memory. @param name  stands for the file in messages, its folder for relative paths */
tg_code tg_yaml_parse(const char *text, size_t bytes, const char *name, const tg_field *fields, void *out, tg_error *e);

#endif
