#include "metrics/page.h"

#include "io/embedded.h"
#include "io/memory.h"
#include "io/version.h"
#include "metrics/display.h"
#include "metrics/results_file.h"
#include "metrics/words.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* The page is written to a memory stream; its one error flag is looked at once, at the end. */

static void put_escaped(FILE *out, const char *text)
{
    for (; text && *text; text++)
        switch (*text) {
        case '&': fputs("&amp;", out); break;
        case '<': fputs("&lt;", out); break;
        case '>': fputs("&gt;", out); break;
        case '"': fputs("&quot;", out); break;
        default: fputc(*text, out);
        }
}

static void put_element(FILE *out, const char *name, const char *text)
{
    fprintf(out, "<%s>", name);
    put_escaped(out, text);
    fprintf(out, "</%s>", name);
}

static void put_base64(FILE *out, const unsigned char *bytes, size_t n)
{
    static const char digit[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    for (size_t i = 0; i < n; i += 3) {
        const unsigned b0 = bytes[i], b1 = i + 1 < n ? bytes[i + 1] : 0, b2 = i + 2 < n ? bytes[i + 2] : 0;
        const unsigned word = b0 << 16 | b1 << 8 | b2;
        fputc(digit[word >> 18], out);
        fputc(digit[word >> 12 & 63], out);
        fputc(i + 1 < n ? digit[word >> 6 & 63] : '=', out);
        fputc(i + 2 < n ? digit[word & 63] : '=', out);
    }
}

/* ---- verdict ---- */

/* A sign of its own shape for each verdict: the page must read without colour. */
static const char *mark(tg_verdict v)
{
    switch (v) {
    case TG_PASS: return "&#10003;";
    case TG_FAIL: return "&#10007;";
    case TG_INCONCLUSIVE: return "?";
    case TG_NO_LIMITS: break;
    }
    return "&#8211;";
}

static const char *verdict_words(tg_verdict v)
{
    return v == TG_NO_LIMITS ? "nothing judged" : tg_verdict_text(v);
}

static void put_verdict(FILE *out, tg_verdict v)
{
    fprintf(out, "<span class=\"verdict %s\"><span aria-hidden=\"true\">%s</span> %s</span>", tg_verdict_text(v),
            mark(v), verdict_words(v));
}

static void put_summary(FILE *out, const tg_evaluation *ev)
{
    size_t count[TG_FAIL + 1] = {0};
    for (size_t i = 0; i < ev->n; i++)
        for (size_t k = 0; k < ev->item[i].results.n_results; k++)
            count[ev->item[i].results.result[k].verdict]++;
    const size_t judged = count[TG_PASS] + count[TG_FAIL] + count[TG_INCONCLUSIVE];
    fprintf(out, "<header class=\"banner %s\"><p class=\"mark\" aria-hidden=\"true\">%s</p><div><h1>",
            tg_verdict_text(ev->verdict), mark(ev->verdict));
    put_escaped(out, verdict_words(ev->verdict));
    fputs("</h1><p>", out);
    if (judged)
        fprintf(out, "%zu of %zu specified figures pass, %zu fail, %zu cannot be decided.", count[TG_PASS], judged,
                count[TG_FAIL], count[TG_INCONCLUSIVE]);
    else
        fputs("No specification speaks of these images; everything that the phantom allows was measured.", out);
    fputs("</p></div></header>\n<p class=\"lead\"><strong>", out);
    put_escaped(out, ev->job->name.v);
    fputs("</strong>, phantom ", out);
    put_escaped(out, ev->phantom_name);
    fputs(". ", out);
    put_escaped(out, ev->job->note.v);
    fputs("</p>\n", out);
}

static void put_decisive(FILE *out, const tg_evaluation *ev)
{
    bool open = false;
    for (size_t i = 0; i < ev->n; i++) {
        const tg_evaluated *item = &ev->item[i];
        if (*item->lost) {
            fputs(open ? "" : "<section><h2>What decides</h2><ul>\n", out);
            open = true;
            fputs("<li>", out);
            put_escaped(out, item->recipe->name.v);
            fputs(": the phantom was not found: ", out);
            put_escaped(out, item->lost);
            fputs("</li>\n", out);
        }
        for (size_t k = 0; k < item->results.n_results; k++) {
            const tg_result *r = &item->results.result[k];
            if (r->verdict < TG_INCONCLUSIVE || *item->lost) continue;
            char value[TG_WORDS], u[TG_WORDS], limits[TG_WORDS];
            tg_words_value(r->value, r->uncertainty, value);
            tg_words_uncertainty(r->uncertainty, u);
            tg_words_limits(r->low, r->high, limits);
            fputs(open ? "<li>" : "<section><h2>What decides</h2><ul>\n<li>", out);
            open = true;
            put_verdict(out, r->verdict);
            fputs(" ", out);
            put_escaped(out, item->recipe->name.v);
            fprintf(out, ": %s, ", r->measure);
            put_escaped(out, r->where);
            if (isnan(r->value)) {
                fputs(": ", out);
                put_escaped(out, r->why);
            } else {
                fprintf(out, ": %s &plusmn; %s %s, specified %s", value, u, r->unit, limits);
            }
            fputs("</li>\n", out);
        }
    }
    if (open) fputs("</ul></section>\n", out);
}

/* ---- table ---- */

/* The occurrence-th result of a measure at a place, or NULL. */
static const tg_result *find(const tg_evaluated *item, const tg_result *like, size_t occurrence)
{
    for (size_t k = 0; k < item->results.n_results; k++) {
        const tg_result *r = &item->results.result[k];
        if (!strcmp(r->measure, like->measure) && !strcmp(r->where, like->where) && occurrence-- == 0) return r;
    }
    return NULL;
}

static size_t occurrence_of(const tg_evaluated *item, size_t index)
{
    size_t n = 0;
    const tg_result *like = &item->results.result[index];
    for (size_t k = 0; k < index; k++) {
        const tg_result *r = &item->results.result[k];
        if (!strcmp(r->measure, like->measure) && !strcmp(r->where, like->where)) n++;
    }
    return n;
}

/* A reconstruction that nothing judges needs no room for limits and verdicts. */
static const char *cell_class(const tg_evaluated *item)
{
    return item->verdict == TG_NO_LIMITS ? " class=\"unjudged\"" : "";
}

static void put_cell(FILE *out, const tg_result *r, const tg_evaluated *item)
{
    fprintf(out, "<td%s data-of=\"", cell_class(item));
    put_escaped(out, item->recipe->name.v);
    if (!r) {
        fputs("\"><span class=\"value\">not measured</span></td>", out);
        return;
    }
    char value[TG_WORDS], u[TG_WORDS], limits[TG_WORDS], predicted[TG_WORDS];
    tg_words_value(r->value, r->uncertainty, value);
    tg_words_uncertainty(r->uncertainty, u);
    tg_words_limits(r->low, r->high, limits);
    tg_words_value(r->predicted, r->uncertainty, predicted);
    fprintf(out, "\"><span class=\"figure\"><span class=\"value\">%s</span> <span class=\"u\">", value);
    if (!isnan(r->value)) fprintf(out, "&plusmn; %s", u);
    fputs("</span> <span class=\"limits\">", out);
    put_escaped(out, limits);
    fputs("</span> ", out);
    if (r->verdict != TG_NO_LIMITS)
        put_verdict(out, r->verdict);
    else
        fputs("<span></span>", out);
    fputs("</span>", out);
    if (!isnan(r->predicted) && !isnan(r->value)) fprintf(out, "<span class=\"aside\">expected %s</span>", predicted);
    if (*r->why) {
        fputs("<span class=\"aside\">", out);
        put_escaped(out, r->why);
        fputs("</span>", out);
    }
    if (*r->note) {
        fputs("<span class=\"aside\">", out);
        put_escaped(out, r->note);
        fputs("</span>", out);
    }
    fputs("</td>", out);
}

static void put_row(FILE *out, const tg_evaluation *ev, const tg_result *like, size_t occurrence)
{
    fprintf(out, "<tr><th scope=\"row\"><span class=\"measure\">%s</span> <span class=\"where\">", like->measure);
    put_escaped(out, like->where);
    fputs("</span></th><td class=\"unit\">", out);
    put_escaped(out, like->unit);
    fputs("</td>", out);
    for (size_t i = 0; i < ev->n; i++)
        put_cell(out, find(&ev->item[i], like, occurrence), &ev->item[i]);
    fputs("</tr>\n", out);
}

static void put_table(FILE *out, const tg_evaluation *ev)
{
    fputs("<section id=\"figures\"><h2>Figures</h2>\n<p>Each figure with its 95&nbsp;% expanded uncertainty; beside it "
          "what is "
          "specified and the verdict. A figure passes when the whole of value &plusmn; uncertainty lies inside the "
          "limits and fails "
          "when it lies outside; between the two it is inconclusive.</p>\n"
          "<div class=\"wide\"><table class=\"figures\"><thead><tr><th scope=\"col\">Measure, place</th><th "
          "scope=\"col\">Unit</th>",
          out);
    for (size_t i = 0; i < ev->n; i++) {
        fprintf(out, "<th scope=\"col\"%s>", cell_class(&ev->item[i]));
        put_escaped(out, ev->item[i].recipe->name.v);
        fputs("<br>", out);
        put_verdict(out, ev->item[i].verdict);
        fputs("<span class=\"figure heads\" aria-hidden=\"true\"><span>value</span><span>&plusmn; "
              "U</span><span>specified"
              "</span><span>verdict</span></span></th>",
              out);
    }
    fputs("</tr></thead><tbody>\n", out);
    for (size_t i = 0; i < ev->n; i++) {
        const tg_evaluated *item = &ev->item[i];
        for (size_t k = 0; k < item->results.n_results; k++) {
            const tg_result *r = &item->results.result[k];
            const size_t occurrence = occurrence_of(item, k);
            bool done = false; /* the row stood already under an earlier reconstruction */
            for (size_t before = 0; before < i && !done; before++)
                done = find(&ev->item[before], r, occurrence);
            if (!done) put_row(out, ev, r, occurrence);
        }
    }
    fputs("</tbody></table></div>\n", out);
    for (size_t i = 0; i < ev->n; i++) {
        if (!ev->item[i].specification) continue;
        fputs("<p class=\"aside\">", out);
        put_escaped(out, ev->item[i].recipe->name.v);
        fputs(" answers to the specification \"", out);
        put_escaped(out, ev->item[i].specification);
        fputs("\".", out);
        if (ev->item[i].unspecified) {
            fputs(" It does not speak of these conditions: ", out);
            put_escaped(out, ev->item[i].unspecified);
        }
        fputs("</p>\n", out);
    }
    fputs("</section>\n", out);
}

/* ---- images ---- */

/* Regions as vector outlines over the picture: image coordinates in mm with y downwards. */
static void put_regions(FILE *out, const tg_evaluated *item)
{
    const tg_grid *g = &item->image.grid;
    const double x0 = g->first_mm[0] - 0.5 * g->step_mm[0], y1 = tg_grid_mm(g, 1, (double)g->n[1] - 0.5);
    const double width = g->step_mm[0] * (double)g->n[0], height = g->step_mm[1] * (double)g->n[1];
    fprintf(out, "<svg viewBox=\"%.6g %.6g %.6g %.6g\" role=\"img\" aria-label=\"regions that were measured\">", x0,
            -y1, width, height);
    for (size_t i = 0; i < item->results.n_regions; i++) {
        const tg_region *r = &item->results.region[i];
        const double cx = r->centre_mm[0], cy = -r->centre_mm[1];
        fputs("<g><title>", out);
        put_escaped(out, r->label);
        fputs("</title>", out);
        for (int pass = 0; pass < 2; pass++) { /* a dark line under a light dashed one reads on any grey */
            const char *line = pass ? "over" : "under";
            if (r->outline == TG_BOX) {
                fprintf(out,
                        "<rect class=\"%s\" x=\"%.6g\" y=\"%.6g\" width=\"%.6g\" height=\"%.6g\" "
                        "transform=\"rotate(%.6g %.6g %.6g)\"/>",
                        line, cx - r->half_mm[0], cy - r->half_mm[1], 2 * r->half_mm[0], 2 * r->half_mm[1],
                        -r->turn_rad * 180 / M_PI, cx, cy);
            } else {
                fprintf(out, "<circle class=\"%s\" cx=\"%.6g\" cy=\"%.6g\" r=\"%.6g\"/>", line, cx, cy, r->outer_mm);
                if (r->inner_mm > 0)
                    fprintf(out, "<circle class=\"%s\" cx=\"%.6g\" cy=\"%.6g\" r=\"%.6g\"/>", line, cx, cy,
                            r->inner_mm);
            }
        }
        fputs("</g>", out);
    }
    fputs("</svg>", out);
}

static tg_code put_image(FILE *out, const tg_evaluated *item, tg_error *e)
{
    tg_code code = TG_OK;
    tg_window w;
    unsigned char *png = NULL;
    size_t n;
    const tg_grid *g = &item->image.grid;
    TG_TRY(tg_display_window(&item->image, g->n[2] / 2, &w, e));
    TG_TRY(tg_png_encode(&item->image, g->n[2] / 2, &w, &png, &n, e));
    fputs("<figure><div class=\"picture\"><img alt=\"reconstructed slice, ", out);
    put_escaped(out, item->recipe->name.v);
    fputs("\" src=\"data:image/png;base64,", out);
    put_base64(out, png, n);
    fputs("\">", out);
    put_regions(out, item);
    fputs("</div><figcaption><strong>", out);
    put_escaped(out, item->recipe->name.v);
    fputs("</strong> ", out);
    put_verdict(out, item->verdict);
    fprintf(out, "<br>%zu &times; %zu pixels of %.4g mm, x to the right, y up; grey from %.4g to %.4g %s", g->n[0],
            g->n[1], g->step_mm[0], w.level - w.width / 2, w.level + w.width / 2, tg_unit_text(item->image.unit));
    if (g->n[2] > 1) fprintf(out, "; slice %zu of %zu", g->n[2] / 2 + 1, g->n[2]);
    if (!*item->lost) {
        fprintf(out, "<br>phantom found %.2f mm to the %s of its place and %.2f mm %s", fabs(item->shift_mm[0]),
                item->shift_mm[0] < 0 ? "left" : "right", fabs(item->shift_mm[1]),
                item->shift_mm[1] < 0 ? "below" : "above");
        if (item->turn_known)
            fprintf(out, ", turned by %.2f&deg;", round(item->turn_rad * 18000 / M_PI) / 100 + 0.0); /* no -0 */
    }
    fputs("</figcaption></figure>\n", out);
done:
    tg_free(png);
    return code;
}

static tg_code put_images(FILE *out, const tg_evaluation *ev, tg_error *e)
{
    tg_code code = TG_OK;
    fputs("<section id=\"images\"><h2>Images</h2>\n<p><label><input type=\"checkbox\" id=\"outlines\" checked> regions "
          "that were "
          "measured</label></p>\n<div class=\"images\">\n",
          out);
    for (size_t i = 0; i < ev->n && code == TG_OK; i++)
        code = put_image(out, &ev->item[i], e);
    fputs("</div></section>\n", out);
    return code;
}

/* ---- curves ---- */

static tg_code put_curves(FILE *out, const tg_evaluation *ev, tg_error *e)
{
    static const char *const titles[][2] = {
        {"mtf", "Modulation transfer"}, {"nps", "Noise power spectrum"}, {"radial-profile", "Radial profile"}};
    tg_json *list = tg_json_array();
    char *text = NULL;
    bool present[sizeof titles / sizeof *titles] = {false};
    for (size_t i = 0; i < ev->n; i++)
        for (size_t k = 0; k < ev->item[i].results.n_curves; k++) {
            const tg_curve *c = &ev->item[i].results.curve[k];
            tg_json *data = tg_curve_json(c);
            tg_json_set_text(data, "of", ev->item[i].recipe->name.v);
            tg_json_add(list, data);
            for (size_t t = 0; t < sizeof titles / sizeof *titles; t++)
                present[t] = present[t] || !strcmp(c->measure, titles[t][0]);
        }
    const tg_code code = tg_json_text(list, &text, e);
    if (code == TG_OK) {
        fputs("<section id=\"curves\"><h2>Curves</h2>\n<noscript><p>The charts need the script of this page; the "
              "numbers stand in "
              "results.json.</p></noscript>\n<div class=\"charts\">\n",
              out);
        for (size_t t = 0; t < sizeof titles / sizeof *titles; t++)
            if (present[t])
                fprintf(
                    out,
                    "<figure><figcaption>%s</figcaption><div class=\"chart\"><canvas data-measure=\"%s\" role=\"img\" "
                    "aria-label=\"%s against frequency or place, every reconstruction\"></canvas></div></figure>\n",
                    titles[t][1], titles[t][0], titles[t][1]);
        fprintf(out, "</div><script type=\"application/json\" id=\"curve-data\">%s</script></section>\n", text);
    }
    tg_json_free(list);
    tg_free(text);
    return code;
}

/* ---- conditions, budget, signatures ---- */

static void put_pair(FILE *out, const char *term, const char *text)
{
    fputs("<dt>", out);
    put_escaped(out, term);
    fputs("</dt><dd>", out);
    put_escaped(out, text);
    fputs("</dd>\n", out);
}

static void put_fact(FILE *out, const char *term, double value, const char *unit)
{
    if (!isnan(value)) fprintf(out, "<dt>%s</dt><dd>%.6g%s%s</dd>\n", term, value, *unit ? " " : "", unit);
}

static void put_scan(FILE *out, const tg_image *image)
{
    static const char *const geometry[] = {"parallel", "fan, equiangular", "fan, equispaced"};
    const tg_scan *s = &image->scan;
    const tg_facts *f = &image->facts;
    fputs("<h3>Scan</h3><dl>\n", out);
    if (s->channels) {
        put_pair(out, "geometry", geometry[s->geometry]);
        fprintf(out, "<dt>samples</dt><dd>%zu channels, %zu views</dd>\n", s->channels, s->views);
        put_fact(out, "channel pitch at the axis", tg_scan_pitch_mm(s), "mm");
        if (s->geometry != TG_PARALLEL) {
            put_fact(out, "source to axis", s->source_axis_mm, "mm");
            put_fact(out, "source to detector", s->source_detector_mm, "mm");
        }
    }
    put_fact(out, "tube voltage", f->tube_kv.v, "kV");
    put_fact(out, "photon energy", f->energy_kev.v, "keV");
    put_fact(out, "photons per channel and view", f->photons_per_ray.v, "");
    put_fact(out, "aperture at the axis", f->aperture_mm.v, "mm");
    put_fact(out, "focal spot", f->focal_spot_mm.v, "mm");
    put_fact(out, "attenuation of water", image->facts.mu_water_per_mm.v, "1/mm");
    put_fact(out, "seed", f->seed.v, "");
    if (f->scanner.v) put_pair(out, "scanner", f->scanner.v);
    fputs("</dl>\n", out);
}

static void put_conditions(FILE *out, const tg_evaluation *ev)
{
    fputs("<section id=\"conditions\"><h2>Conditions</h2>\n", out);
    if (ev->n) put_scan(out, &ev->item[0].image);
    fputs("<h3>Reconstructions</h3><dl>\n", out);
    for (size_t i = 0; i < ev->n; i++) {
        char text[1024];
        tg_fields_text(tg_recipe_fields, ev->item[i].recipe, text, sizeof text);
        put_pair(out, ev->item[i].recipe->name.v, text);
    }
    fputs("</dl><h3>Inputs</h3><dl>\n", out);
    for (size_t i = 0; i < ev->inputs.n; i++) {
        const char *slash = strrchr(ev->inputs.input[i].path, '/');
        put_pair(out, slash ? slash + 1 : ev->inputs.input[i].path, ev->inputs.input[i].sum);
    }
    fputs("</dl><h3>Program</h3><p>" TG_PROGRAM " " TG_VERSION "</p>\n", out);
    if (ev->remarks.count) fputs("<h3>Remarks</h3><ul>\n", out);
    for (size_t i = 0; i < ev->remarks.count && i < TG_MESSAGES; i++)
        put_element(out, "li", ev->remarks.message[i].what);
    if (ev->remarks.count) fputs("</ul>\n", out);
    fputs("</section>\n", out);
}

static void put_budgets(FILE *out, const tg_evaluation *ev)
{
    fputs("<section id=\"budgets\"><h2>Uncertainty budgets</h2>\n", out);
    for (size_t i = 0; i < ev->n; i++) {
        const tg_evaluated *item = &ev->item[i];
        fputs("<details><summary>", out);
        put_escaped(out, item->recipe->name.v);
        fputs("</summary><div class=\"wide\"><table class=\"budget\"><thead><tr><th scope=\"col\">Measure, "
              "place</th><th scope=\"col\">"
              "U, 95&nbsp;%</th><th scope=\"col\">of which random</th><th scope=\"col\">Standard "
              "uncertainties</th></tr></thead><tbody>\n",
              out);
        for (size_t k = 0; k < item->results.n_results; k++) {
            const tg_result *r = &item->results.result[k];
            if (isnan(r->value)) continue;
            char u[TG_WORDS], noise[TG_WORDS];
            tg_words_uncertainty(r->uncertainty, u);
            tg_words_uncertainty(r->uncertainty_noise, noise);
            fprintf(out, "<tr><th scope=\"row\">%s ", r->measure);
            put_escaped(out, r->where);
            fprintf(out, "</th><td>%s %s</td><td>%s</td><td>", u, r->unit, noise);
            for (size_t b = 0; b < r->n_budget; b++) {
                fprintf(out, "%s%s %.3g", b ? "; " : "", r->budget[b].source, r->budget[b].u);
                if (isfinite(r->budget[b].dof)) fprintf(out, " (%.0f degrees of freedom)", r->budget[b].dof);
            }
            fputs("</td></tr>\n", out);
        }
        fputs("</tbody></table></div></details>\n", out);
    }
    fputs("</section>\n", out);
}

static const char signatures[] =
    "<section id=\"sign\"><h2>Signatures</h2>\n"
    "<table class=\"sign\"><thead><tr><th scope=\"col\"></th><th scope=\"col\">Name</th><th scope=\"col\">Date</th>"
    "<th scope=\"col\">Signature</th></tr></thead><tbody>\n"
    "<tr><th scope=\"row\">Measured by</th><td></td><td></td><td></td></tr>\n"
    "<tr><th scope=\"row\">Decided by the responsible qualified expert</th><td></td><td></td><td></td></tr>\n"
    "</tbody></table></section>\n";

static const char cautions[] = "<footer><h2>Cautions</h2><p>An engineering evaluation of images of test objects: not "
                               "for diagnosis. X-ray exposures are made "
                               "only by trained staff under the local rules. Whether equipment is accepted is for the "
                               "responsible qualified expert to decide, "
                               "under the codes and licences that hold where it stands; the limits on this page are "
                               "those of the specification that was given, "
                               "and this page does not replace that decision.</p></footer>\n";

/* Chart.js is under the MIT licence, whose text must go along with it. */
static const char chart_licence[] =
    "<!-- The charts are drawn by Chart.js, (c) Chart.js Contributors, under the MIT License:\n"
    "Permission is hereby granted, free of charge, to any person obtaining a copy of this software and associated "
    "documentation\n"
    "files (the \"Software\"), to deal in the Software without restriction, including without limitation the rights to "
    "use, copy,\n"
    "modify, merge, publish, distribute, sublicense, and/or sell copies of the Software, and to permit persons to whom "
    "the Software\n"
    "is furnished to do so, subject to the following conditions: The above copyright notice and this permission notice "
    "shall be\n"
    "included in all copies or substantial portions of the Software. THE SOFTWARE IS PROVIDED \"AS IS\", WITHOUT "
    "WARRANTY OF ANY KIND,\n"
    "EXPRESS OR IMPLIED, INCLUDING BUT NOT LIMITED TO THE WARRANTIES OF MERCHANTABILITY, FITNESS FOR A PARTICULAR "
    "PURPOSE AND\n"
    "NONINFRINGEMENT. IN NO EVENT SHALL THE AUTHORS OR COPYRIGHT HOLDERS BE LIABLE FOR ANY CLAIM, DAMAGES OR OTHER "
    "LIABILITY, WHETHER\n"
    "IN AN ACTION OF CONTRACT, TORT OR OTHERWISE, ARISING FROM, OUT OF OR IN CONNECTION WITH THE SOFTWARE OR THE USE "
    "OR OTHER\n"
    "DEALINGS IN THE SOFTWARE. -->\n";

static void put_head(FILE *out, const tg_evaluation *ev)
{
    fputs("<!DOCTYPE html>\n<!-- written by " TG_PROGRAM " " TG_VERSION
          " -->\n<html lang=\"en\"><head><meta charset=\"utf-8\">\n"
          "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; img-src data:; style-src "
          "'unsafe-inline'; "
          "script-src 'unsafe-inline'\">\n<meta name=\"viewport\" content=\"width=device-width, "
          "initial-scale=1\">\n<title>",
          out);
    put_escaped(out, ev->job->name.v);
    fprintf(out, ": %s</title>\n<style>\n%s</style></head><body>\n<main>\n", verdict_words(ev->verdict),
            tg_embedded_text("page.css"));
}

tg_code tg_page_report(const tg_evaluation *ev, char **html, tg_error *e)
{
    tg_code code = TG_OK;
    char *text = NULL;
    size_t n = 0;
    *html = NULL;
    FILE *out = open_memstream(&text, &n);
    if (!out) return tg_no_memory(e, 1, BUFSIZ);
    put_head(out, ev);
    put_summary(out, ev);
    put_decisive(out, ev);
    put_table(out, ev);
    TG_TRY(put_images(out, ev, e));
    TG_TRY(put_curves(out, ev, e));
    put_budgets(out, ev);
    put_conditions(out, ev);
    fputs(signatures, out);
    fputs(cautions, out);
    fprintf(out, "</main>\n%s<script>%s</script>\n<script>\n%s</script></body></html>\n", chart_licence,
            tg_embedded_text("chart.min.js"), tg_embedded_text("page.js"));
done:;
    const bool broken = ferror(out);
    if ((fclose(out) || broken) && code == TG_OK) code = tg_no_memory(e, n, 1);
    if (code == TG_OK)
        *html = text;
    else
        tg_free(text);
    return code;
}
