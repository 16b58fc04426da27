#include "io/yaml.h"

#include "io/fits.h"
#include "io/input.h"
#include "io/memory.h"

#include <stdio.h>
#include <string.h>
#include <yaml.h>

enum { MOST_BYTES = 1 << 20, MOST_DEPTH = 50, MOST_ITEMS = 10000 };

/* What is being read. Errors are collected, `code` as tg_note has it; only a machine error ends the work early. */
typedef struct {
    yaml_document_t *document;
    const char *file;
    tg_error *e;
    tg_code code;
} reader;

static void note(reader *r, tg_code code)
{
    tg_note(&r->code, code);
}

static int line_of(const yaml_node_t *node)
{
    return (int)node->start_mark.line + 1;
}

static yaml_node_t *node_at(reader *r, int index)
{
    return yaml_document_get_node(r->document, index);
}

/* ---- what a file may hold at all ---- */

/* The reader's complaints carry a byte offset instead of a line. */
static int line_of_offset(const char *text, size_t bytes, size_t offset)
{
    int line = 1;
    for (size_t i = 0; i < bytes && i < offset; i++)
        line += text[i] == '\n';
    return line;
}

static tg_code complain(const yaml_parser_t *parser, const char *text, size_t bytes, const char *file, tg_error *e)
{
    if (parser->error == YAML_MEMORY_ERROR) return tg_no_memory(e, bytes, 1);
    const char *problem = parser->problem ? parser->problem : "cannot be read";
    if (parser->error == YAML_READER_ERROR)
        return tg_fail(e, TG_INPUT, file, line_of_offset(text, bytes, parser->problem_offset),
                       "not a text in UTF-8: %s; save it as plain text", problem);
    return tg_fail(e, TG_INPUT, file, (int)parser->problem_mark.line + 1,
                   "not YAML: %s; indent with spaces, close brackets, quote texts that hold ':' or '#'", problem);
}

/* Refuse what a description never needs: aliases, tags, deep nesting, a second document. After this the document
 * is a tree of moderate depth, and loading it cannot fail but for memory. */
static tg_code check_events(yaml_parser_t *parser, const char *text, size_t bytes, const char *file, tg_error *e)
{
    int depth = 0, documents = 0;
    for (;;) {
        yaml_event_t event;
        if (!yaml_parser_parse(parser, &event)) return complain(parser, text, bytes, file, e);
        const yaml_event_type_t type = event.type;
        const int line = (int)event.start_mark.line + 1;
        bool anchor = false, tag = false;
        if (type == YAML_SCALAR_EVENT) {
            anchor = event.data.scalar.anchor;
            tag = event.data.scalar.tag;
        } else if (type == YAML_SEQUENCE_START_EVENT) {
            anchor = event.data.sequence_start.anchor;
            tag = event.data.sequence_start.tag;
        } else if (type == YAML_MAPPING_START_EVENT) {
            anchor = event.data.mapping_start.anchor;
            tag = event.data.mapping_start.tag;
        }
        yaml_event_delete(&event);
        depth += (type == YAML_SEQUENCE_START_EVENT || type == YAML_MAPPING_START_EVENT) -
                 (type == YAML_SEQUENCE_END_EVENT || type == YAML_MAPPING_END_EVENT);
        documents += type == YAML_DOCUMENT_START_EVENT;
        if (anchor || type == YAML_ALIAS_EVENT)
            return tg_fail(e, TG_INPUT, file, line, "anchors and aliases (& and *) are not used here; write it out");
        if (tag) return tg_fail(e, TG_INPUT, file, line, "tags (!) are not used here; leave them out");
        if (depth > MOST_DEPTH)
            return tg_fail(e, TG_INPUT, file, line, "nested deeper than %d levels; no description needs that",
                           MOST_DEPTH);
        if (documents > 1)
            return tg_fail(e, TG_INPUT, file, line, "a second document begins here; keep one document in a file");
        if (type == YAML_STREAM_END_EVENT) break;
    }
    return TG_OK;
}

/* ---- the document against the table ---- */

static const char *first_key(const tg_field *fields)
{
    return fields[fields->kind == TG_LINE].key;
}

static void read_mapping(reader *r, const yaml_node_t *node, const tg_field *fields, void *base);

static const char *scalar(const yaml_node_t *node)
{
    return (const char *)node->data.scalar.value;
}

