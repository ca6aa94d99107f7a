/* JSON written in order (RFC 8259). */
#ifndef BASE_JSON_H
#define BASE_JSON_H

#include "base/text.h"

/**
 * A writer: calls follow the document. Inside an object give every value a key; inside an array give NULL.
 * Two spaces of indentation; arrays of numbers stay on one line; a new line at the document's end. Start it with = {0};
 * text.failed says at the end whether memory ran out. At most 64 levels. Misuse is a programming error (asserted).
 */
typedef struct bali_json {
    bali_text text;
    uint64_t objects; /* bit d - 1: the level at depth d is an object, not an array */
    unsigned depth;
    bool first;        /* nothing stands in the innermost level yet */
    bool inline_array; /* the innermost level is an array that holds only numbers, nulls and booleans so far */
} bali_json;

void bali_json_object(bali_json *json, const char *key);
void bali_json_array(bali_json *json, const char *key);
/** Ends the innermost object or array. */
void bali_json_end_object(bali_json *json);
void bali_json_end_array(bali_json *json);
/** Text that is not UTF-8 has its bad bytes replaced by U+FFFD; characters that may steer a terminal are written as \uNNNN. NULL
 *  writes null. */
void bali_json_string(bali_json *json, const char *key, const char *value);
/** Reads back exactly; NaN and infinities are written as null. */
void bali_json_number(bali_json *json, const char *key, double value);
void bali_json_whole(bali_json *json, const char *key, uint64_t value);
void bali_json_boolean(bali_json *json, const char *key, bool value);
void bali_json_null(bali_json *json, const char *key);
/** An array of numbers on one line. */
void bali_json_numbers(bali_json *json, const char *key, const double *values, size_t n);
void bali_json_free(bali_json *json);

#endif
