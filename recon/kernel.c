#include "recon/kernel.h"

#include "io/fields.h"
#include "io/input.h"
#include "io/memory.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

/* ---- windows ---- */

static double ramp(double u)
{
    (void)u;
    return 1;
}

static double shepp_logan(double u)
{
    const double x = M_PI_2 * u;
    return x > 0 ? sin(x) / x : 1;
}

static double cosine(double u)
{
    return cos(M_PI_2 * u);
}

static double hann(double u)
{
    return 0.5 + 0.5 * cos(M_PI * u);
}

static double hamming(double u)
{
    return 0.54 + 0.46 * cos(M_PI * u);
}

static double parzen(double u)
{
    return u <= 0.5 ? 1 - 6 * u * u * (1 - u) : 2 * (1 - u) * (1 - u) * (1 - u);
}

static double butterworth(double u)
{
    return 1 / sqrt(1 + u * u * u * u);
}

struct tg_apodisation {
    double (*response)(double u); /* u = f / cut-off, 0..end */
    double end;                   /* the response beyond is 0; INFINITY: the window only rolls off at its cut-off */
};

static const tg_apodisation apodisations[] = {
    /* in the order of TG_WINDOWS */
    {ramp, 1},               /* Bracewell and Riddle 1967 */
    {shepp_logan, 1},        /* Shepp and Logan 1974 */
    {cosine, 1},             /* common practice */
    {hann, 1},               /* Blackman and Tukey 1958 */
    {hamming, 1},            /* Blackman and Tukey 1958 */
    {parzen, 1},             /* Parzen 1961 */
    {butterworth, INFINITY}, /* Butterworth 1930, order 2, amplitude 1/sqrt(2) at the cut-off */
};

double tg_kernel_end(const tg_kernel *k)
{
    return k->apodisation ? k->apodisation->end * k->cutoff : k->fraction[k->n - 1];
}

double tg_kernel_response(const tg_kernel *k, double fraction)
{
    if (fraction > tg_kernel_end(k)) return 0;
    if (k->apodisation) return k->apodisation->response(fraction / k->cutoff);
    size_t below = 0, above = k->n - 1;
    while (above - below > 1) {
        const size_t middle = below + (above - below) / 2;
        *(k->fraction[middle] <= fraction ? &below : &above) = middle;
    }
    const double t = (fraction - k->fraction[below]) / (k->fraction[above] - k->fraction[below]);
    return k->value[below] + t * (k->value[above] - k->value[below]);
}

/* ---- reading ---- */

static const tg_field cutoff_field = {
    .key = "cut-off", .kind = TG_NUMBER, .what = "fraction of the Nyquist frequency", .low = TG_ABOVE_ZERO, .high = 2};
static const tg_field row_fields[2] = {
    {.key = "fraction", .kind = TG_NUMBER, .what = "fraction of the Nyquist frequency", .low = 0, .high = 2},
    {.key = "value", .kind = TG_NUMBER, .what = "response of the window", .low = -1000, .high = 1000},
};

enum { MOST_BYTES = 1 << 20 };

/* One line of a kernel file, cut into words in place. */
static tg_code read_row(const char *path, int line, char *text, tg_kernel *k, tg_error *e)
{
    static const char blank[] = " \t\r";
    tg_number number[2];
    size_t words = 0;
    text[strcspn(text, "#")] = '\0';
    char *rest = NULL;
    for (char *word = strtok_r(text, blank, &rest); word; word = strtok_r(NULL, blank, &rest), words++) {
        if (words == 2)
            return tg_fail(e, TG_INPUT, path, line, "more than a fraction and a value; write one row a line");
        const tg_code code = tg_field_set(&row_fields[words], &number[words], word, path, line, e);
        if (code != TG_OK) return code;
    }
    if (!words) return TG_OK;
    if (words == 1) return tg_fail(e, TG_INPUT, path, line, "a fraction without a value; write both in one line");
    if (!k->n && number[0].v > 0)
        return tg_fail(e, TG_INPUT, path, line, "the first fraction is %g; start at 0", number[0].v);
    if (k->n && number[0].v <= k->fraction[k->n - 1])
        return tg_fail(e, TG_INPUT, path, line, "fraction %g follows %g; let them rise", number[0].v,
                       k->fraction[k->n - 1]);
    k->fraction[k->n] = number[0].v;
    k->value[k->n++] = number[1].v;
    return TG_OK;
}

static tg_code read_file(const char *path, tg_kernel *k, tg_error *e)
{
    tg_code code = TG_OK;
    char *text = NULL;
    size_t bytes, lines = 1;
    TG_TRY(tg_read_file(path, MOST_BYTES, &text, &bytes, e));
    if (strlen(text) != bytes)
        TG_TRY(tg_fail(e, TG_INPUT, path, 0, "no text file; a kernel file has lines of fraction and value"));
    for (size_t i = 0; i < bytes; i++)
        lines += text[i] == '\n';
    TG_TRY(TG_NEW(k->fraction, lines, e));
    TG_TRY(TG_NEW(k->value, lines, e));
    int line = 0;
    for (char *row = text, *next; row; row = next) {
        next = strchr(row, '\n');
        if (next) *next++ = '\0';
        TG_TRY(read_row(path, ++line, row, k, e));
    }
    if (k->n < 2) TG_TRY(tg_fail(e, TG_INPUT, path, 0, "%zu rows of fraction and value; write at least 2", k->n));
done:
    tg_free(text);
    return code;
}

static tg_code unknown(const char *text, const char *name, tg_error *e)
{
    char known[256];
    const bool near = tg_nearest(name, TG_WINDOWS, known);
    if (!near) tg_words_list(TG_WINDOWS, " and ", known, sizeof known);
    return tg_fail(e, TG_INPUT, NULL, 0, "'%s' is no window and no kernel file; %s%s", tg_show(text).text,
                   near ? "the nearest name is " : "windows are ", known);
}

tg_code tg_kernel_read(const char *text, tg_kernel *k, tg_error *e)
{
    tg_code code = TG_OK;
    tg_kernel read = {.cutoff = 1};
    char name[TG_WORD];
    const size_t head = strcspn(text, "@");
    snprintf(name, sizeof name, "%.*s", (int)head, text);
    const int index = tg_word_index(name, TG_WINDOWS);
    if (index < 0) {
        TG_TRY(access(text, F_OK) == 0 ? read_file(text, &read, e) : unknown(text, name, e));
    } else {
        read.apodisation = &apodisations[index];
        if (text[head]) {
            tg_number cutoff;
            TG_TRY(tg_field_set(&cutoff_field, &cutoff, text + head + 1, "", 0, e)); /* "": no file, no option either */
            read.cutoff = cutoff.v;
        }
    }
done:
    if (code == TG_OK)
        *k = read;
    else
        tg_kernel_free(&read);
    return code;
}

void tg_kernel_free(tg_kernel *k)
{
    tg_free(k->fraction);
    tg_free(k->value);
    *k = (tg_kernel){0};
}
