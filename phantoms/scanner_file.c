/* Scanner descriptions: the table of their keys, and what keys must say together. */
#include "io/memory.h"
#include "io/yaml.h"
#include "phantoms/scanner.h"

#include <math.h>

typedef struct {
    tg_text scanner;
    tg_number geometry, source_axis, source_detector, channels, pitch, axis_channel;
    tg_number views, arc, start, direction;
    tg_number aperture, subrays, average, energy, photons, seed, slices, slice_pitch;
} scanner_keys;

enum { COUNTER_CLOCKWISE, CLOCKWISE };
enum { INTENSITY, LINE_INTEGRALS };

static const tg_field scanner_fields[] = {
    TG_ROW(scanner_keys, "scanner", TG_TEXT, scanner, .what = "name of the scanner", .required = true),
    TG_ROW(scanner_keys, "geometry", TG_CHOICE, geometry, .words = TG_GEOMETRIES, .what = "how rays run",
           .required = true),
    TG_ROW(scanner_keys, "source-axis", TG_NUMBER, source_axis, .unit = "mm",
           .what = "distance from the source to the rotation axis, for fans", .low = 1, .high = 1e6),
    TG_ROW(scanner_keys, "source-detector", TG_NUMBER, source_detector, .unit = "mm",
           .what = "distance from the source to the detector, for fans", .low = 1, .high = 1e6),
    TG_ROW(scanner_keys, "channels", TG_INTEGER, channels, .what = "channels of the detector", .low = 1, .high = 100000,
           .required = true),
    TG_ROW(scanner_keys, "pitch", TG_NUMBER, pitch, .unit = "mm, or degrees for fan-equiangular",
           .what = "from channel to channel; at the axis for parallel, at the detector for fan-equispaced", .low = 1e-6,
           .high = 1000, .required = true),
    TG_ROW(scanner_keys, "axis-channel", TG_NUMBER, axis_channel, .low = -1e6, .high = 1e6,
           .what = "1-based channel, fractions allowed, met by the ray through the axis; the middle when not given"),
    TG_ROW(scanner_keys, "views", TG_INTEGER, views, .what = "views", .low = 1, .high = 1000000, .required = true),
    TG_ROW(scanner_keys, "arc", TG_NUMBER, arc, .unit = "degrees", .standard = "360",
           .what = "angle that the views divide evenly", .low = 1e-3, .high = 36000),
    TG_ROW(scanner_keys, "start", TG_NUMBER, start, .unit = "degrees", .standard = "0",
           .what = "angle of the first view", .low = -36000, .high = 36000),
    TG_ROW(scanner_keys, "direction", TG_CHOICE, direction, .words = "counter-clockwise clockwise",
           .standard = "counter-clockwise", .what = "sense of rotation, seen from +z"),
    TG_ROW(scanner_keys, "aperture", TG_NUMBER, aperture, .standard = "1",
           .what = "width of a channel as a fraction of the pitch; 0 is a point", .low = 0, .high = 10),
    TG_ROW(scanner_keys, "subrays", TG_INTEGER, subrays, .standard = "5", .what = "thin rays across an aperture",
           .low = 1, .high = TG_MOST_SUBRAYS),
    TG_ROW(scanner_keys, "average", TG_CHOICE, average, .words = "intensity line-integrals", .standard = "intensity",
           .what = "what an aperture averages; detectors average intensity"),
    TG_ROW(scanner_keys, "energy", TG_NUMBER, energy, .unit = "keV", .standard = "70", .what = "energy of all photons",
           .low = 1, .high = 1000),
    TG_ROW(scanner_keys, "photons", TG_NUMBER, photons,
           .what = "photons per channel and view without object; no noise when not given", .low = 1e-3, .high = 1e15),
    TG_ROW(scanner_keys, "seed", TG_INTEGER, seed, .standard = "1", .what = "seed of the noise", .low = 0,
           .high = 0x1p53),
    TG_ROW(scanner_keys, "slices", TG_INTEGER, slices, .standard = "1", .what = "slices, the middle one at z = 0",
           .low = 1, .high = 100000),
    TG_ROW(scanner_keys, "slice-pitch", TG_NUMBER, slice_pitch, .unit = "mm", .standard = "1",
           .what = "from slice to slice", .low = 1e-6, .high = 1000),
    {0},
};

