/* A growing string, and UTF-8. */
#ifndef BASE_TEXT_H
#define BASE_TEXT_H

#include "ballast/error.h"

#include <stdarg.h>
#include <stdbool.h>
#include <stdint.h>

/**
 * A string that grows. Start it with = {0}; bytes[length] is a NUL once anything was added.
 *
 * Running out of memory is remembered in failed, so that a writer checks once at the end; after that nothing more
 * is added.
 */
typedef struct bali_text {
    char *bytes;
    size_t length, capacity;
    bool failed;
} bali_text;

void bali_text_add(bali_text *text, const char *bytes, size_t length);
void bali_text_puts(bali_text *text, const char *string);
void bali_text_putc(bali_text *text, char c);
void bali_text_printf(bali_text *text, const char *format, ...) BAL_FORMAT(2, 3);
void bali_text_vprintf(bali_text *text, const char *format, va_list arguments) BAL_FORMAT(2, 0);
/** Spaces until the text is this wide on its last line, counted in characters; at least one when it is wider. */
void bali_text_pad(bali_text *text, size_t column);
/** A string as it may be shown on a terminal: control characters and bytes that are not UTF-8 as \xNN. */
void bali_text_put_visible(bali_text *text, const char *bytes, size_t length);
/** Words, broken at blanks so that no line passes column 79, and a newline. column is where the text stands now; further lines
 *  begin at indent. A newline among the words begins a new line. */
void bali_text_put_wrapped(bali_text *text, const char *words, size_t indent, size_t column);
void bali_text_clear(bali_text *text);
void bali_text_free(bali_text *text);
/** The string, never NULL. */
const char *bali_text_string(const bali_text *text);

/**
 * Decodes one character of strict UTF-8: no overlong form, no surrogate, nothing above U+10FFFF.
 *
 * Returns how many bytes it has (1 to 4), or 0 when the bytes at hand do not begin a character. *character may not
 * be NULL.
 */
size_t bali_utf8_next(const char *bytes, size_t length, uint32_t *character);
/** Offset of the first byte that is not UTF-8; length when all of it is. */
size_t bali_utf8_check(const char *bytes, size_t length);
/** Characters in a string; bytes that are not UTF-8 count one each. */
size_t bali_utf8_count(const char *bytes, size_t length);
/** C0 and C1 controls, DEL, line and paragraph separators, and the marks that change writing direction. */
bool bali_is_control(uint32_t character);

#endif
