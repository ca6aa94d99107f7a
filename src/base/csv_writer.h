/* CSV written by RFC 4180. */
#ifndef BASE_CSV_WRITER_H
#define BASE_CSV_WRITER_H

#include "base/text.h"

/** Adds one cell, quoted where it must be to read back as it is: a delimiter, quote, newline, outer blanks, an empty text. */
void bali_csv_put(bali_text *text, const char *cell, size_t length, char delimiter);

#endif
