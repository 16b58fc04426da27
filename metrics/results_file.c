#include "metrics/results_file.h"

#include "io/fits.h"
#include "io/memory.h"
#include "io/output.h"
#include "io/png.h"
#include "io/table.h"
#include "io/version.h"
#include "metrics/display.h"
#include "metrics/page.h"
#include "metrics/words.h"

#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/utsname.h>
#include <time.h>
#include <unistd.h>

#ifndef TG_LIBRARIES
#define TG_LIBRARIES "not recorded by this build"
#endif

/* ---- JSON ---- */

static tg_json *program(void)
{
    tg_json *j = tg_json_object();
    tg_json_set_text(j, "program", TG_PROGRAM);
    tg_json_set_text(j, "version", TG_VERSION);
    return j;
}

static tg_json *numbers(const double *v, size_t n)
{
    tg_json *list = tg_json_array();
    for (size_t i = 0; i < n; i++)
        tg_json_add_number(list, v[i]);
    return list;
}

static void set_words(tg_json *j, const char *key, const char *words)
{
    if (words && *words) tg_json_set_text(j, key, words);
}

static tg_json *budget_json(const tg_result *r)
{
    tg_json *list = tg_json_array();
    for (size_t i = 0; i < r->n_budget; i++) {
        tg_json *line = tg_json_object();
        tg_json_set_text(line, "source", r->budget[i].source);
        tg_json_set_number(line, "u", r->budget[i].u);
        tg_json_set_number(line, "dof", isfinite(r->budget[i].dof) ? r->budget[i].dof : (double)NAN);
        tg_json_add(list, line);
    }
    return list;
}

static tg_json *result_json(const tg_result *r)
{
    tg_json *j = tg_json_object();
    tg_json_set_text(j, "measure", r->measure);
    tg_json_set_text(j, "where", r->where);
    tg_json_set_number(j, "value", r->value);
    tg_json_set_text(j, "unit", r->unit);
    tg_json_set_number(j, "uncertainty", r->uncertainty);
    tg_json_set_number(j, "uncertainty_noise", r->uncertainty_noise);
    tg_json_set_number(j, "nominal", r->nominal);
    tg_json_set_number(j, "low", r->low);
    tg_json_set_number(j, "high", r->high);
    tg_json_set_number(j, "predicted", r->predicted);
    tg_json_set_text(j, "verdict", tg_verdict_text(r->verdict));
    set_words(j, "why", r->why);
    set_words(j, "note", r->note);
    set_words(j, "source", r->source);
    if (r->n_budget) tg_json_set(j, "budget", budget_json(r));
    return j;
}

tg_json *tg_curve_json(const tg_curve *c)
{
    tg_json *j = tg_json_object();
    tg_json_set_text(j, "measure", c->measure);
    tg_json_set_text(j, "where", c->where);
    tg_json_set(j, "x", numbers(c->x, c->n));
    tg_json_set_text(j, "x_unit", c->x_unit);
    tg_json_set(j, "y", numbers(c->y, c->n));
    tg_json_set_text(j, "y_unit", c->y_unit);
    if (c->predicted) tg_json_set(j, "predicted", numbers(c->predicted, c->n));
    return j;
}

static tg_json *pose_json(const tg_evaluated *item)
{
    tg_json *j = tg_json_object();
    tg_json_set(j, "shift_mm", numbers(item->shift_mm, 2));
    tg_json_set_number(j, "turn_deg", item->turn_known ? item->turn_rad * 180 / M_PI : (double)NAN);
    return j;
}

