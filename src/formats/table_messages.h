/* What is said of a cell whose text is no outcome of its variable. */
#ifndef FORMATS_TABLE_MESSAGES_H
#define FORMATS_TABLE_MESSAGES_H

#include "ballast/network.h"
#include "formats/phrase.h"

#include <stdbool.h>
#include <stdint.h>

typedef struct bali_bad_label {
    const bal_domain *domain;
    size_t variable;
    const char *text;
    size_t length;
    uint64_t record; /* one-based, where the line does not tell it; else 0 */
    bool redact;     /* say nothing of the text */
} bali_bad_label;

/** The whole message: the text, the outcomes there are, and a hint where one suggests itself: another case, invisible
 *  blanks, Unicode normalisation, 1.0 for 1, a date that a spreadsheet made, a usual spelling of a missing cell. */
void bali_say_bad_label(const bali_bad_label *label, bali_phrase *phrase);

/** The same for a cell of a column that ballast.cuts makes outcomes of: it has to be a number. */
void bali_say_bad_number(const bali_bad_label *label, bali_phrase *phrase);

/** What is wrong with a text as a weight, and what would be right. redact: say nothing of the text. */
void bali_say_bad_weight(const char *text, size_t length, bool redact, bali_phrase *phrase);

/** "12 in smoker, 3 in age": the variables with the largest counts first, at most ten. */
void bali_say_largest(const bal_domain *domain, const uint64_t *counts, bali_phrase *phrase);

#endif
