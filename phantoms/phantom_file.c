/* Phantom descriptions: the tables of their keys, and what keys must say together. */
#include "io/memory.h"
#include "io/scan.h"
#include "io/yaml.h"
#include "phantoms/phantom.h"

#include <stdio.h>
#include <string.h>

enum { MOST_MM = 100000 };
#define LEAST_MM 1e-6

typedef struct {
    tg_text name, formula, compound;
    tg_number density, mu, hu;
    int line;
} material_keys;

typedef struct {
    tg_text name, material;
    tg_number shape, turn, radius, top_radius, length;
    tg_vector centre, axis, size;
    int line;
} solid_keys;

typedef struct {
    tg_text phantom;
    tg_list materials, solids;
} phantom_keys;

static const tg_field material_fields[] = {
    TG_LINE_AT(material_keys),
    TG_ROW(material_keys, "name", TG_TEXT, name, .what = "name of the material", .required = true),
    TG_ROW(material_keys, "formula", TG_TEXT, formula, .what = "chemical formula, with density"),
    TG_ROW(material_keys, "compound", TG_TEXT, compound, .what = "name in the NIST list of compounds"),
    TG_ROW(material_keys, "density", TG_NUMBER, density, .unit = "g/cm3", .what = "density; a compound has its own",
           .low = 1e-9, .high = 30),
    TG_ROW(material_keys, "mu", TG_NUMBER, mu, .unit = "1/mm", .what = "attenuation, the same at every energy",
           .low = 0, .high = 1000),
    TG_ROW(material_keys, "hu", TG_NUMBER, hu, .unit = "HU", .what = "CT number, the same at every energy",
           .low = -1000, .high = 100000),
    {0},
};

static const tg_field solid_fields[] = {
    TG_LINE_AT(solid_keys),
    TG_ROW(solid_keys, "name", TG_TEXT, name, .what = "name of the solid", .required = true),
    TG_ROW(solid_keys, "shape", TG_CHOICE, shape, .words = TG_SHAPES, .what = "form of the solid", .required = true),
    TG_ROW(solid_keys, "material", TG_TEXT, material, .what = "name of its material", .required = true),
    TG_ROW(solid_keys, "centre", TG_VECTOR3, centre, .unit = "mm", .standard = "0,0,0", .what = "its middle",
           .low = -MOST_MM, .high = MOST_MM),
    TG_ROW(solid_keys, "axis", TG_VECTOR3, axis, .standard = "0,0,1", .what = "direction of its own z axis",
           .low = -MOST_MM, .high = MOST_MM),
    TG_ROW(solid_keys, "turn", TG_NUMBER, turn, .unit = "degrees", .standard = "0",
           .what = "turn about its own z axis, counter-clockwise", .low = -360, .high = 360),
    TG_ROW(solid_keys, "radius", TG_NUMBER, radius, .unit = "mm", .what = "radius; of a cone at its lower end",
           .low = LEAST_MM, .high = MOST_MM),
    TG_ROW(solid_keys, "top-radius", TG_NUMBER, top_radius, .unit = "mm", .what = "radius of a cone at its upper end",
           .low = 0, .high = MOST_MM),
    TG_ROW(solid_keys, "length", TG_NUMBER, length, .unit = "mm", .what = "full length along its own z axis",
           .low = LEAST_MM, .high = MOST_MM),
    TG_ROW(solid_keys, "size", TG_VECTOR3, size, .unit = "mm", .what = "full lengths along its own x, y and z axes",
           .low = LEAST_MM, .high = MOST_MM),
    {0},
};

static const tg_field phantom_fields[] = {
    TG_ROW(phantom_keys, "phantom", TG_TEXT, phantom, .what = "name of the phantom", .required = true),
    TG_ROW(phantom_keys, "materials", TG_LIST, materials, .what = "what solids are made of", .item = material_fields,
           .item_size = sizeof(material_keys), .required = true),
    TG_ROW(phantom_keys, "solids", TG_LIST, solids, .what = "what is where; a later solid displaces earlier ones",
           .item = solid_fields, .item_size = sizeof(solid_keys), .required = true),
    {0},
};

