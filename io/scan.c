#include "io/scan.h"

#include "io/memory.h"

#include <math.h>
#include <string.h>

void tg_scan_free(tg_scan *scan)
{
    tg_free(scan->angle_rad);
    *scan = (tg_scan){0};
}

tg_code tg_scan_copy(const tg_scan *scan, tg_scan *copy, tg_error *e)
{
    tg_code code = TG_OK;
    *copy = *scan;
    copy->angle_rad = NULL;
    if (!scan->angle_rad) return TG_OK;
    TG_TRY(TG_NEW(copy->angle_rad, scan->views, e));
    memcpy(copy->angle_rad, scan->angle_rad, scan->views * sizeof *scan->angle_rad);
done:
    if (code != TG_OK) *copy = (tg_scan){0};
    return code;
}

double tg_scan_pitch_mm(const tg_scan *scan)
{
    switch (scan->geometry) {
    case TG_FAN_EQUIANGULAR: return scan->channel_step * scan->source_axis_mm;
    case TG_FAN_EQUISPACED: return scan->channel_step * scan->source_axis_mm / scan->source_detector_mm;
    case TG_PARALLEL: break;
    }
    return scan->channel_step;
}

double tg_scan_coordinate(const tg_scan *scan, double channel)
{
    return (channel - scan->channel_zero) * scan->channel_step;
}

double tg_scan_fan_angle(const tg_scan *scan, double coordinate)
{
    switch (scan->geometry) {
    case TG_FAN_EQUIANGULAR: return coordinate;
    case TG_FAN_EQUISPACED: return atan(coordinate / scan->source_detector_mm);
    case TG_PARALLEL: break;
    }
    return 0;
}

void tg_scan_ray(const tg_scan *scan, double angle_rad, double channel, double point_mm[2], double direction[2])
{
    const double coordinate = tg_scan_coordinate(scan, channel);
    const double theta = angle_rad + tg_scan_fan_angle(scan, coordinate);
    direction[0] = sin(theta); /* away from the source, which stands at +l */
    direction[1] = -cos(theta);
    if (scan->geometry == TG_PARALLEL) {
        point_mm[0] = coordinate * cos(theta);
        point_mm[1] = coordinate * sin(theta);
    } else {
        point_mm[0] = -scan->source_axis_mm * sin(angle_rad);
        point_mm[1] = scan->source_axis_mm * cos(angle_rad);
    }
}

double tg_scan_field_radius_mm(const tg_scan *scan)
{
    const double low = tg_scan_coordinate(scan, 0), high = tg_scan_coordinate(scan, (double)scan->channels - 1);
    const double reach = fmin(-low, high); /* the shorter side of the detector */
    if (reach <= 0) return 0;
    if (scan->geometry == TG_PARALLEL) return reach;
    return scan->source_axis_mm * sin(tg_scan_fan_angle(scan, reach));
}

#define POSITIVE(key, member, ...) \
    TG_ROW(tg_facts, key, TG_NUMBER, member, .low = TG_ABOVE_ZERO, .high = DBL_MAX, __VA_ARGS__)

const tg_field tg_fact_fields[] = {
    POSITIVE("TUBEKV", tube_kv, .unit = "kV", .what = "tube voltage"),
    POSITIVE("ENERGY", energy_kev, .unit = "keV", .what = "photon energy of a monochromatic beam"),
    POSITIVE("PHOTONS", photons_per_ray, .what = "photons per channel and view without object"),
    POSITIVE("APERTURE", aperture_mm, .unit = "mm", .what = "width of a channel's aperture, at the axis"),
    POSITIVE("FOCALSPT", focal_spot_mm, .unit = "mm", .what = "width of the focal spot"),
    POSITIVE("MUWATER", mu_water_per_mm, .unit = "1/mm", .what = "attenuation of water, makes HU"),
    TG_ROW(tg_facts, "SEED", TG_INTEGER, seed, .what = "seed of the noise"),
    TG_ROW(tg_facts, "PHANTOM", TG_TEXT, phantom, .what = "phantom that was scanned"),
    TG_ROW(tg_facts, "SCANNER", TG_TEXT, scanner, .what = "scanner that scanned it"),
    {0},
};

tg_code tg_facts_copy(const tg_facts *facts, tg_facts *copy, tg_error *e)
{
    *copy = *facts;
    copy->phantom.v = tg_copy_text(facts->phantom.v);
    copy->scanner.v = tg_copy_text(facts->scanner.v);
    if ((facts->phantom.v && !copy->phantom.v) || (facts->scanner.v && !copy->scanner.v)) {
        tg_fields_free(tg_fact_fields, copy);
        return tg_no_memory(e, 1, sizeof *facts);
    }
    return TG_OK;
}
