#include "io/spelling.h"

#include <ctype.h>
#include <stdio.h>
#include <string.h>

tg_shown tg_show(const char *text)
{
    tg_shown s = {{0}};
    size_t n = strlen(text);
    const bool cut = n >= sizeof s.text - 3;
    if (cut) {
        n = sizeof s.text - 4;
        while (n && ((unsigned char)text[n] & 0xc0) == 0x80)
            n--; /* not through a UTF-8 character */
    }
    for (size_t i = 0; i < n; i++)
        s.text[i] = iscntrl((unsigned char)text[i]) ? '?' : text[i];
    if (cut) memcpy(s.text + n, "...", 4);
    return s;
}

const char *tg_word_next(const char **words, char out[TG_WORD])
{
    const char *from = *words ? *words + strspn(*words, " ") : "";
    const size_t n = strcspn(from, " ");
    if (n == 0 || n >= TG_WORD) return NULL;
    memcpy(out, from, n);
    out[n] = '\0';
    *words = from + n;
    return out;
}

int tg_word_index(const char *word, const char *words)
{
    char known[TG_WORD];
    for (int i = 0; tg_word_next(&words, known); i++)
        if (!strcmp(word, known)) return i;
    return -1;
}

const char *tg_word_at(const char *words, int index, char out[TG_WORD])
{
    for (int i = 0; tg_word_next(&words, out); i++)
        if (i == index) return out;
    out[0] = '\0';
    return out;
}

/* Letters to insert, drop, change or swap with their neighbour, in lower case: the optimal string alignment. */
static size_t distance(const char *a, const char *b)
{
    const size_t n = strlen(a), m = strlen(b);
    size_t row[3][TG_WORD + 1];
    for (size_t j = 0; j <= m; j++)
        row[0][j] = j;
    for (size_t i = 1; i <= n; i++) {
        size_t *now = row[i % 3], *last = row[(i + 2) % 3], *before = row[(i + 1) % 3];
        now[0] = i;
        for (size_t j = 1; j <= m; j++) {
            const int p = tolower((unsigned char)a[i - 1]), q = tolower((unsigned char)b[j - 1]);
            size_t best = last[j - 1] + (p != q);
            if (last[j] + 1 < best) best = last[j] + 1;
            if (now[j - 1] + 1 < best) best = now[j - 1] + 1;
            if (i > 1 && j > 1 && p == tolower((unsigned char)b[j - 2]) && q == tolower((unsigned char)a[i - 2]) &&
                before[j - 2] + 1 < best)
                best = before[j - 2] + 1;
            now[j] = best;
        }
    }
    return row[n % 3][m];
}

bool tg_nearest(const char *word, const char *words, char out[TG_WORD])
{
    const size_t n = strlen(word);
    if (n == 0 || n >= TG_WORD) return false;
    size_t best = (n + 2) / 3 + 1;
    char known[TG_WORD];
    while (tg_word_next(&words, known)) {
        const size_t d = distance(word, known);
        if (d >= best) continue;
        best = d;
        memcpy(out, known, TG_WORD);
    }
    return best <= (n + 2) / 3;
}

void tg_words_list(const char *words, const char *joint, char *out, size_t size)
{
    char word[TG_WORD], next[TG_WORD];
    bool more = tg_word_next(&words, word);
    size_t n = 0;
    out[0] = '\0';
    while (more && n < size) {
        more = tg_word_next(&words, next);
        n += (size_t)snprintf(out + n, size - n, "%s%s", n == 0 ? "" : more ? ", " : joint, word);
        memcpy(word, next, TG_WORD);
    }
}