static tg_json *item_json(const tg_evaluated *item)
{
    tg_json *j = tg_json_object(), *results = tg_json_array(), *curves = tg_json_array();
    tg_json_set_text(j, "name", item->recipe->name.v);
    tg_json_set_text(j, "image", item->image_name);
    tg_json_set_text(j, "verdict", tg_verdict_text(item->verdict));
    tg_json_set_text(j, "method", item->image.method);
    tg_json_set_text(j, "kernel", item->image.kernel);
    tg_json_set_text(j, "specification", item->specification);
    set_words(j, "unspecified", item->unspecified);
    if (*item->lost)
        tg_json_set_text(j, "lost", item->lost);
    else
        tg_json_set(j, "pose", pose_json(item));
    for (size_t i = 0; i < item->results.n_results; i++)
        tg_json_add(results, result_json(&item->results.result[i]));
    for (size_t i = 0; i < item->results.n_curves; i++)
        tg_json_add(curves, tg_curve_json(&item->results.curve[i]));
    tg_json_set(j, "results", results);
    tg_json_set(j, "curves", curves);
    return j;
}

static tg_json *inputs_json(const tg_inputs *in)
{
    tg_json *list = tg_json_array();
    for (size_t i = 0; i < in->n; i++) {
        tg_json *input = tg_json_object();
        tg_json_set_text(input, "path", in->input[i].path);
        tg_json_set_text(input, "sum", in->input[i].sum);
        tg_json_add(list, input);
    }
    return list;
}

tg_json *tg_results_json(const tg_evaluation *ev)
{
    tg_json *j = program(), *remarks = tg_json_array(), *items = tg_json_array();
    tg_json_set_text(j, "verdict", tg_verdict_text(ev->verdict));
    tg_json_set_text(j, "job", ev->job ? ev->job->name.v : NULL);
    tg_json_set_text(j, "phantom", ev->phantom_name);
    tg_json_set(j, "inputs", inputs_json(&ev->inputs));
    for (size_t i = 0; i < ev->remarks.count && i < TG_MESSAGES; i++)
        tg_json_add_text(remarks, ev->remarks.message[i].what);
    tg_json_set(j, "remarks", remarks);
    for (size_t i = 0; i < ev->n; i++)
        tg_json_add(items, item_json(&ev->item[i]));
    tg_json_set(j, "reconstructions", items);
    return j;
}

tg_json *tg_run_json(const tg_evaluation *ev)
{
    tg_json *j = program(), *items = tg_json_array();
    char date[32] = "", machine[256] = "";
    struct tm utc;
    struct utsname system;
    const time_t now = time(NULL);
    if (gmtime_r(&now, &utc)) strftime(date, sizeof date, "%Y-%m-%dT%H:%M:%SZ", &utc);
    if (!uname(&system))
        snprintf(machine, sizeof machine, "%.64s, %.32s %.64s, %.32s", system.nodename, system.sysname, system.release,
                 system.machine);
    tg_json_set_text(j, "date", date);
    tg_json_set_text(j, "machine", machine);
    tg_json_set_number(j, "threads", omp_get_max_threads());
    tg_json_set_number(j, "seconds_scan", ev->seconds_scan);
    for (size_t i = 0; i < ev->n; i++) {
        tg_json *item = tg_json_object();
        tg_json_set_text(item, "name", ev->item[i].recipe->name.v);
        tg_json_set_number(item, "seconds", ev->item[i].seconds);
        tg_json_add(items, item);
    }
    tg_json_set(j, "reconstructions", items);
    tg_json_set_number(j, "peak_mib", ev->peak_mib);
    tg_json_set_text(j, "compiler", __VERSION__);
    tg_json_set_text(j, "libraries", TG_LIBRARIES);
    return j;
}

/* ---- text: written to a memory stream, whose one error flag is looked at once, at the end ---- */

/** Close a stream made by open_memstream and hand over its text. */
static tg_code take_text(FILE *out, char **text, tg_error *e)
{
    const bool broken = ferror(out);
    if (!fclose(out) && !broken) return TG_OK;
    tg_free(*text);
    *text = NULL;
    return tg_no_memory(e, 1, BUFSIZ);
}

