#include "metrics/target.h"

#include "io/memory.h"
#include "metrics/label.h"
#include "metrics/locate.h"
#include "metrics/noise.h"
#include "metrics/presence.h"
#include "metrics/slices.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static bool same_grid(const tg_grid *a, const tg_grid *b)
{
    for (int k = 0; k < 2; k++)
        if (a->n[k] != b->n[k] || fabs(a->step_mm[k] - b->step_mm[k]) > 1e-6 * a->step_mm[k] ||
            fabs(a->first_mm[k] - b->first_mm[k]) > 1e-3 * a->step_mm[k])
            return false;
    return true;
}

static bool same_text(const char *a, const char *b)
{
    return a && b ? !strcmp(a, b) : a == b;
}

tg_code tg_target_repeats(const tg_image *first, const tg_image *other, const char *file, tg_error *e)
{
    const tg_grid *a = &first->grid, *b = &other->grid;
    if (!same_grid(a, b))
        return tg_fail(e, TG_INPUT, file, 0,
                       "is no repeat of the first image, it lies on another grid: %zu x %zu pixels of %g mm, not "
                       "%zu x %zu of %g mm; measure it by itself",
                       b->n[0], b->n[1], b->step_mm[0], a->n[0], a->n[1], a->step_mm[0]);
    if (first->unit != other->unit)
        return tg_fail(e, TG_INPUT, file, 0,
                       "is no repeat of the first image, it is in %s, not %s; measure it by itself",
                       tg_unit_text(other->unit), tg_unit_text(first->unit));
    if (!same_text(first->kernel, other->kernel) || !same_text(first->method, other->method))
        return tg_fail(
            e, TG_INPUT, file, 0,
            "is no repeat of the first image, it was made by another method or kernel; measure it by itself");
    return TG_OK;
}

static tg_code check_images(const tg_image *image, size_t n, const tg_phantom *phantom, tg_error *e)
{
    tg_code code = TG_OK;
    if (!n) return tg_fail(e, TG_INPUT, NULL, 0, "there is no image to measure");
    if (!phantom->n_solids)
        return tg_fail(e, TG_INPUT, phantom->path, 0, "the phantom has no solid; its first is its body");
    for (size_t i = 1; i < n; i++)
        TG_TRY(tg_target_repeats(&image[0], &image[i], NULL, e));
done:
    return code;
}

/** Does the plane, with half of a slice on both sides where there are several, cut the body the same way? */
static bool inside_body(const tg_image *image, size_t slice, const tg_solid *body)
{
    const double z = tg_grid_mm(&image->grid, 2, (double)slice);
    const double half = image->grid.n[2] > 1 ? 0.499 * image->grid.step_mm[2] : 0;
    double middle[2];
    return tg_section_middle(body, z, middle) && tg_section_middle(body, z - half, middle) &&
           tg_section_middle(body, z + half, middle);
}

/** Choose the section nearest to the middle of the body, and the slices that show it.
 *  @return TG_OK with t->n = 0 when no slice lies inside the body */
static tg_code pool(const tg_image *image, size_t n, tg_target *t, tg_error *e)
{
    tg_code code = TG_OK;
    const tg_solid *body = &t->phantom->solid[t->body];
    size_t all = 0, elsewhere = 0;
    double nearest = INFINITY;
    for (size_t i = 0; i < n; i++) {
        all += image[i].grid.n[2];
        for (size_t k = 0; k < image[i].grid.n[2]; k++) {
            const double z = tg_grid_mm(&image[i].grid, 2, (double)k), off = fabs(z - body->centre_mm[2]);
            if (off >= nearest || !inside_body(&image[i], k, body)) continue;
            nearest = off;
            t->z_mm = z;
        }
    }
    if (isinf(nearest)) {
        const tg_grid *g = &image[0].grid;
        snprintf(t->lost, sizeof t->lost,
                 "no slice lies inside the body '%s' (z of the slices %g to %g mm, of its middle %g mm)", body->name.v,
                 g->first_mm[2], tg_grid_mm(g, 2, (double)g->n[2] - 1), body->centre_mm[2]);
        goto done;
    }
    TG_TRY(TG_NEW(t->slice, all, e));
    for (size_t i = 0; i < n; i++)
        for (size_t k = 0; k < image[i].grid.n[2]; k++) {
            const float *v = image[i].v + k * tg_grid_slice(&image[i].grid);
            if (!inside_body(&image[i], k, body) ||
                !tg_section_same(t->phantom, t->z_mm, tg_grid_mm(&image[i].grid, 2, (double)k))) {
                elsewhere++;
            } else if (!tg_slice_shows(v, tg_grid_slice(&image[i].grid))) {
                char name[64];
                tg_slice_name(image, n, v, name);
                tg_warn(e, NULL, 0, "%s left out: it is empty, no two of its pixels differ", name);
            } else {
                t->slice[t->n++] = v;
            }
        }
    if (elsewhere)
        tg_warn(e, NULL, 0, "%zu of %zu slices left out: they do not show the section of the phantom at z = %g mm",
                elsewhere, all, t->z_mm);
    if (!t->n) snprintf(t->lost, sizeof t->lost, "the image is empty: no part of it stands out");
done:
    return code;
}

static tg_code average(tg_target *t, tg_error *e)
{
    tg_code code = TG_OK;
    const size_t pixels = tg_grid_slice(&t->grid);
    TG_TRY(TG_NEW(t->mean, pixels, e));
#pragma omp parallel for
    for (size_t i = 0; i < pixels; i++) {
        double sum = 0;
        for (size_t k = 0; k < t->n; k++)
            sum += (double)t->slice[k][i];
        t->mean[i] = (float)(sum / (double)t->n);
    }
done:
    return code;
}

