#include "ballast/error.h"

#include "base/text.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

/* Adds bytes as they may be shown, without allocating; what does not fit is cut at a character's end. Returns the new
 * length, or size when something was cut; after that nothing more is added. */
static size_t put_visible(char *to, size_t size, size_t at, const char *from, size_t length) {
    if (at >= size) return at;
    for (size_t i = 0; i < length;) {
        uint32_t character;
        size_t bytes = bali_utf8_next(from + i, length - i, &character);
        char escaped[4 * 4 + 1];
        const char *shown = from + i;
        size_t shown_length = bytes;
        if (bytes == 0 || bali_is_control(character)) {
            bytes = bytes ? bytes : 1;
            for (size_t b = 0; b < bytes; b++) (void)snprintf(escaped + 4 * b, 5, "\\x%02X", (unsigned)(unsigned char)from[i + b]);
            shown = escaped;
            shown_length = 4 * bytes;
        }
        if (shown_length >= size - at) {
            to[at] = '\0';
            return size;
        }
        memcpy(to + at, shown, shown_length);
        at += shown_length;
        i += bytes;
    }
    to[at] = '\0';
    return at;
}

/* Copies text into a field of an error, cut at a character's end. The text is kept as it is; it is made visible when
 * it is written. */
static void fill(char *field, size_t size, const char *text) {
    size_t length = strlen(text);
    if (length >= size) {
        length = size - 1;
        /* A character has at most three bytes behind its first; what has more is none, and is cut anywhere. */
        size_t least = length - 3;
        while (length > least && ((unsigned char)text[length] & 0xC0) == 0x80) length--;
    }
    memcpy(field, text, length);
    field[length] = '\0';
}

bal_status bal_error_set(bal_error *err, bal_status status, const char *code, const char *format, ...) {
    if (!err) return status;
    if (err->status != BAL_OK) return err->status;
    err->status = status;
    err->code = code;
    char message[2 * sizeof err->message];
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(message, sizeof message, format, arguments);
    va_end(arguments);
    if (length < 0) message[0] = '\0';
    (void)put_visible(err->message, sizeof err->message, 0, message, strlen(message));
    return status;
}

void bal_error_place(bal_error *err, const char *file, size_t line, size_t column) {
    if (!err) return;
    if (file && err->file[0] == '\0') fill(err->file, sizeof err->file, file);
    if (err->line == 0) {
        err->line = line;
        if (err->column == 0) err->column = column;
    }
}

void bal_error_context(bal_error *err, size_t record, const char *variable) {
    if (!err) return;
    if (err->record == 0) err->record = record;
    if (variable && err->variable[0] == '\0') fill(err->variable, sizeof err->variable, variable);
}

/* The same for numbers and words of our own. */
static size_t put_format(char *to, size_t size, size_t at, const char *format, ...) BAL_FORMAT(4, 5);
static size_t put_format(char *to, size_t size, size_t at, const char *format, ...) {
    char text[128];
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);
    return length < 0 ? at : put_visible(to, size, at, text, strlen(text));
}

void bal_error_text(const bal_error *err, char *text, size_t size) {
    if (size == 0) return;
    size_t at = put_visible(text, size, 0, err->file, strlen(err->file));
    if (err->line > 0) at = put_format(text, size, at, at > 0 ? ":%zu" : "line %zu", err->line);
    if (err->line > 0 && err->column > 0) at = put_format(text, size, at, ":%zu", err->column);
    if (at > 0) at = put_format(text, size, at, ": ");
    at = put_visible(text, size, at, err->message, strlen(err->message));
    if (err->code) (void)put_format(text, size, at, " [%s]", err->code);
}