static void put_field(FILE *out, const char *text, char end)
{
    const bool quoted = strpbrk(text, ",\"\r\n");
    if (quoted) fputc('"', out);
    for (; *text; text++) {
        if (*text == '"') fputc('"', out);
        fputc(*text, out);
    }
    if (quoted) fputc('"', out);
    if (end == ',')
        fputc(',', out);
    else
        fputs("\r\n", out);
}

static void put_number(FILE *out, double v)
{
    if (isfinite(v)) fprintf(out, "%.9g", v);
    fputc(',', out);
}

static void put_csv_row(FILE *out, const char *reconstruction, const tg_result *r)
{
    put_field(out, reconstruction, ',');
    put_field(out, r->measure, ',');
    put_field(out, r->where, ',');
    put_number(out, r->value);
    put_field(out, r->unit, ',');
    put_number(out, r->uncertainty);
    put_number(out, r->uncertainty_noise);
    put_number(out, r->nominal);
    put_number(out, r->low);
    put_number(out, r->high);
    put_number(out, r->predicted);
    put_field(out, tg_verdict_text(r->verdict), ',');
    put_field(out, r->why, ',');
    put_field(out, r->note, ',');
    put_field(out, r->source, '\n');
}

tg_code tg_results_csv(const tg_evaluation *ev, char **text, tg_error *e)
{
    size_t bytes;
    *text = NULL;
    FILE *out = open_memstream(text, &bytes);
    if (!out) return tg_no_memory(e, 1, BUFSIZ);
    fputs("reconstruction,measure,where,value,unit,uncertainty,uncertainty_noise,nominal,low,high,predicted,verdict,"
          "why,note,source\r\n",
          out);
    for (size_t i = 0; i < ev->n; i++)
        for (size_t k = 0; k < ev->item[i].results.n_results; k++)
            put_csv_row(out, ev->item[i].recipe->name.v, &ev->item[i].results.result[k]);
    return take_text(out, text, e);
}

enum { COLUMNS = 80, INDENT = 2 };

/** Words broken into lines of COLUMNS, indented. */
static void put_wrapped(FILE *out, const char *text)
{
    size_t column = 0;
    while (*text) {
        const size_t word = strcspn(text, " ");
        if (!column || column + 1 + word > COLUMNS) {
            fprintf(out, "%s%*s", column ? "\n" : "", INDENT, "");
            column = INDENT;
        } else {
            fputc(' ', out);
            column++;
        }
        fwrite(text, 1, word, out);
        column += word;
        text += word + strspn(text + word, " ");
    }
    if (column) fputc('\n', out);
}

/** A limit that was computed has many digits; five are enough to read it by. */
static double readable(double limit)
{
    char text[32];
    snprintf(text, sizeof text, "%.5g", limit);
    return strtod(text, NULL);
}

static tg_row row_of(const tg_result *r)
{
    char value[TG_WORDS], u[TG_WORDS], limits[TG_WORDS];
    tg_row row = {0};
    tg_words_value(r->value, r->uncertainty, value);
    tg_words_uncertainty(r->uncertainty, u);
    tg_words_limits(readable(r->low), readable(r->high), limits);
    tg_cell(row.cell[0], "  %s", r->where);
    if (isnan(r->value))
        tg_cell(row.cell[1], "-");
    else
        tg_cell(row.cell[1], "%s +- %s", value, u);
    if (r->verdict == TG_NO_LIMITS) return row;
    tg_cell(row.cell[2], "%s", limits);
    tg_cell(row.cell[3], "%s", tg_verdict_text(r->verdict));
    return row;
}

/** Does a table on the terminal show it? What was judged; where nothing was, all that could be had. */
static bool shown(const tg_evaluated *item, const tg_result *r)
{
    const bool judged = item->specification && !item->unspecified;
    return judged ? r->verdict != TG_NO_LIMITS : !isnan(r->value);
}

