/* A message put together piece by piece in fixed memory, since nothing is allocated to report a failure. */
#ifndef FORMATS_PHRASE_H
#define FORMATS_PHRASE_H

#include "ballast/error.h"

#include <stdint.h>

/** Start it with = {0}. What does not fit is cut at a character's end. */
typedef struct bali_phrase {
    char text[sizeof((bal_error *)0)->message];
    size_t length;
} bali_phrase;

void bali_phrase_add(bali_phrase *phrase, const char *format, ...) BAL_FORMAT(2, 3);
/** A text, at most 48 bytes of it and then three dots. */
void bali_phrase_text(bali_phrase *phrase, const char *text, size_t length);
/** The same between quotes. */
void bali_phrase_quote(bali_phrase *phrase, const char *text, size_t length);
/** A whole number with commas between thousands. */
void bali_phrase_count(bali_phrase *phrase, uint64_t count);

#endif