/** The dimensions that a shape takes, in the order of TG_SHAPES. */
static const char *const dimensions[] = {
    [TG_CYLINDER] = "radius length",
    [TG_ELLIPTIC_CYLINDER] = "size",
    [TG_ELLIPSOID] = "size",
    [TG_SPHERE] = "radius",
    [TG_SOLID_BOX] = "size",
    [TG_CONE] = "radius top-radius length",
    [TG_WEDGE] = "size",
};

/** Move a name out of the keys, which are released later. */
static tg_text move_text(tg_text *from)
{
    const tg_text moved = *from;
    from->v = NULL;
    return moved;
}

/** A material in exactly one of its four ways. */
static tg_code build_material(material_keys *k, const char *file, tg_material *m, tg_error *e)
{
    const int ways = (k->formula.line > 0) + (k->compound.line > 0) + (k->mu.line > 0) + (k->hu.line > 0);
    if (ways != 1)
        return tg_fail(e, TG_INPUT, file, k->line, "material '%s': give exactly one of formula, compound, mu and hu",
                       tg_show(k->name.v).text);
    if ((k->mu.line || k->hu.line) && k->density.line)
        return tg_fail(e, TG_INPUT, file, k->density.line, "density: means nothing beside mu or hu; leave it out");
    if (k->formula.line && !k->density.line)
        return tg_fail(e, TG_INPUT, file, k->line, "density is missing: the formula of '%s' needs one, in g/cm3",
                       tg_show(k->name.v).text);
    if (k->formula.line) return tg_material_formula(k->formula.v, k->density.v, file, k->formula.line, m, e);
    if (k->compound.line) return tg_material_compound(k->compound.v, k->density.v, file, k->compound.line, m, e);
    m->mu_per_mm = k->mu.v;
    m->hu = k->hu.v;
    return TG_OK;
}

static tg_code build_materials(tg_list *list, const char *file, tg_phantom *p, tg_error *e)
{
    tg_code code = TG_OK;
    material_keys *k = list->v;
    if (list->n > TG_MOST_SOLIDS)
        return tg_fail(e, TG_INPUT, file, list->line, "materials: %zu are given; at most %d can be", list->n,
                       TG_MOST_SOLIDS);
    TG_TRY(TG_NEW(p->material, list->n, e));
    p->n_materials = list->n;
    for (size_t i = 0; i < list->n; i++) {
        for (size_t j = 0; j < i; j++)
            if (!strcmp(p->material[j].name.v, k[i].name.v))
                tg_note(&code, tg_fail(e, TG_INPUT, file, k[i].name.line, "name: '%s' is taken by another material",
                                       tg_show(k[i].name.v).text));
        tg_note(&code, build_material(&k[i], file, &p->material[i], e));
        p->material[i].name = move_text(&k[i].name);
    }
done:
    return code;
}

/** Every dimension of the shape is there, and no other. */
static tg_code check_dimensions(const solid_keys *k, const char *file, tg_error *e)
{
    const char *takes = dimensions[(int)k->shape.v], *all = "radius top-radius length size";
    char key[TG_WORD], shape[TG_WORD], list[TG_WORD];
    tg_code code = TG_OK;
    tg_word_at(TG_SHAPES, (int)k->shape.v, shape);
    tg_words_list(takes, " and ", list, sizeof list);
    while (tg_word_next(&all, key)) {
        const int line = tg_field_line(tg_fields_find(solid_fields, key), k);
        const bool belongs = tg_word_index(key, takes) >= 0;
        if (line && !belongs)
            tg_note(&code, tg_fail(e, TG_INPUT, file, line, "%s: means nothing for shape %s, which takes %s", key,
                                   shape, list));
        if (!line && belongs)
            tg_note(&code, tg_fail(e, TG_INPUT, file, k->line, "%s is missing: shape %s takes %s", key, shape, list));
    }
    return code;
}

static tg_code find_material(const solid_keys *k, const char *file, const tg_phantom *p, size_t *material, tg_error *e)
{
    char words[4096] = "", near[TG_WORD];
    for (size_t m = 0, used = 0; m < p->n_materials; m++) {
        if (!strcmp(p->material[m].name.v, k->material.v)) {
            *material = m;
            return TG_OK;
        }
        if (used < sizeof words)
            used += (size_t)snprintf(words + used, sizeof words - used, "%s ", p->material[m].name.v);
    }
    if (tg_nearest(k->material.v, words, near))
        return tg_fail(e, TG_INPUT, file, k->material.line,
                       "material: '%s' is not among the materials; did you mean '%s'?", tg_show(k->material.v).text,
                       near);
    return tg_fail(e, TG_INPUT, file, k->material.line, "material: '%s' is not among the materials; describe it there",
                   tg_show(k->material.v).text);
}