/** Distances belong to fans, and put the detector behind the axis. */
static tg_code check_distances(const scanner_keys *k, const char *file, tg_error *e)
{
    tg_code code = TG_OK;
    const struct {
        const char *key;
        int line;
    } distance[] = {{"source-axis", k->source_axis.line}, {"source-detector", k->source_detector.line}};
    for (int i = 0; i < 2; i++) {
        if (k->geometry.v == TG_PARALLEL && distance[i].line)
            tg_note(&code, tg_fail(e, TG_INPUT, file, distance[i].line,
                                   "%s: means nothing for parallel rays; leave it out", distance[i].key));
        if (k->geometry.v != TG_PARALLEL && !distance[i].line)
            tg_note(&code, tg_fail(e, TG_INPUT, file, k->geometry.line, "%s is missing: a fan needs it, in mm",
                                   distance[i].key));
    }
    if (k->source_detector.v < k->source_axis.v)
        tg_note(&code,
                tg_fail(e, TG_INPUT, file, k->source_detector.line,
                        "source-detector: %g mm puts the detector before the axis, which is at source-axis %g mm",
                        k->source_detector.v, k->source_axis.v));
    return code;
}

static tg_code build_scan(const scanner_keys *k, const char *file, tg_scan *scan, tg_error *e)
{
    const double sense = k->direction.v == CLOCKWISE ? -1 : 1;
    tg_code code = TG_OK;
    TG_TRY(check_distances(k, file, e));
    *scan = (tg_scan){.geometry = (tg_geometry)k->geometry.v,
                      .channels = (size_t)k->channels.v,
                      .views = (size_t)k->views.v,
                      .rows = (size_t)k->slices.v,
                      .channel_step = k->pitch.v * (k->geometry.v == TG_FAN_EQUIANGULAR ? TG_DEGREE : 1),
                      .channel_zero = k->axis_channel.line ? k->axis_channel.v - 1 : (k->channels.v - 1) / 2,
                      .row_step_mm = k->slice_pitch.v,
                      .row_zero = (k->slices.v - 1) / 2};
    if (scan->geometry != TG_PARALLEL) {
        scan->source_axis_mm = k->source_axis.v;
        scan->source_detector_mm = k->source_detector.v;
    }
    const double side = k->aperture.v / 2; /* of the outermost channels */
    const double low = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, -side));
    const double high = tg_scan_fan_angle(scan, tg_scan_coordinate(scan, k->channels.v - 1 + side));
    if (fmax(-low, high) > 85 * TG_DEGREE)
        TG_TRY(tg_fail(
            e, TG_INPUT, file, k->pitch.line,
            "pitch: the fan opens to %g degrees on one side; keep it below 85 by a smaller pitch or fewer channels",
            fmax(-low, high) / TG_DEGREE));
    TG_TRY(TG_NEW(scan->angle_rad, scan->views, e));
    for (size_t i = 0; i < scan->views; i++)
        scan->angle_rad[i] = (k->start.v + sense * k->arc.v * (double)i / k->views.v) * TG_DEGREE;
done:
    return code;
}

/** The scanner of its keys, which are released. */
static tg_code build(scanner_keys *k, const char *file, tg_scanner *s, tg_error *e)
{
    tg_code code = TG_OK;
    tg_scanner made = {.name = k->scanner,
                       .energy_kev = k->energy.v,
                       .aperture = k->aperture.v,
                       .subrays = (int)k->subrays.v,
                       .average_lines = k->average.v == LINE_INTEGRALS,
                       .photons_per_ray = k->photons.v,
                       .seed = k->seed.v};
    k->scanner.v = NULL; /* moved */
    TG_TRY(build_scan(k, file, &made.scan, e));
    *s = made;
done:
    tg_fields_free(scanner_fields, k);
    if (code != TG_OK) tg_scanner_free(&made);
    return code;
}

tg_code tg_scanner_read(const char *path, tg_scanner *s, tg_error *e)
{
    scanner_keys k = {0};
    const tg_code code = tg_yaml_read(path, scanner_fields, &k, e);
    return code == TG_OK ? build(&k, path, s, e) : code;
}

tg_code tg_scanner_parse(const char *text, size_t bytes, const char *name, tg_scanner *s, tg_error *e)
{
    scanner_keys k = {0};
    const tg_code code = tg_yaml_parse(text, bytes, name, scanner_fields, &k, e);
    return code == TG_OK ? build(&k, name, s, e) : code;
}

void tg_scanner_free(tg_scanner *s)
{
    tg_free(s->name.v);
    tg_scan_free(&s->scan);
    *s = (tg_scanner){0};
}
