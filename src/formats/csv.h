/* CSV as cells with their line and column, without any meaning.
 *
 * The first of the table reader's two seams: bytes -> cells (here) -> coded blocks (table_source.c). A faster scanner
 * may take the place of bali_csv_next on clean stretches of a file as long as whatever it does not know - quotes, odd
 * bytes, blanks, an unknown text - is left to this one, which checks everything and knows where it stands. */
#ifndef FORMATS_CSV_H
#define FORMATS_CSV_H

#include "ballast/formats.h"

#define BALI_CSV_CELL_LIMIT ((size_t)1 << 20) /* bytes of one cell */
#define BALI_CSV_CHUNK_BYTES ((size_t)1 << 18) /* read at a time */
#define BALI_CSV_READABLE 8 /* bytes that may be read from the start of any cell's last eight-byte word on */

/** A CSV file that is read cell by cell. Its memory does not depend on the file's size. */
typedef struct bali_csv bali_csv;

typedef struct bali_csv_options {
    char delimiter;     /* 0 = tab for .tsv or a tab in the first line, else comma */
    bool redact;        /* messages show no byte of a cell */
    size_t chunk_bytes; /* read at a time; 0 = BALI_CSV_CHUNK_BYTES; tests use tiny ones */
} bali_csv_options;

/** One cell. text is borrowed until the next call, has no NUL behind it, and BALI_CSV_READABLE bytes may be read from any
 *  of its bytes on. Blanks around an unquoted cell are gone; a quoted one is what stood between the quotes. */
typedef struct bali_csv_cell {
    const char *text; /* NULL at the end of the file */
    size_t length;
    bool quoted;
    bool ends_record;
} bali_csv_cell;

/**
 * Opens a file ("-" is standard input), looks at its first line and skips a byte order mark.
 *
 * Fails:  IO; MEMORY; ARGUMENT "bad-delimiter"; SYNTAX when the first bytes are those of something else than CSV in
 *         UTF-8 (see csv_look.h).
 */
BAL_MUST_CHECK bal_status bali_csv_open(const char *path, const bali_csv_options *options, bali_csv **out,
                                        bal_error *err);

/**
 * The next cell. A record ends at LF, CRLF, CR or the end of the file; an empty line is a record of one empty cell.
 *
 * Fails:  SYNTAX with file, line and column: a quote out of place or never closed, a control character besides a
 *         tab, bytes that are not UTF-8, a cell longer than BALI_CSV_CELL_LIMIT; IO; DATA "changed-while-read"; MEMORY.
 *         After a failure the file can only be closed.
 * Cost:   linear in the bytes.
 * Source: RFC 4180 (2005), for the quotes.
 */
BAL_MUST_CHECK bal_status bali_csv_next(bali_csv *csv, bali_csv_cell *cell, bal_error *err);

/** Where the last cell begins: its line as an editor counts them, its column in characters, both one-based. */
void bali_csv_place(const bali_csv *csv, size_t *line, size_t *column);

/** The first line as it stands in the file (at most 64 KiB of it), without its end and a byte order mark. Borrowed until
 *  the first bali_csv_next. */
const char *bali_csv_first_line(const bali_csv *csv, size_t *length);

bool bali_csv_can_rewind(const bali_csv *csv);
/** Back to the first cell. Fails: IO where the medium is a pipe, MEMORY. */
BAL_MUST_CHECK bal_status bali_csv_rewind(bali_csv *csv, bal_error *err);

/** The size of a file that can be read from any byte on: a regular one that is not compressed; else 0. */
uint64_t bali_csv_seekable_size(const bali_csv *csv);
/**
 * Stands behind the first line end at or after the byte before from: at the first record that begins at or after it, as long as no
 * quote is open there. from > 0; lines count from 1 there. At the end of the file nothing is left to read.
 *
 * Fails: IO; DATA "changed-while-read"; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_csv_seek(bali_csv *csv, uint64_t from, bal_error *err);
/** Whether two readers stand on one file in one state. */
bool bali_csv_same_file(const bali_csv *a, const bali_csv *b);
/** The byte of such a file at which the next cell begins. */
uint64_t bali_csv_offset(const bali_csv *csv);

char bali_csv_delimiter(const bali_csv *csv);
/** The file's name as the user gave it; borrowed. */
const char *bali_csv_name(const bali_csv *csv);
/** Name, and once the whole file was read, its size and (up to 8 MiB) its SHA-256. */
void bali_csv_facts(const bali_csv *csv, bal_file_facts *facts);
void bali_csv_close(bali_csv *csv);

#endif