static void expected(reader *r, const tg_field *f, const yaml_node_t *node, int line)
{
    static const char *const found[] = {"nothing", "a single value", "a list", "a mapping"}; /* yaml_node_type_t */
    char range[256];
    note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: is %s; write %s", f->key, found[node->type],
                    tg_field_range(f, range)));
}

/* Items of [x, y, z] as "x,y,z" for the field table. */
static void read_vector(reader *r, const tg_field *f, void *base, const yaml_node_t *node, int line)
{
    char text[256] = "";
    size_t n = 0;
    for (const int *i = node->data.sequence.items.start; i < node->data.sequence.items.top; i++) {
        const yaml_node_t *item = node_at(r, *i);
        if (item->type != YAML_SCALAR_NODE || strchr(scalar(item), ',') || n >= sizeof text) {
            char range[256];
            note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: holds something else than numbers; write %s", f->key,
                            tg_field_range(f, range)));
            return;
        }
        n += (size_t)snprintf(text + n, sizeof text - n, "%s%s", n ? "," : "", scalar(item));
    }
    note(r, tg_field_set(f, base, text, r->file, line, r->e));
}

static void read_list(reader *r, const tg_field *f, tg_list *list, const yaml_node_t *node, int line)
{
    const int *first = node->data.sequence.items.start, *end = node->data.sequence.items.top;
    if (end - first > MOST_ITEMS) {
        note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: more than %d items", f->key, MOST_ITEMS));
        return;
    }
    if (f->required && first == end)
        note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: the list is empty; write at least one item", f->key));
    list->line = line;
    for (const int *i = first; i < end && r->code != TG_MACHINE; i++) {
        const yaml_node_t *item = node_at(r, *i);
        if (item->type != YAML_MAPPING_NODE) {
            note(r, tg_fail(r->e, TG_INPUT, r->file, line_of(item), "%s: an item is a mapping, such as {%s: ...}",
                            f->key, first_key(f->item)));
            continue;
        }
        void *base = tg_append(&list->v, &list->n, f->item_size);
        if (!base)
            note(r, tg_no_memory(r->e, list->n + 1, f->item_size));
        else
            read_mapping(r, item, f->item, base);
    }
}

static void read_value(reader *r, const tg_field *f, void *base, const yaml_node_t *node, int line)
{
    const yaml_node_type_t type = node->type;
    void *value = (char *)base + f->at;
    switch (f->kind) {
    case TG_GROUP:
        if (type == YAML_MAPPING_NODE)
            read_mapping(r, node, f->item, value);
        else
            expected(r, f, node, line);
        break;
    case TG_LIST:
        if (type == YAML_SEQUENCE_NODE)
            read_list(r, f, value, node, line);
        else
            expected(r, f, node, line);
        break;
    case TG_VECTOR2:
    case TG_VECTOR3:
        if (type == YAML_SEQUENCE_NODE)
            read_vector(r, f, base, node, line);
        else
            expected(r, f, node, line);
        break;
    default:
        if (type != YAML_SCALAR_NODE)
            expected(r, f, node, line);
        else if (strlen(scalar(node)) != node->data.scalar.length)
            note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: holds a NUL character; leave it out", f->key));
        else
            note(r, tg_field_set(f, base, scalar(node), r->file, line, r->e));
    }
}

static size_t rows(const tg_field *fields)
{
    size_t n = 0;
    while (fields[n].key)
        n++;
    return n;
}

/* @param seen  {rows of the table} line of each key's first use, 0: none */
static void read_pairs(reader *r, const yaml_node_t *node, const tg_field *fields, void *base, int *seen)
{
    for (const yaml_node_pair_t *pair = node->data.mapping.pairs.start; pair < node->data.mapping.pairs.top; pair++) {
        const yaml_node_t *key = node_at(r, pair->key);
        const int line = line_of(key);
        if (key->type != YAML_SCALAR_NODE) {
            note(r, tg_fail(r->e, TG_INPUT, r->file, line, "a key is a single word, not a list or mapping"));
            continue;
        }
        const tg_field *f = tg_fields_find(fields, scalar(key));
        if (!f) {
            note(r, tg_fields_unknown(fields, scalar(key), r->file, line, r->e));
        } else if (seen[f - fields]) {
            note(r, tg_fail(r->e, TG_INPUT, r->file, line, "%s: stands on line %d already; keep one", f->key,
                            seen[f - fields]));
        } else {
            seen[f - fields] = line;
            read_value(r, f, base, node_at(r, pair->value), line);
        }
        if (r->code == TG_MACHINE) return;
    }
    for (const tg_field *f = fields; f->key; f++)
        if (f->required && !seen[f - fields])
            note(r, tg_fail(r->e, TG_INPUT, r->file, line_of(node), "%s is missing: %s", f->key, f->what));
}

