#include "base/csv_writer.h"

#include <string.h>

static bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

/* Whether a reader that trims unquoted cells, and takes an empty one for missing, would read something else. */
static bool needs_quotes(const char *cell, size_t length, char delimiter) {
    if (length == 0 || is_blank(cell[0]) || is_blank(cell[length - 1])) return true;
    for (size_t i = 0; i < length; i++)
        if (cell[i] == delimiter || cell[i] == '"' || cell[i] == '\n' || cell[i] == '\r') return true;
    return false;
}

void bali_csv_put(bali_text *text, const char *cell, size_t length, char delimiter) {
    if (!needs_quotes(cell, length, delimiter)) {
        bali_text_add(text, cell, length);
        return;
    }
    bali_text_putc(text, '"');
    for (size_t start = 0; start < length;) {
        const char *quote = memchr(cell + start, '"', length - start);
        size_t end = quote ? (size_t)(quote - cell) + 1 : length;
        bali_text_add(text, cell + start, end - start);
        if (quote) bali_text_putc(text, '"');
        start = end;
    }
    bali_text_putc(text, '"');
}
