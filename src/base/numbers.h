/* Numbers in and out, in the C locale whatever the user's. */
#ifndef BASE_NUMBERS_H
#define BASE_NUMBERS_H

#include "base/text.h"

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define BALI_NUMBER_BYTES 32

/**
 * Reads a whole string as one finite decimal number: digits, at most one point, an exponent; no blanks, no
 * hexadecimal, no "nan" or "inf", no overflow to infinity. Underflow to 0 is accepted.
 */
bool bali_number_read(const char *bytes, size_t length, double *value);

/** Reads a whole string as a whole number from 0 to 2^64 - 1: digits only. */
bool bali_whole_read(const char *bytes, size_t length, uint64_t *value);

/** Writes the shortest of %.15g, %.16g, %.17g that reads back equal; value must be finite. Returns text. */
const char *bali_number_write(double value, char text[BALI_NUMBER_BYTES]);

/** The same, added to a text. */
void bali_text_put_number(bali_text *text, double value);

/** A whole number with commas between thousands: 1,234,567. */
void bali_text_put_thousands(bali_text *text, uint64_t value);

/** The value rounded to this many significant decimal digits, as decimal text would read it. */
double bali_round_significant(double value, int digits);

#endif