/** The figures that are shown, those of one measure below its name and unit. */
static tg_code put_table(FILE *out, const tg_evaluated *item, size_t *n_shown, tg_error *e)
{
    static const tg_row head = {{"measure, where", "value +- U (95 %)", "specified", "verdict"}};
    const tg_results *all = &item->results;
    tg_row *row;
    size_t n = 0;
    const char *measure = "";
    *n_shown = 0;
    const tg_code code = TG_NEW(row, 2 * all->n_results, e);
    for (size_t i = 0; row && i < all->n_results; i++) {
        const tg_result *r = &all->result[i];
        if (!shown(item, r)) continue;
        if (strcmp(measure, r->measure)) tg_cell(row[n++].cell[0], *r->unit ? "%s [%s]" : "%s", r->measure, r->unit);
        row[n++] = row_of(r);
        measure = r->measure;
        ++*n_shown;
    }
    if (n) tg_table_print(out, &head, row, n);
    tg_free(row);
    return code;
}

static void put_heading(FILE *out, const tg_evaluated *item)
{
    const tg_image *image = &item->image;
    const bool judged = (item->specification && !item->unspecified) || *item->lost;
    fprintf(out, "\n%s", item->recipe->name.v);
    if (image->method && image->kernel) fprintf(out, " (%s, %s)", image->method, image->kernel);
    if (judged) fprintf(out, ": %s", tg_verdict_text(item->verdict));
    if (item->specification && !item->unspecified) fprintf(out, ", by the specification '%s'", item->specification);
    fputc('\n', out);
}

static void put_note(FILE *out, const tg_result *r)
{
    char words[512];
    if (!*r->why && !*r->note) return;
    snprintf(words, sizeof words, "%s of %s: %s%s%s", r->measure, r->where, r->why, *r->why && *r->note ? "; " : "",
             r->note);
    put_wrapped(out, words);
}

static tg_code put_item(FILE *out, const tg_evaluated *item, tg_error *e)
{
    const tg_results *all = &item->results;
    size_t n;
    put_heading(out, item);
    if (item->unspecified) {
        char words[512];
        snprintf(words, sizeof words, "'%s' holds no specification for these conditions: %s", item->specification,
                 item->unspecified);
        put_wrapped(out, words);
    }
    put_wrapped(out, item->lost);
    const tg_code code = put_table(out, item, &n, e);
    for (size_t i = 0; i < all->n_results; i++)
        if (shown(item, &all->result[i])) put_note(out, &all->result[i]);
    const bool judged = item->specification && !item->unspecified;
    if (n < all->n_results)
        fprintf(out, "%*sand %zu more %s, in the results\n", INDENT, "", all->n_results - n,
                judged ? "without limits" : "that could not be had");
    return code;
}

tg_code tg_results_text(const tg_evaluation *ev, char **text, tg_error *e)
{
    size_t bytes;
    *text = NULL;
    FILE *out = open_memstream(text, &bytes);
    if (!out) return tg_no_memory(e, 1, BUFSIZ);
    fprintf(out, "verdict: %s%s\n", tg_verdict_text(ev->verdict),
            ev->verdict == TG_NO_LIMITS ? " (nothing was judged)" : "");
    tg_code code = TG_OK;
    for (size_t i = 0; i < ev->n && code == TG_OK; i++)
        code = put_item(out, &ev->item[i], e);
    const tg_code taken = take_text(out, text, e);
    if (code == TG_OK) return taken;
    tg_free(*text);
    *text = NULL;
    return code;
}

/* ---- the folder ---- */

enum { PATH = 4096 };

static tg_code join(const char *folder, const char *name, const char *ending, char path[PATH], tg_error *e)
{
    const int n = snprintf(path, PATH, "%s/%s%s", folder, name, ending);
    return n < PATH ? TG_OK : tg_fail(e, TG_USAGE, folder, 0, "the path is too long; choose a shorter one");
}

static const char *const files[] = {"results.json", "results.csv", "run.json", "report.html"};

