/* The grammar of RFC 4180 over the window of csv_buffer.h. */
#include "formats/csv.h"

#include "base/memory.h"
#include "base/text.h"
#include "formats/csv_buffer.h"
#include "formats/csv_look.h"

#include <string.h>

enum { LONGEST_FIRST_LINE = 1 << 16, LONGEST_SIGNATURE = 16 };

/* What a byte may mean. */
enum { PLAIN, DELIMITER, LINE_END, QUOTE, HIGH, CONTROL };

struct bali_csv {
    bali_csv_buffer buffer;
    char delimiter;
    bool redact;
    bool cell_expected; /* a delimiter came last: a cell follows, be it at the very end */
    unsigned char kinds[256];
    uint64_t delimiters; /* the delimiter in each of eight bytes */
    bali_text unquoted; /* the text of a cell with doubled quotes */
    size_t first_line;
};

static unsigned char kind_at(const bali_csv *csv, const char *p) {
    return csv->kinds[(unsigned char)*p];
}

/* Eight bytes, the first in the lowest place; compilers make it one load where the machine does so too. */
static uint64_t word_at(const char *p) {
    const unsigned char *b = (const unsigned char *)p;
    return (uint64_t)b[0] | (uint64_t)b[1] << 8 | (uint64_t)b[2] << 16 | (uint64_t)b[3] << 24 | (uint64_t)b[4] << 32 |
           (uint64_t)b[5] << 40 | (uint64_t)b[6] << 48 | (uint64_t)b[7] << 56;
}

/* How many of the eight bytes at p come before the first that may not be plain. The highest bit of a byte of hits is set
 * where the byte is at least 0x80, or below 0x20, or equal to one of three; a borrow makes it wrong only above a right
 * one. */
static size_t plain_bytes(const bali_csv *csv, const char *p) {
    const uint64_t ones = 0x0101010101010101u, highs = ones << 7;
    uint64_t word = word_at(p), quote = word ^ ones * '"', delete = word ^ ones * 0x7F;
    uint64_t delimiter = word ^ csv->delimiters;
    uint64_t below = (word - ones * 0x20) | (quote - ones) | (delete - ones) | (delimiter - ones);
    uint64_t hits = (below | word) & highs;
    return hits ? (size_t)__builtin_ctzll(hits) / 8 : 8;
}

static bal_status bad_control(const bali_csv *csv, const char *at, uint32_t character, bal_error *err) {
    if (character == 0)
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "control-character",
                            "a NUL byte (0x00); a table is text: remove it, or save the table as CSV in UTF-8");
    else
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "control-character", "control character U+%04X; remove it",
                            (unsigned)character);
    return bali_csv_error_at(&csv->buffer, at, err);
}

static bal_status bad_utf8(const bali_csv *csv, const char *at, bal_error *err) {
    char hex[4 * 5 + sizeof " are"];
    size_t left = (size_t)(csv->buffer.end - at), n = 1;
    while (n < 4 && n < left && ((unsigned char)at[n] & 0xC0) == 0x80) n++;
    for (size_t i = 0; i < n; i++) {
        static const char digits[] = "0123456789ABCDEF";
        unsigned byte = (unsigned char)at[i];
        const char shown[5] = {' ', '0', 'x', digits[byte >> 4], digits[byte & 15]};
        memcpy(hex + 5 * i, shown, 5);
    }
    memcpy(hex + 5 * n, n == 1 ? " is" : " are", n == 1 ? 4 : 5);
    (void)bal_error_set(err, BAL_ERR_SYNTAX, "bad-utf8",
                        "%s%s not UTF-8%s; convert the file, such as with iconv -f WINDOWS-1252 -t UTF-8",
                        csv->redact ? "a character" : n == 1 ? "byte" : "bytes", csv->redact ? " is" : hex,
                        left == n ? ": the file ends inside a character" : "");
    return bali_csv_error_at(&csv->buffer, at, err);
}

/* Steps over one character beyond ASCII. */
static bal_status step_high(bali_csv *csv, const char **p, bal_error *err) {
    uint32_t character = 0;
    size_t bytes = bali_utf8_next(*p, (size_t)(csv->buffer.end - *p), &character);
    if (bytes == 0) {
        bal_status status = bali_csv_buffer_need(&csv->buffer, p, 4, err);
        if (status != BAL_OK) return status;
        bytes = bali_utf8_next(*p, (size_t)(csv->buffer.end - *p), &character);
    }
    if (bytes == 0) return bad_utf8(csv, *p, err);
    if (character < 0xA0) return bad_control(csv, *p, character, err);
    *p += bytes;
    return BAL_OK;
}

