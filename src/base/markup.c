#include "base/markup.h"

/* What stands for a character that markup cannot hold as it is; NULL when it can. XML 1.0 has no way at all to write
 * most control characters (section 2.2), not even as references: they become U+FFFD, as bytes that are not UTF-8 do. */
static const char *substitute(uint32_t character, bool keep_lines) {
    switch (character) {
    case '&': return "&amp;";
    case '<': return "&lt;";
    case '>': return "&gt;";
    case '"': return "&quot;";
    case '\'': return "&#39;";
    case '\r': return "&#13;";
    case '\t': return keep_lines ? NULL : "&#9;";
    case '\n': return keep_lines ? NULL : "&#10;";
    default: return character < 0x20 || character == 0xFFFE || character == 0xFFFF ? "\xEF\xBF\xBD" : NULL;
    }
}

/* Adds runs that need nothing in one piece, and what stands between them piece by piece. */
static void put(bali_text *text, const char *bytes, size_t length, bool keep_lines) {
    size_t start = 0;
    for (size_t i = 0; i < length;) {
        uint32_t character;
        size_t size = bali_utf8_next(bytes + i, length - i, &character);
        const char *instead = size ? substitute(character, keep_lines) : "\xEF\xBF\xBD";
        size_t next = i + (size ? size : 1);
        if (instead) {
            bali_text_add(text, bytes + start, i - start);
            bali_text_puts(text, instead);
            start = next;
        }
        i = next;
    }
    bali_text_add(text, bytes + start, length - start);
}

void bali_markup_escape(bali_text *text, const char *bytes, size_t length) {
    put(text, bytes, length, false);
}

void bali_markup_content(bali_text *text, const char *bytes, size_t length) {
    put(text, bytes, length, true);
}
