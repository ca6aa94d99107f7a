#include "formats/spelling.h"

#include "base/names.h"
#include "base/text.h"

#include <string.h>

enum { LONGEST_COMPARED = 255, MOST_COMPARED = 10000 };

typedef struct reader {
    const char *at, *end;
} reader;

/* The next character; 0 at the end. */
static uint32_t next(reader *text) {
    uint32_t character = 0;
    if (text->at == text->end) return 0;
    size_t bytes = bali_utf8_next(text->at, (size_t)(text->end - text->at), &character);
    text->at += bytes ? bytes : 1;
    return character;
}

static bool is_blank(uint32_t c) {
    return c == ' ' || c == '\t' || c == '\n' || c == '\r' || c == 0xA0 || (c >= 0x2000 && c <= 0x200B) || c == 0x202F ||
           c == 0x205F || c == 0x2060 || c == 0x3000 || c == 0xFEFF;
}

static uint32_t next_folded(reader *text, bool skip_blanks, bool fold_case) {
    uint32_t c = next(text);
    while (skip_blanks && is_blank(c)) c = next(text);
    return fold_case && c >= 'A' && c <= 'Z' ? c - 'A' + 'a' : c;
}

static bool equal_folded(reader a, reader b, bool skip_blanks, bool fold_case) {
    for (;;) {
        uint32_t of_a = next_folded(&a, skip_blanks, fold_case), of_b = next_folded(&b, skip_blanks, fold_case);
        if (of_a != of_b) return false;
        if (of_a == 0) return true;
    }
}

static bool is_mark(uint32_t c) {
    return (c >= 0x0300 && c <= 0x036F) || (c >= 0x1AB0 && c <= 0x1AFF) || (c >= 0x1DC0 && c <= 0x1DFF) ||
           (c >= 0x3099 && c <= 0x309A);
}

static uint32_t peek(reader text) {
    return next(&text);
}

/* The letter under the accent of a composed Latin letter, ' ' for letters that are not composed, 0 beyond this table.
 * Source: the canonical decompositions of U+00C0 to U+017F in the Unicode Character Database, which the module
 * unicodedata of Python 3.11 gives alike. */
static uint32_t base_letter(uint32_t c) {
    static const char bases[] = "AAAAAA CEEEEIIII NOOOOO  UUUUY  aaaaaa ceeeeiiii nooooo  uuuuy y" /* U+00C0 */
                                "AaAaAaCcCcCcCcDd  EeEeEeEeEeGgGg"                                 /* U+0100 */
                                "GgGgHh  IiIiIiIiI   JjKk LlLlLl "                                 /* U+0120 */
                                "   NnNnNn   OoOoOo  RrRrRrSsSsSs"                                 /* U+0140 */
                                "SsTtTt  UuUuUuUuUuUuWwYyYZzZzZz ";                                /* U+0160 */
    return c >= 0xC0 && c <= 0x17F ? (unsigned char)bases[c - 0xC0] : 0;
}

/* Whether a composed letter of one text is letter and marks in the other. */
static bool composes(uint32_t composed, uint32_t letter, uint32_t after) {
    if (composed < 0xC0 || is_mark(composed) || !is_mark(after)) return false;
    uint32_t base = base_letter(composed);
    return base == 0 || base == letter;
}

static void skip_marks(reader *text) {
    while (text->at < text->end && is_mark(peek(*text))) (void)next(text);
}

static bool equal_composed(reader a, reader b) {
    for (;;) {
        uint32_t of_a = next(&a), of_b = next(&b);
        if (of_a == of_b && of_a != 0) continue;
        if (of_a == 0 && of_b == 0) return true;
        if (composes(of_a, of_b, peek(b))) skip_marks(&b);
        else if (composes(of_b, of_a, peek(a))) skip_marks(&a);
        else return false;
    }
}

bali_difference bali_spelling_difference(const char *a, size_t length_a, const char *b, size_t length_b) {
    reader of_a = {a, a + length_a}, of_b = {b, b + length_b};
    if (equal_folded(of_a, of_b, false, true)) return BALI_DIFFERS_IN_CASE;
    if (equal_folded(of_a, of_b, true, false)) return BALI_DIFFERS_IN_BLANKS;
    if (equal_folded(of_a, of_b, true, true)) return BALI_DIFFERS_IN_BOTH;
    return equal_composed(of_a, of_b) ? BALI_DIFFERS_IN_ENCODING : BALI_DIFFERENT;
}

const char *bali_difference_words(bali_difference difference) {
    switch (difference) {
    case BALI_DIFFERENT: return NULL;
    case BALI_DIFFERS_IN_CASE: return "only in upper and lower case";
    case BALI_DIFFERS_IN_BLANKS: return "only in blanks";
    case BALI_DIFFERS_IN_BOTH: return "only in blanks and upper and lower case";
    case BALI_DIFFERS_IN_ENCODING: return "only in Unicode normalisation";
    }
    return NULL;
}

size_t bali_spelling_nearest(const char *text, size_t length, const char *const *names, size_t n_names,
                             bali_difference *how) {
    *how = BALI_DIFFERENT;
    if (length == 0 || length > LONGEST_COMPARED) return BALI_NO_NAME;
    for (size_t i = 0; i < n_names && i < MOST_COMPARED; i++) {
        *how = bali_spelling_difference(text, length, names[i], strlen(names[i]));
        if (*how != BALI_DIFFERENT) return i;
    }
    return bali_nearest(text, length, names, n_names);
}
