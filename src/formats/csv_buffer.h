/* The bytes of a CSV file as a window that moves over it and always holds the unfinished cell whole.
 *
 * The memory is [ ... room | chunk ]: every read fills the chunk, so that reads stay aligned in the file, and what is
 * there of the unfinished cell is moved to stand just before it. Invariants: cell <= at <= end; *end is a NUL that belongs
 * to nobody, so that scanning needs no check of bounds; the bytes from cell to end are those of the file, never edited. */
#ifndef FORMATS_CSV_BUFFER_H
#define FORMATS_CSV_BUFFER_H

#include "base/files.h"
#include "base/gzip.h"
#include "base/hash.h"
#include "formats/csv.h"

/* A line: its number, its first byte that is still at hand, and the characters before that. */
typedef struct bali_csv_line {
    const char *start;
    size_t number, before;
} bali_csv_line;

typedef struct bali_csv_buffer {
    bali_input *input;
    bali_gzip *bytes;      /* of the input, decompressed */
    char *memory;
    size_t room, chunk;
    bool exhausted;        /* there are no more bytes */
    const char *cell;      /* the first byte that is kept */
    const char *at, *end;  /* what is not yet read, and the end of what is at hand */
    bali_csv_line line;      /* the one in which at stands */
    bali_csv_line cell_line; /* the one in which the cell begins */
    bali_hash *hash;         /* of the file as it is on disk; NULL once the file is too large or was hashed */
    bal_file_facts facts;
} bali_csv_buffer;

/** Opens a file; the buffer, which begins as {0}, is empty and stands at its start. Fails: IO, MEMORY. */
BAL_MUST_CHECK bal_status bali_csv_buffer_open(bali_csv_buffer *buffer, const char *path, size_t chunk_bytes,
                                               bal_error *err);
BAL_MUST_CHECK bal_status bali_csv_buffer_rewind(bali_csv_buffer *buffer, bal_error *err);
/**
 * Stands at a byte of a file that is not compressed, with nothing at hand and lines counted from 1. The file is no longer hashed.
 * Fails: IO.
 */
BAL_MUST_CHECK bal_status bali_csv_buffer_seek(bali_csv_buffer *buffer, uint64_t position, bal_error *err);
/** Where in such a file the byte at hand stands. */
uint64_t bali_csv_buffer_position(const bali_csv_buffer *buffer);
void bali_csv_buffer_close(bali_csv_buffer *buffer);

/**
 * Reads the next chunk behind the bytes from the cell on. *p, which stands among those, moves with them; *more says
 * whether anything came.
 *
 * Fails:  SYNTAX when the cell is longer than BALI_CSV_CELL_LIMIT, "bad-gzip"; IO; DATA "changed-while-read", "gzip-ratio"; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_csv_buffer_fill(bali_csv_buffer *buffer, const char **p, bool *more, bal_error *err);
/** Makes sure that n bytes stand at *p unless the file ends before. */
BAL_MUST_CHECK bal_status bali_csv_buffer_need(bali_csv_buffer *buffer, const char **p, size_t n, bal_error *err);

/** The column of a byte of a line: one-based, in characters, of which a tab is one. */
size_t bali_csv_column(const bali_csv_line *line, const char *at);

/** Places an error at a byte of the line being read, or at the cell's start. Returns the error's status. */
bal_status bali_csv_error_at(const bali_csv_buffer *buffer, const char *at, bal_error *err);
bal_status bali_csv_error_at_cell(const bali_csv_buffer *buffer, bal_error *err);
/** The refusal of a cell beyond the limit. */
bal_status bali_csv_cell_too_long(const bali_csv_buffer *buffer, bool quoted, bal_error *err);

#endif
