/* How a wrong spelling relates to the valid ones. */
#ifndef FORMATS_SPELLING_H
#define FORMATS_SPELLING_H

#include <stddef.h>

typedef enum bali_difference {
    BALI_DIFFERENT,           /* another text, perhaps a misspelling */
    BALI_DIFFERS_IN_CASE,     /* ASCII case */
    BALI_DIFFERS_IN_BLANKS,   /* blanks, also those that are not seen: no-break, zero width, a byte order mark */
    BALI_DIFFERS_IN_BOTH,     /* case and blanks */
    BALI_DIFFERS_IN_ENCODING  /* one composes its accents, the other has them as marks of their own: U+00E9 against
                                 U+0065 U+0301 (Unicode Standard Annex 15, forms NFC and NFD) */
} bali_difference;

/** How two different texts of UTF-8 differ. That accents are the same is checked for Latin letters (U+00C0 to U+017F) as
 *  far as their base letter, and assumed for others. */
bali_difference bali_spelling_difference(const char *a, size_t length_a, const char *b, size_t length_b);

/** "only in case" and so on, for the end of "differs ..."; NULL for BALI_DIFFERENT. Static. */
const char *bali_difference_words(bali_difference difference);

/**
 * The valid name nearest to a text: one that differs only as above, else by bali_nearest, else BALI_NO_NAME. Only the
 * first 10,000 names are looked at. *how is not NULL.
 */
size_t bali_spelling_nearest(const char *text, size_t length, const char *const *names, size_t n_names,
                             bali_difference *how);

#endif