/** May all names be written? All that may not are told. */
static tg_code all_allowed(const tg_job *job, const tg_inputs *in, const char *folder, bool force, tg_error *e)
{
    const tg_recipe *recipe = job->reconstructions.v;
    static const char *const endings[] = {".fits", ".png"};
    const size_t n_files = sizeof files / sizeof *files;
    char path[PATH];
    const char **inputs = NULL;
    tg_code code = TG_OK;
    TG_TRY(tg_output_folder_allowed(folder, e));
    if (access(folder, F_OK)) goto done; /* nothing stands in the way */
    TG_TRY(TG_NEW(inputs, in->n, e));
    for (size_t i = 0; i < in->n; i++)
        inputs[i] = in->input[i].path;
    for (size_t i = 0; i < n_files + 2 * job->reconstructions.n; i++) {
        const size_t at = i - n_files; /* beyond the files: two for each image */
        tg_code found = i < n_files ? join(folder, files[i], "", path, e)
                                    : join(folder, recipe[at / 2].name.v, endings[at % 2], path, e);
        if (found == TG_OK) found = tg_output_allowed(path, force, inputs, in->n, e);
        tg_note(&code, found);
    }
done:
    tg_free(inputs);
    return code;
}

tg_code tg_evaluation_allowed(const tg_job *job, const char *folder, bool force, tg_error *e)
{
    tg_inputs in = {0};
    tg_code code = tg_job_inputs(job, &in, e);
    if (code == TG_OK) code = all_allowed(job, &in, folder, force, e);
    tg_inputs_free(&in);
    return code;
}

static tg_code write_images(const tg_evaluation *ev, const tg_evaluated *item, const char *folder, tg_error *e)
{
    tg_code code = TG_OK;
    char path[PATH], parameters[1024];
    tg_window window;
    const size_t middle = item->image.grid.n[2] / 2;
    tg_fields_text(tg_recipe_fields, item->recipe, parameters, sizeof parameters);
    const tg_provenance made = {"evaluate", parameters, &ev->inputs};
    TG_TRY(join(folder, item->recipe->name.v, ".fits", path, e));
    TG_TRY(tg_fits_write_image(path, &item->image, &made, e));
    TG_TRY(join(folder, item->recipe->name.v, ".png", path, e));
    TG_TRY(tg_display_window(&item->image, middle, &window, e));
    TG_TRY(tg_png_write(path, &item->image, middle, &window, e));
done:
    return code;
}

static tg_code write_json(const char *folder, const char *name, tg_json *j, tg_error *e)
{
    char path[PATH];
    tg_code code = join(folder, name, "", path, e);
    if (code == TG_OK) code = tg_json_write(path, j, e);
    tg_json_free(j);
    return code;
}

static tg_code write_text(const char *folder, const char *name, const char *text, tg_error *e)
{
    char path[PATH];
    const tg_code code = join(folder, name, "", path, e);
    return code == TG_OK ? tg_output_write(path, text, strlen(text), e) : code;
}

tg_code tg_evaluation_write(const tg_evaluation *ev, const char *folder, bool force, tg_error *e)
{
    tg_code code = TG_OK;
    char *csv = NULL, *html = NULL;
    TG_TRY(all_allowed(ev->job, &ev->inputs, folder, force, e));
    TG_TRY(tg_output_folder(folder, e));
    for (size_t i = 0; i < ev->n; i++)
        TG_TRY(write_images(ev, &ev->item[i], folder, e));
    TG_TRY(tg_results_csv(ev, &csv, e));
    TG_TRY(tg_page_report(ev, &html, e));
    TG_TRY(write_text(folder, "results.csv", csv, e));
    TG_TRY(write_text(folder, "report.html", html, e));
    TG_TRY(write_json(folder, "run.json", tg_run_json(ev), e));
    TG_TRY(write_json(folder, "results.json", tg_results_json(ev), e)); /* last: where it stands all is complete */
done:
    tg_free(csv);
    tg_free(html);
    return code;
}
