#include "formats/csv_buffer.h"

#include "base/memory.h"
#include "base/text.h"

#include <string.h>

enum { LARGEST_HASHED = 8 << 20, FIRST_ROOM = 4096 };

size_t bali_csv_column(const bali_csv_line *line, const char *at) {
    return line->before + bali_utf8_count(line->start, (size_t)(at - line->start)) + 1;
}

bal_status bali_csv_error_at(const bali_csv_buffer *buffer, const char *at, bal_error *err) {
    bal_error_place(err, bali_input_name(buffer->input), buffer->line.number, bali_csv_column(&buffer->line, at));
    return err ? err->status : BAL_ERR_SYNTAX;
}

bal_status bali_csv_error_at_cell(const bali_csv_buffer *buffer, bal_error *err) {
    const bali_csv_line *line = &buffer->cell_line;
    bal_error_place(err, bali_input_name(buffer->input), line->number, bali_csv_column(line, buffer->cell));
    return err ? err->status : BAL_ERR_SYNTAX;
}

bal_status bali_csv_cell_too_long(const bali_csv_buffer *buffer, bool quoted, bal_error *err) {
    if (quoted)
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "unclosed-quote",
                            "the quote that opens here is not closed within 1 MiB, the most a cell may hold; close it, "
                            "or double a quote that belongs to the text");
    else
        (void)bal_error_set(err, BAL_ERR_SYNTAX, "cell-too-long",
                            "the cell that begins here is longer than 1 MiB; shorten it");
    return bali_csv_error_at_cell(buffer, err);
}

/* Stands at the input's first byte, with nothing at hand. */
static void start(bali_csv_buffer *buffer) {
    buffer->cell = buffer->at = buffer->end = buffer->memory + buffer->room;
    buffer->line = buffer->cell_line = (bali_csv_line){.start = buffer->at, .number = 1};
    buffer->exhausted = false;
}

/* The base name, cut at a character's end. */
static void take_name(bali_csv_buffer *buffer) {
    const char *name = bali_input_base_name(buffer->input);
    size_t length = strlen(name), most = sizeof buffer->facts.name - 1;
    if (length > most)
        for (length = most; length > 0 && ((unsigned char)name[length] & 0xC0) == 0x80;) length--;
    memcpy(buffer->facts.name, name, length);
}

/* The bytes of the file as they are on disk. */
static void add_to_hash(void *context, const char *bytes, size_t length) {
    bali_csv_buffer *buffer = context;
    if (!buffer->hash) return;
    if (bali_input_position(buffer->input) <= LARGEST_HASHED) {
        bali_hash_add(buffer->hash, bytes, length);
        return;
    }
    bali_hash_free(buffer->hash);
    buffer->hash = NULL;
}

bal_status bali_csv_buffer_open(bali_csv_buffer *buffer, const char *path, size_t chunk_bytes, bal_error *err) {
    bal_status status = bali_input_open(path, &buffer->input, err);
    if (status == BAL_OK) status = bali_gzip_create(buffer->input, (bali_gzip_watch){add_to_hash, buffer}, &buffer->bytes, err);
    if (status != BAL_OK) return status;
    take_name(buffer);
    buffer->chunk = chunk_bytes;
    buffer->room = chunk_bytes < FIRST_ROOM ? chunk_bytes : FIRST_ROOM;
    buffer->memory = bali_allocate(buffer->room + buffer->chunk + BALI_CSV_READABLE, 1);
    bool hashed = bali_input_size(buffer->input) <= LARGEST_HASHED;
    if (hashed) buffer->hash = bali_hash_create();
    if (!buffer->memory || (hashed && !buffer->hash)) return bali_out_of_memory(err);
    start(buffer);
    return BAL_OK;
}

bal_status bali_csv_buffer_rewind(bali_csv_buffer *buffer, bal_error *err) {
    bal_status status = bali_gzip_rewind(buffer->bytes, err);
    if (status != BAL_OK) return status;
    if (buffer->hash) { /* the first pass was not finished: hash from the start */
        char unused[BALI_HASH_TEXT];
        bali_hash_take(buffer->hash, unused);
    }
    start(buffer);
    return BAL_OK;
}

