#include "recon/recipe.h"

#include "recon/kernel.h"

const tg_field tg_recipe_fields[] = {
    TG_ROW(tg_recipe, "method", TG_CHOICE, method, .words = TG_METHODS, .standard = "fbp",
           .what = "method of reconstruction: filtered back-projection"),
    TG_ROW(tg_recipe, "kernel", TG_TEXT, kernel, .words = TG_WINDOWS, .standard = "hann",
           .what = "window on the ramp: NAME, NAME@CUTOFF with the cut-off as a fraction of the Nyquist frequency (1 "
                   "when not given), or a file of fraction and value"),
    TG_ROW(tg_recipe, "pixels", TG_INTEGER, pixels, .standard = "512", .low = 1, .high = 16384,
           .what = "pixels along a side"),
    TG_ROW(tg_recipe, "field", TG_NUMBER, field_mm, .unit = "mm", .low = TG_ABOVE_ZERO, .high = 1e6,
           .what = "side of the square field; without it the scan's field of view"),
    TG_ROW(tg_recipe, "centre", TG_VECTOR2, centre_mm, .unit = "mm", .standard = "0, 0", .low = -1e6, .high = 1e6,
           .what = "middle of the field"),
    TG_ROW(tg_recipe, "axis-channel", TG_NUMBER, axis_channel, .low = -1e6, .high = 1e6,
           .what = "channel met by the ray through the axis, the first being 1; without it the scan's own"),
    TG_ROW(tg_recipe, "mu-water", TG_NUMBER, mu_water_per_mm, .unit = "1/mm", .low = TG_ABOVE_ZERO, .high = 1e6,
           .what = "attenuation of water, makes HU; without it the scan's own"),
    {0},
};

double tg_recipe_channel_zero(const tg_recipe *r, const tg_scan *scan)
{
    return r->axis_channel.line ? r->axis_channel.v - 1 : scan->channel_zero;
}

tg_code tg_recipe_grid(const tg_recipe *r, const tg_scan *scan, tg_grid *grid, tg_error *e)
{
    tg_scan seen = *scan;
    seen.channel_zero = tg_recipe_channel_zero(r, scan);
    const double field_mm = r->field_mm.v > 0 ? r->field_mm.v : 2 * tg_scan_field_radius_mm(&seen);
    if (!(field_mm > 0))
        return tg_fail(e, TG_INPUT, NULL, 0,
                       "the axis meets channel %.6g of %zu, at the detector's rim: no field of view; give field or "
                       "axis-channel",
                       seen.channel_zero + 1, scan->channels);
    *grid = tg_grid_square((size_t)r->pixels.v, field_mm, r->centre_mm.v);
    grid->n[2] = scan->rows;
    if (scan->row_step_mm > 0) {
        grid->step_mm[2] = scan->row_step_mm;
        grid->first_mm[2] = -scan->row_zero * scan->row_step_mm;
    }
    return TG_OK;
}