/* Steps over LF, CRLF or CR. */
static bal_status step_line_end(bali_csv *csv, const char **p, bal_error *err) {
    if (**p == '\r') {
        bal_status status = bali_csv_buffer_need(&csv->buffer, p, 2, err);
        if (status != BAL_OK) return status;
        if ((*p)[1] == '\n') ++*p;
    }
    csv->buffer.line = (bali_csv_line){.start = ++*p, .number = csv->buffer.line.number + 1};
    return BAL_OK;
}

/* The cell's text ended at p: steps over what separates it from the next. */
static bal_status end_cell(bali_csv *csv, const char *p, bali_csv_cell *cell, bal_error *err) {
    csv->cell_expected = kind_at(csv, p) == DELIMITER;
    cell->ends_record = !csv->cell_expected;
    bal_status status = BAL_OK;
    if (csv->cell_expected) p++;
    else if (p != csv->buffer.end) status = step_line_end(csv, &p, err);
    csv->buffer.at = p;
    return status;
}

static bal_status quote_inside(const bali_csv *csv, const char *at, bal_error *err) {
    const char *begin = csv->buffer.cell;
    if (at - begin == 3 && memcmp(begin, "\xEF\xBB\xBF", 3) == 0)
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "misplaced-quote",
                            "a byte order mark stands before this quote, as where files were joined; remove it, and a "
                            "second header");
    else if (begin + strspn(begin, " \t") == at)
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "misplaced-quote",
                            "a quote behind blanks; remove the blanks, or quote the whole cell and double the quotes in it");
    else
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "misplaced-quote",
                            "a quote inside a cell that is not quoted; quote the whole cell and double the quote");
    return bali_csv_error_at(&csv->buffer, at, err);
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

static bal_status read_unquoted(bali_csv *csv, bali_csv_cell *cell, bal_error *err) {
    const char *p = csv->buffer.at;
    bal_status status = BAL_OK;
    for (bool more = true; more;) {
        size_t plain = plain_bytes(csv, p);
        p += plain;
        if (plain == 8) continue;
        unsigned char kind = kind_at(csv, p);
        if (kind == DELIMITER || kind == LINE_END) break;
        if (kind == QUOTE) return quote_inside(csv, p, err);
        if (kind == PLAIN) p++;
        else if (kind == HIGH) status = step_high(csv, &p, err);
        else if (p == csv->buffer.end) status = bali_csv_buffer_fill(&csv->buffer, &p, &more, err);
        else return bad_control(csv, p, (unsigned char)*p, err);
        if (status != BAL_OK) return status;
    }
    size_t begin = 0, end = (size_t)(p - csv->buffer.cell);
    if (end > BALI_CSV_CELL_LIMIT) return bali_csv_cell_too_long(&csv->buffer, false, err);
    status = end_cell(csv, p, cell, err);
    while (begin < end && is_blank(csv->buffer.cell[begin])) begin++;
    while (end > begin && is_blank(csv->buffer.cell[end - 1])) end--;
    cell->text = csv->buffer.cell + begin;
    cell->length = end - begin;
    return status;
}

static bal_status never_closed(const bali_csv *csv, bal_error *err) {
    (void)bal_error_set(err, BAL_ERR_SYNTAX, "unclosed-quote",
                        "the quote that opens here is never closed; close it, or double a quote that belongs to the text");
    return bali_csv_error_at_cell(&csv->buffer, err);
}

/* Finds the quote that closes a cell; *doubled says whether quotes inside are doubled. */
static bal_status find_closing_quote(bali_csv *csv, const char **p, bool *doubled, bal_error *err) {
    *doubled = false;
    for (bool more = true; more;) {
        bal_status status = BAL_OK;
        unsigned char kind;
        while ((kind = kind_at(csv, *p)) <= DELIMITER) ++*p;
        if (kind == QUOTE) {
            status = bali_csv_buffer_need(&csv->buffer, p, 2, err);
            if (status != BAL_OK || (*p)[1] != '"') return status;
            *doubled = true;
            *p += 2;
        } else if (kind == LINE_END) {
            status = step_line_end(csv, p, err);
        } else if (kind == HIGH) {
            status = step_high(csv, p, err);
        } else if (*p == csv->buffer.end) {
            status = bali_csv_buffer_fill(&csv->buffer, p, &more, err);
        } else {
            return bad_control(csv, *p, (unsigned char)**p, err);
        }
        if (status != BAL_OK) return status;
    }
    return never_closed(csv, err);
}