tg_code tg_target_create(const tg_image *image, size_t n, const tg_phantom *phantom, const tg_progress *progress,
                         tg_target *out, tg_error *e)
{
    tg_code code = TG_OK;
    tg_located found = {0};
    tg_target t = {.phantom = phantom, .image = image, .spread_mm = NAN};
    TG_TRY(check_images(image, n, phantom, e));
    t.unit = image->unit;
    t.grid = image->grid;
    t.grid.n[2] = 1;
    TG_TRY(pool(image, n, &t, e));
    if (*t.lost) goto done;
    t.grid.first_mm[2] = t.z_mm;
    tg_theory_learn(image, &t.theory);
    TG_TRY(average(&t, e));
    TG_TRY(tg_progress_step(progress, "finding the phantom", 0));
    TG_TRY(tg_locate(image, t.mean, phantom, t.z_mm, &found, e));
    snprintf(t.lost, sizeof t.lost, "%s", found.lost);
    t.spread_mm = found.spread_mm;
    if (*t.lost) goto done;
    t.shift_mm[0] = found.pose.shift_mm[0];
    t.shift_mm[1] = found.pose.shift_mm[1];
    t.turn_rad = found.pose.turn_rad;
    t.turn_known = found.turn_known;
    t.shift_u_mm = found.shift_u_mm;
    t.turn_u_rad = found.turn_u_rad;
    TG_TRY(TG_NEW(t.label, tg_grid_slice(&t.grid), e));
    TG_TRY(TG_NEW(t.clear_mm, tg_grid_slice(&t.grid), e));
    tg_label_paint(phantom, t.z_mm, &found.pose, &t.grid, t.label);
    TG_TRY(tg_label_clear(t.label, &t.grid, t.clear_mm, e));
    TG_TRY(tg_progress_step(progress, "learning the noise", 0.5));
    TG_TRY(tg_noise_learn(&t, &t.noise, e));
    TG_TRY(tg_slices_compare(&t, image, n, e));
    TG_TRY(tg_presence_doubt(&t, t.lost, e));
done:
    if (code == TG_OK)
        *out = t;
    else
        tg_target_free(&t);
    return code;
}

void tg_target_free(tg_target *t)
{
    tg_free(t->slice);
    tg_free(t->mean);
    tg_free(t->label);
    tg_free(t->clear_mm);
    tg_noise_free(&t->noise);
    tg_theory_free(&t->theory);
    *t = (tg_target){0};
}

static tg_pose pose(const tg_target *t)
{
    return (tg_pose){{t->shift_mm[0], t->shift_mm[1]}, t->turn_rad};
}

void tg_target_to_image(const tg_target *t, const double phantom_mm[2], double image_mm[2])
{
    const tg_pose p = pose(t);
    tg_pose_to_image(&p, phantom_mm, image_mm);
}

void tg_target_to_phantom(const tg_target *t, const double image_mm[2], double phantom_mm[2])
{
    const tg_pose p = pose(t);
    tg_pose_to_phantom(&p, image_mm, phantom_mm);
}

bool tg_target_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm)
{
    double middle[2], radius;
    if (!tg_section_circle(&t->phantom->solid[solid], t->z_mm, middle, &radius)) return false;
    tg_target_to_image(t, middle, centre_mm);
    *radius_mm = radius;
    return true;
}

int tg_target_around(const tg_target *t, const double centre_mm[2], double radius_mm)
{
    enum { PLACES = 72 };
    int at[PLACES], best = TG_NO_SOLID, most = 0;
    for (int k = 0; k < PLACES; k++) {
        const double angle = k * 2 * M_PI / PLACES, r = radius_mm + 2 * t->grid.step_mm[0];
        const double image[2] = {centre_mm[0] + r * cos(angle), centre_mm[1] + r * sin(angle)};
        double phantom[2];
        tg_target_to_phantom(t, image, phantom);
        at[k] = tg_phantom_solid_at(t->phantom, (const double[3]){phantom[0], phantom[1], t->z_mm});
        int same = 0;
        for (int i = 0; i <= k; i++)
            same += at[i] == at[k];
        if (same > most) {
            most = same;
            best = at[k];
        }
    }
    return best;
}

bool tg_target_inner_circle(const tg_target *t, int solid, double centre_mm[2], double *radius_mm)
{
    double middle[2], radius;
    tg_section_circle(&t->phantom->solid[solid], t->z_mm, middle, &radius);
    if (!(radius > 0)) return false;
    tg_target_to_image(t, middle, centre_mm);
    *radius_mm = radius;
    return true;
}

tg_code tg_target_pixels(const tg_target *t, const tg_region *region, int solid, double clear_mm, size_t **index,
                         size_t *n, tg_error *e)
{
    tg_code code = TG_OK;
    size_t x0, x1, y0, y1, room, found = 0;
    size_t *list = NULL;
    tg_region_bounds(region, &t->grid, &x0, &x1, &y0, &y1);
    if (!tg_multiply(x1 - x0, y1 - y0, &room)) TG_TRY(tg_no_memory(e, x1 - x0, y1 - y0));
    TG_TRY(TG_NEW(list, room, e));
    for (size_t y = y0; y < y1; y++) {
        for (size_t x = x0; x < x1; x++) {
            const size_t i = y * t->grid.n[0] + x;
            if (t->label[i] != solid || (double)t->clear_mm[i] < clear_mm) continue;
            if (tg_region_holds(region, tg_grid_mm(&t->grid, 0, (double)x), tg_grid_mm(&t->grid, 1, (double)y)))
                list[found++] = i;
        }
    }
    *index = list;
    *n = found;
done:
    return code;
}
