#ifndef TG_SPELLING_H
#define TG_SPELLING_H
#include <stdbool.h>
#include <stddef.h>

/** Several words in one text, separated by spaces: "cylinder sphere box". NULL holds none. */
enum { TG_WORD = 64 }; /* bytes of the longest, its NUL included */

/** The next word, or NULL.  @param words  moves behind it */
const char *tg_word_next(const char **words, char out[TG_WORD]);

/** Index of a word among several, or -1. */
int tg_word_index(const char *word, const char *words);

/** The word of an index, "" when there are fewer.  @return out */
const char *tg_word_at(const char *words, int index, char out[TG_WORD]);

/** "cylinder, sphere or box".  @param joint  between the last two: " or " */
void tg_words_list(const char *words, const char *joint, char *out, size_t size);

/** The word nearest to a mistyped one (letters changed, missing, added or swapped: at most a third of its length,
 *  rounded up; upper and lower case are the same).  @return false: none is near */
bool tg_nearest(const char *word, const char *words, char out[TG_WORD]);

/** A user's text inside a message: one line of moderate length, whatever bytes it holds. */
typedef struct {
    char text[48];
} tg_shown;

tg_shown tg_show(const char *text);

#endif