static tg_code build_solid(solid_keys *k, const char *file, const tg_phantom *p, tg_solid *s, tg_error *e)
{
    tg_code code = TG_OK;
    s->shape = (tg_shape)k->shape.v;
    s->line = k->line;
    tg_note(&code, find_material(k, file, p, &s->material, e));
    tg_note(&code, check_dimensions(k, file, e));
    if (k->axis.v[0] == 0 && k->axis.v[1] == 0 && k->axis.v[2] == 0)
        tg_note(&code,
                tg_fail(e, TG_INPUT, file, k->axis.line, "axis: [0, 0, 0] has no direction; [0, 0, 1] is upright"));
    if (code != TG_OK) return code;
    tg_solid_turn(s, k->axis.v, k->turn.v * TG_DEGREE);
    memcpy(s->centre_mm, k->centre.v, sizeof s->centre_mm);
    for (int i = 0; i < 3; i++)
        s->half_mm[i] = k->size.line ? k->size.v[i] / 2 : k->radius.v;
    if (k->length.line) s->half_mm[2] = k->length.v / 2;
    if (s->shape == TG_CONE) s->taper = k->top_radius.v / k->radius.v;
    return TG_OK;
}

static tg_code build_solids(tg_list *list, const char *file, tg_phantom *p, tg_error *e)
{
    tg_code code = TG_OK;
    solid_keys *k = list->v;
    if (list->n > TG_MOST_SOLIDS)
        return tg_fail(e, TG_INPUT, file, list->line, "solids: %zu are given; at most %d can be", list->n,
                       TG_MOST_SOLIDS);
    TG_TRY(TG_NEW(p->solid, list->n, e));
    for (size_t i = 0; i < list->n; i++) {
        if (tg_phantom_find(p, k[i].name.v) != TG_NO_SOLID)
            tg_note(&code, tg_fail(e, TG_INPUT, file, k[i].name.line, "name: '%s' is taken by another solid",
                                   tg_show(k[i].name.v).text));
        tg_note(&code, build_solid(&k[i], file, p, &p->solid[i], e));
        p->solid[i].name = move_text(&k[i].name);
        p->n_solids = i + 1;
    }
done:
    return code;
}

/** The phantom of its keys, which are released. */
static tg_code build(phantom_keys *k, const char *file, tg_phantom *p, tg_error *e)
{
    tg_code code = TG_OK;
    tg_phantom made = {.name = move_text(&k->phantom), .path = tg_copy_text(file)};
    if (!made.path) TG_TRY(tg_no_memory(e, 1, 1));
    tg_note(&code, build_materials(&k->materials, file, &made, e));
    if (code != TG_MACHINE && made.material) tg_note(&code, build_solids(&k->solids, file, &made, e));
done:
    tg_fields_free(phantom_fields, k);
    if (code == TG_OK)
        *p = made;
    else
        tg_phantom_free(&made);
    return code;
}

tg_code tg_phantom_read(const char *path, tg_phantom *p, tg_error *e)
{
    phantom_keys k = {0};
    const tg_code code = tg_yaml_read(path, phantom_fields, &k, e);
    return code == TG_OK ? build(&k, path, p, e) : code;
}

tg_code tg_phantom_parse(const char *text, size_t bytes, const char *name, tg_phantom *p, tg_error *e)
{
    phantom_keys k = {0};
    const tg_code code = tg_yaml_parse(text, bytes, name, phantom_fields, &k, e);
    return code == TG_OK ? build(&k, name, p, e) : code;
}

void tg_phantom_free(tg_phantom *p)
{
    for (size_t m = 0; m < p->n_materials; m++)
        tg_material_free(&p->material[m]);
    for (size_t i = 0; i < p->n_solids; i++)
        tg_free(p->solid[i].name.v);
    tg_free(p->material);
    tg_free(p->solid);
    tg_free(p->path);
    tg_free(p->name.v);
    *p = (tg_phantom){0};
}
