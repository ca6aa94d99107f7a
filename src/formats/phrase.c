#include "formats/phrase.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { LONGEST_SHOWN = 48 };

/* The largest length up to this one that does not end inside a character. */
static size_t whole_characters(const char *text, size_t length) {
    while (length > 0 && ((unsigned char)text[length] & 0xC0) == 0x80) length--;
    return length;
}

void bali_phrase_add(bali_phrase *phrase, const char *format, ...) {
    size_t room = sizeof phrase->text - phrase->length;
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(phrase->text + phrase->length, room, format, arguments);
    va_end(arguments);
    if (length < 0) return;
    if ((size_t)length < room) {
        phrase->length += (size_t)length;
        return;
    }
    /* Cut: if the last character is not whole, its first byte goes too. */
    size_t end = sizeof phrase->text - 1, first = end;
    do first--;
    while (first > 0 && ((unsigned char)phrase->text[first] & 0xC0) == 0x80);
    unsigned char lead = (unsigned char)phrase->text[first];
    size_t bytes = lead >= 0xF0 ? 4 : lead >= 0xE0 ? 3 : lead >= 0xC0 ? 2 : 1;
    phrase->length = first + bytes > end ? first : end;
    phrase->text[phrase->length] = '\0';
}

void bali_phrase_text(bali_phrase *phrase, const char *text, size_t length) {
    if (length <= LONGEST_SHOWN) bali_phrase_add(phrase, "%.*s", (int)length, text);
    else bali_phrase_add(phrase, "%.*s...", (int)whole_characters(text, LONGEST_SHOWN), text);
}

void bali_phrase_quote(bali_phrase *phrase, const char *text, size_t length) {
    bali_phrase_add(phrase, "\"");
    bali_phrase_text(phrase, text, length);
    bali_phrase_add(phrase, "\"");
}

void bali_phrase_count(bali_phrase *phrase, uint64_t count) {
    char digits[24];
    size_t n = 0;
    do digits[n++] = (char)('0' + count % 10);
    while ((count /= 10) > 0);
    while (n > 0) {
        n--;
        bali_phrase_add(phrase, n > 0 && n % 3 == 0 ? "%c," : "%c", digits[n]);
    }
}