static bal_status text_after_quote(const bali_csv *csv, const char *at, bal_error *err) {
    size_t line, column;
    bali_csv_place(csv, &line, &column);
    (void)bal_error_set(err, BAL_ERR_SYNTAX, "misplaced-quote",
                        "%s behind the quote that closes the cell begun at %zu:%zu; %sdouble the quote if it belongs to "
                        "the text",
                        is_blank(*at) ? "a blank" : "more text", line, column,
                        is_blank(*at) ? "remove the blank, or " : "");
    return bali_csv_error_at(&csv->buffer, at, err);
}

/* Copies a text with every doubled quote made one. */
static bal_status undouble(bali_csv *csv, bali_csv_cell *cell, bal_error *err) {
    bali_text_clear(&csv->unquoted);
    for (const char *from = cell->text, *end = from + cell->length; from < end;) {
        const char *quote = memchr(from, '"', (size_t)(end - from));
        const char *stop = quote ? quote + 1 : end;
        bali_text_add(&csv->unquoted, from, (size_t)(stop - from));
        from = quote ? quote + 2 : end;
    }
    size_t length = csv->unquoted.length;
    bali_text_add(&csv->unquoted, "\0\0\0\0\0\0\0", BALI_CSV_READABLE - 1);
    if (csv->unquoted.failed) return bali_out_of_memory(err);
    cell->text = csv->unquoted.bytes;
    cell->length = length;
    return BAL_OK;
}

static bal_status read_quoted(bali_csv *csv, bali_csv_cell *cell, bal_error *err) {
    const char *p = csv->buffer.at + 1;
    bool doubled;
    bal_status status = find_closing_quote(csv, &p, &doubled, err);
    if (status != BAL_OK) return status;
    cell->length = (size_t)(p - csv->buffer.cell) - 1;
    if (cell->length > BALI_CSV_CELL_LIMIT) return bali_csv_cell_too_long(&csv->buffer, true, err);
    p++;
    unsigned char kind = kind_at(csv, p);
    if (p != csv->buffer.end && kind != DELIMITER && kind != LINE_END) return text_after_quote(csv, p, err);
    status = end_cell(csv, p, cell, err);
    cell->text = csv->buffer.cell + 1;
    cell->quoted = true;
    return status == BAL_OK && doubled ? undouble(csv, cell, err) : status;
}

bal_status bali_csv_next(bali_csv *csv, bali_csv_cell *cell, bal_error *err) {
    *cell = (bali_csv_cell){0};
    csv->buffer.cell = csv->buffer.at;
    csv->buffer.cell_line = csv->buffer.line;
    if (csv->buffer.at == csv->buffer.end) {
        bal_status status = bali_csv_buffer_need(&csv->buffer, &csv->buffer.at, 1, err);
        if (status != BAL_OK || (csv->buffer.at == csv->buffer.end && !csv->cell_expected)) return status;
    }
    return *csv->buffer.at == '"' ? read_quoted(csv, cell, err) : read_unquoted(csv, cell, err);
}

void bali_csv_place(const bali_csv *csv, size_t *line, size_t *column) {
    *line = csv->buffer.cell_line.number;
    *column = bali_csv_column(&csv->buffer.cell_line, csv->buffer.cell);
}

/* Measures the first line and makes sure that whatever tells a file's kind is at hand. */
static bal_status look_at_start(bali_csv *csv, bal_error *err) {
    bali_csv_buffer *buffer = &csv->buffer;
    bool complete = false;
    bal_status status = bali_csv_buffer_need(buffer, &buffer->at, LONGEST_SIGNATURE, err);
    for (;;) {
        size_t length = (size_t)(buffer->end - buffer->at), most = LONGEST_FIRST_LINE;
        csv->first_line = bali_csv_line_length(buffer->at, length < most ? length : most, &complete);
        if (status != BAL_OK || complete || buffer->exhausted || length >= LONGEST_FIRST_LINE) return status;
        status = bali_csv_buffer_need(buffer, &buffer->at, length + 1, err);
    }
}

/* Stands at the first cell, behind a byte order mark. */
static bal_status start(bali_csv *csv, bal_error *err) {
    bali_csv_buffer *buffer = &csv->buffer;
    csv->cell_expected = false;
    bal_status status = look_at_start(csv, err);
    if (status != BAL_OK || buffer->end - buffer->at < 3 || memcmp(buffer->at, "\xEF\xBB\xBF", 3) != 0) return status;
    buffer->at += 3;
    buffer->cell = buffer->line.start = buffer->cell_line.start = buffer->at;
    csv->first_line -= 3;
    return BAL_OK;
}

static void set_kinds(bali_csv *csv) {
    for (unsigned c = 0; c < 256; c++) csv->kinds[c] = c >= 0x80 ? HIGH : c < 0x20 || c == 0x7F ? CONTROL : PLAIN;
    csv->kinds['\t'] = PLAIN;
    csv->kinds['\n'] = csv->kinds['\r'] = LINE_END;
    csv->kinds['"'] = QUOTE;
    csv->kinds[(unsigned char)csv->delimiter] = DELIMITER;
    csv->delimiters = 0x0101010101010101u * (unsigned char)csv->delimiter;
}