bal_status bali_csv_buffer_seek(bali_csv_buffer *buffer, uint64_t position, bal_error *err) {
    bal_status status = bali_gzip_seek(buffer->bytes, position, err);
    bali_hash_free(buffer->hash);
    buffer->hash = NULL;
    if (status == BAL_OK) start(buffer);
    return status;
}

uint64_t bali_csv_buffer_position(const bali_csv_buffer *buffer) {
    return bali_input_position(buffer->input) - (uint64_t)(buffer->end - buffer->at);
}

void bali_csv_buffer_close(bali_csv_buffer *buffer) {
    bali_gzip_free(buffer->bytes);
    bali_input_close(buffer->input);
    bali_hash_free(buffer->hash);
    bali_free(buffer->memory);
}

/* Keeps columns right when the bytes before the cell are let go. */
static void forget_before(bali_csv_line *line, const char *cell) {
    if (line->start >= cell) return;
    line->before += bali_utf8_count(line->start, (size_t)(cell - line->start));
    line->start = cell;
}

/* Moves the bytes from the cell on to stand before the chunk, into larger memory where that is needed. */
static bal_status keep_cell(bali_csv_buffer *buffer, bal_error *err) {
    size_t kept = (size_t)(buffer->end - buffer->cell), room = buffer->room;
    char *memory = buffer->memory;
    while (room < kept) room *= 2;
    if (room != buffer->room) memory = bali_allocate(room + buffer->chunk + BALI_CSV_READABLE, 1);
    if (!memory) return bali_out_of_memory(err);
    forget_before(&buffer->line, buffer->cell);
    forget_before(&buffer->cell_line, buffer->cell);
    char *cell = memory + room - kept;
    memmove(cell, buffer->cell, kept);
    buffer->line.start = cell + (buffer->line.start - buffer->cell);
    buffer->cell_line.start = cell + (buffer->cell_line.start - buffer->cell);
    if (memory != buffer->memory) bali_free(buffer->memory);
    buffer->memory = memory;
    buffer->room = room;
    buffer->cell = buffer->at = cell;
    buffer->end = cell + kept;
    return BAL_OK;
}

/* The whole file was read. */
static void take_facts(bali_csv_buffer *buffer) {
    buffer->facts.bytes = bali_input_position(buffer->input);
    if (buffer->hash) bali_hash_take(buffer->hash, buffer->facts.sha256);
    bali_hash_free(buffer->hash);
    buffer->hash = NULL;
}

bal_status bali_csv_buffer_fill(bali_csv_buffer *buffer, const char **p, bool *more, bal_error *err) {
    *more = false;
    if (buffer->exhausted) return BAL_OK;
    size_t scanned = (size_t)(*p - buffer->cell), got;
    if ((size_t)(buffer->end - buffer->cell) > BALI_CSV_CELL_LIMIT + 2)
        return bali_csv_cell_too_long(buffer, *buffer->cell == '"', err);
    bal_status status = keep_cell(buffer, err);
    if (status != BAL_OK) return status;
    *p = buffer->cell + scanned;
    char *chunk = buffer->memory + buffer->room;
    status = bali_gzip_read(buffer->bytes, chunk, buffer->chunk, &got, err);
    if (status != BAL_OK) got = 0;
    memset(chunk + got, 0, BALI_CSV_READABLE);
    buffer->end = chunk + got;
    buffer->exhausted = status == BAL_OK && got < buffer->chunk;
    *more = got > 0;
    if (buffer->exhausted) take_facts(buffer);
    return status;
}

bal_status bali_csv_buffer_need(bali_csv_buffer *buffer, const char **p, size_t n, bal_error *err) {
    bal_status status = BAL_OK;
    bool more = true;
    while (status == BAL_OK && more && (size_t)(buffer->end - *p) < n)
        status = bali_csv_buffer_fill(buffer, p, &more, err);
    return status;
}
