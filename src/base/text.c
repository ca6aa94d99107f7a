#include "base/text.h"

#include "base/memory.h"

#include <stdio.h>
#include <string.h>

static bool make_room(bali_text *text, size_t more) {
    if (text->failed) return false;
    if (more >= SIZE_MAX - text->length || !bali_grow((void **)&text->bytes, &text->capacity, text->length + more + 1, 1)) {
        text->failed = true;
        return false;
    }
    return true;
}

void bali_text_add(bali_text *text, const char *bytes, size_t length) {
    if (!make_room(text, length)) return;
    if (length) memcpy(text->bytes + text->length, bytes, length);
    text->length += length;
    text->bytes[text->length] = '\0';
}

void bali_text_puts(bali_text *text, const char *string) {
    bali_text_add(text, string, strlen(string));
}

void bali_text_putc(bali_text *text, char c) {
    bali_text_add(text, &c, 1);
}

void bali_text_vprintf(bali_text *text, const char *format, va_list arguments) {
    va_list again;
    va_copy(again, arguments);
    int length = vsnprintf(NULL, 0, format, arguments);
    if (length < 0) {
        text->failed = true;
    } else if (make_room(text, (size_t)length)) {
        (void)vsnprintf(text->bytes + text->length, (size_t)length + 1, format, again);
        text->length += (size_t)length;
    }
    va_end(again);
}

void bali_text_printf(bali_text *text, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    bali_text_vprintf(text, format, arguments);
    va_end(arguments);
}

void bali_text_pad(bali_text *text, size_t column) {
    size_t start = text->length;
    while (start > 0 && text->bytes[start - 1] != '\n') start--;
    size_t width = text->length > start ? bali_utf8_count(text->bytes + start, text->length - start) : 0;
    do {
        bali_text_putc(text, ' ');
    } while (++width < column && !text->failed);
}

void bali_text_put_visible(bali_text *text, const char *bytes, size_t length) {
    for (size_t i = 0; i < length;) {
        uint32_t character;
        size_t size = bali_utf8_next(bytes + i, length - i, &character);
        if (size > 0 && !bali_is_control(character)) {
            bali_text_add(text, bytes + i, size);
            i += size;
            continue;
        }
        for (size_t end = i + (size ? size : 1); i < end; i++) bali_text_printf(text, "\\x%02X", (unsigned)(unsigned char)bytes[i]);
    }
}

static void begin_line(bali_text *text, size_t indent) {
    while (text->length > 0 && text->bytes[text->length - 1] == ' ') text->bytes[--text->length] = '\0';
    bali_text_putc(text, '\n');
    for (size_t i = 0; i < indent; i++) bali_text_putc(text, ' ');
}

void bali_text_put_wrapped(bali_text *text, const char *words, size_t indent, size_t column) {
    enum { WIDTH = 79 };
    while (*words && !text->failed) {
        size_t bytes = strcspn(words, " \n"), width = bali_utf8_count(words, bytes);
        if (column + width > WIDTH && column > indent) {
            begin_line(text, indent);
            column = indent;
        }
        bali_text_add(text, words, bytes);
        column += width;
        words += bytes;
        if (*words == '\n') {
            begin_line(text, indent);
            column = indent;
        } else if (*words == ' ' && column < WIDTH) {
            bali_text_putc(text, ' ');
            column++;
        }
        words += *words != '\0';
    }
    begin_line(text, 0);
}

void bali_text_clear(bali_text *text) {
    text->length = 0;
    text->failed = false;
    if (text->bytes) text->bytes[0] = '\0';
}

void bali_text_free(bali_text *text) {
    bali_free(text->bytes);
    *text = (bali_text){0};
}

const char *bali_text_string(const bali_text *text) {
    return text->bytes ? text->bytes : "";
}

size_t bali_utf8_next(const char *bytes, size_t length, uint32_t *character) {
    if (length == 0) return 0;
    const unsigned char *b = (const unsigned char *)bytes;
    if (b[0] < 0x80) {
        *character = b[0];
        return 1;
    }
    size_t size = b[0] >= 0xF0 ? 4 : b[0] >= 0xE0 ? 3 : 2;
    if (b[0] < 0xC2 || b[0] > 0xF4 || length < size) return 0;
    uint32_t value = b[0] & (0xFFu >> (size + 1));
    for (size_t i = 1; i < size; i++) {
        if ((b[i] & 0xC0) != 0x80) return 0;
        value = value << 6 | (b[i] & 0x3Fu);
    }
    static const uint32_t least[] = {0, 0, 0x80, 0x800, 0x10000};
    if (value < least[size] || value > 0x10FFFF || (value >= 0xD800 && value <= 0xDFFF)) return 0;
    *character = value;
    return size;
}

size_t bali_utf8_check(const char *bytes, size_t length) {
    size_t i = 0;
    while (i < length) {
        uint32_t character;
        size_t size = bali_utf8_next(bytes + i, length - i, &character);
        if (size == 0) return i;
        i += size;
    }
    return length;
}

size_t bali_utf8_count(const char *bytes, size_t length) {
    size_t count = 0;
    for (size_t i = 0; i < length; count++) {
        uint32_t character;
        size_t size = bali_utf8_next(bytes + i, length - i, &character);
        i += size ? size : 1;
    }
    return count;
}

bool bali_is_control(uint32_t c) {
    return c < 0x20 || (c >= 0x7F && c <= 0x9F) || c == 0x2028 || c == 0x2029 || c == 0x061C || c == 0x200E || c == 0x200F ||
           (c >= 0x202A && c <= 0x202E) || (c >= 0x2066 && c <= 0x2069) || c == 0xFEFF;
}