static bool may_delimit(char c) {
    bool letter_or_digit = (c >= '0' && c <= '9') || (c >= 'A' && c <= 'Z') || (c >= 'a' && c <= 'z');
    return c == '\t' || (c > ' ' && c < 0x7F && c != '"' && !letter_or_digit);
}

static bal_status create(bali_csv *csv, const char *path, const bali_csv_options *options, bal_error *err) {
    bali_csv_buffer *buffer = &csv->buffer;
    size_t chunk_bytes = options->chunk_bytes ? options->chunk_bytes : BALI_CSV_CHUNK_BYTES;
    csv->redact = options->redact;
    bal_status status = bali_csv_buffer_open(buffer, path, chunk_bytes, err);
    if (status == BAL_OK) status = start(csv, err);
    if (status != BAL_OK) return status;
    status = bali_csv_look(buffer->at, (size_t)(buffer->end - buffer->at), err);
    if (status != BAL_OK) bal_error_place(err, bali_input_name(buffer->input), 1, 1);
    csv->delimiter = options->delimiter;
    if (!csv->delimiter) csv->delimiter = bali_csv_guess_delimiter(path, buffer->at, csv->first_line);
    set_kinds(csv);
    return status;
}

bal_status bali_csv_open(const char *path, const bali_csv_options *options, bali_csv **out, bal_error *err) {
    *out = NULL;
    if (options->delimiter && !may_delimit(options->delimiter))
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-delimiter",
                             "\"%c\" cannot be a delimiter; take a punctuation mark, such as a comma or semicolon, or a tab",
                             options->delimiter);
    bali_csv *csv = bali_allocate(1, sizeof *csv);
    if (!csv) return bali_out_of_memory(err);
    bal_status status = create(csv, path, options, err);
    if (status == BAL_OK) *out = csv;
    else bali_csv_close(csv);
    return status;
}

const char *bali_csv_first_line(const bali_csv *csv, size_t *length) {
    *length = csv->first_line;
    return csv->buffer.at;
}

bool bali_csv_can_rewind(const bali_csv *csv) {
    return bali_input_can_rewind(csv->buffer.input);
}

bal_status bali_csv_rewind(bali_csv *csv, bal_error *err) {
    bal_status status = bali_csv_buffer_rewind(&csv->buffer, err);
    return status == BAL_OK ? start(csv, err) : status;
}

uint64_t bali_csv_seekable_size(const bali_csv *csv) {
    bool can = bali_csv_can_rewind(csv) && !bali_gzip_is_packed(csv->buffer.bytes);
    return can ? bali_input_size(csv->buffer.input) : 0;
}

/* The window holds what comes after p, and a new line begins there. */
static void stand_at(bali_csv_buffer *buffer, const char *p) {
    buffer->at = buffer->cell = p;
    buffer->line = buffer->cell_line = (bali_csv_line){.start = p, .number = 1};
}

bal_status bali_csv_seek(bali_csv *csv, uint64_t from, bal_error *err) {
    bali_csv_buffer *buffer = &csv->buffer;
    csv->cell_expected = false;
    bal_status status = bali_csv_buffer_seek(buffer, from - 1, err);
    for (bool more = true; status == BAL_OK && more;) {
        const char *p = buffer->at;
        while (p < buffer->end && *p != '\n' && *p != '\r') p++;
        stand_at(buffer, p);
        if (p == buffer->end) {
            status = bali_csv_buffer_fill(buffer, &buffer->at, &more, err);
            continue;
        }
        status = step_line_end(csv, &p, err);
        stand_at(buffer, p);
        break;
    }
    return status;
}

bool bali_csv_same_file(const bali_csv *a, const bali_csv *b) {
    return bali_input_same(a->buffer.input, b->buffer.input);
}

uint64_t bali_csv_offset(const bali_csv *csv) {
    return bali_csv_buffer_position(&csv->buffer);
}

char bali_csv_delimiter(const bali_csv *csv) {
    return csv->delimiter;
}

const char *bali_csv_name(const bali_csv *csv) {
    return bali_input_name(csv->buffer.input);
}

void bali_csv_facts(const bali_csv *csv, bal_file_facts *facts) {
    *facts = csv->buffer.facts;
}

void bali_csv_close(bali_csv *csv) {
    if (!csv) return;
    bali_csv_buffer_close(&csv->buffer);
    bali_text_free(&csv->unquoted);
    bali_free(csv);
}