static void read_mapping(reader *r, const yaml_node_t *node, const tg_field *fields, void *base)
{
    int *seen;
    tg_code code = TG_OK;
    TG_TRY(TG_NEW(seen, rows(fields), r->e));
    TG_TRY(tg_fields_default(fields, base, r->e));
    for (const tg_field *f = fields; f->key; f++)
        if (f->kind == TG_LINE) *(int *)(void *)((char *)base + f->at) = line_of(node);
    read_pairs(r, node, fields, base, seen);
done:
    if (code != TG_OK) note(r, code);
    tg_free(seen);
}

/* Another description than the one wanted would draw a message for every key: tell it once. */
static tg_code check_kind(reader *r, const yaml_node_t *root, const tg_field *fields)
{
    size_t known = 0, unknown = 0;
    const yaml_node_pair_t *first = root->data.mapping.pairs.start;
    for (const yaml_node_pair_t *pair = first; pair < root->data.mapping.pairs.top; pair++) {
        const yaml_node_t *key = node_at(r, pair->key);
        const bool found = key->type == YAML_SCALAR_NODE && tg_fields_find(fields, scalar(key));
        known += found;
        unknown += !found;
    }
    if (unknown < 2 || unknown <= known || node_at(r, first->key)->type != YAML_SCALAR_NODE) return TG_OK;
    return tg_fail(r->e, TG_INPUT, r->file, line_of(root),
                   "is not a description of a %s: it begins with '%s', and most of its keys are not known here",
                   first_key(fields), tg_show(scalar(node_at(r, first->key))).text);
}

static tg_code start(yaml_parser_t *parser, const char *text, size_t bytes, tg_error *e)
{
    if (!yaml_parser_initialize(parser)) return tg_no_memory(e, 1, sizeof *parser);
    yaml_parser_set_input_string(parser, (const unsigned char *)text, bytes);
    return TG_OK;
}

tg_code tg_yaml_parse(const char *text, size_t bytes, const char *name, const tg_field *fields, void *out, tg_error *e)
{
    tg_code code = TG_OK;
    yaml_parser_t parser = {0};
    yaml_document_t document = {0};
    if (bytes > MOST_BYTES) return tg_fail(e, TG_INPUT, name, 0, "larger than %d bytes: not a description", MOST_BYTES);
    TG_TRY(start(&parser, text, bytes, e));
    TG_TRY(check_events(&parser, text, bytes, name, e));
    yaml_parser_delete(&parser);

    TG_TRY(start(&parser, text, bytes, e));
    if (!yaml_parser_load(&parser, &document)) TG_TRY(complain(&parser, text, bytes, name, e));
    const yaml_node_t *root = yaml_document_get_root_node(&document);
    if (!root || (root->type == YAML_SCALAR_NODE && !root->data.scalar.length))
        TG_TRY(tg_fail(e, TG_INPUT, name, 1, "is empty; tomogauge show --example prints files to start from"));
    if (root->type != YAML_MAPPING_NODE)
        TG_TRY(tg_fail(e, TG_INPUT, name, line_of(root), "a description is a mapping, such as `%s: ...`",
                       first_key(fields)));
    reader r = {&document, name, e, TG_OK};
    TG_TRY(check_kind(&r, root, fields));
    read_mapping(&r, root, fields, out);
    code = r.code;
    if (code != TG_OK) tg_fields_free(fields, out);
done:
    yaml_document_delete(&document);
    yaml_parser_delete(&parser);
    return code;
}

tg_code tg_yaml_read(const char *path, const tg_field *fields, void *out, tg_error *e)
{
    char *text = NULL;
    size_t bytes;
    tg_code code = TG_OK;
    if (tg_fits_magic(path))
        return tg_fail(e, TG_INPUT, path, 0, "is a FITS file; a description in YAML is expected here");
    TG_TRY(tg_read_file(path, MOST_BYTES, &text, &bytes, e));
    TG_TRY(tg_yaml_parse(text, bytes, path, fields, out, e));
done:
    tg_free(text);
    return code;
}
