/* Records of a table as codes, one after another; what is wrong with their cells is gathered.
 *
 * The second seam of the table reader (csv.h has the first): bali_table_read_record puts one record's codes at one place of
 * every wanted column. A faster scanner may do so for whole clean records straight from the bytes, and must leave to this
 * one every record with a cell that is not plainly one of the labels: so all checks and all messages stay in one place. */
#ifndef FORMATS_TABLE_READER_H
#define FORMATS_TABLE_READER_H

#include "base/text.h"
#include "formats/table_columns.h"
#include "formats/table_problems.h"

/* Where a cell stands that may prove an unknown label. */
typedef struct bali_table_suspect {
    size_t line, column;
} bali_table_suspect;

/** Start it with = {0}. */
typedef struct bali_table_reader {
    bali_csv *csv;
    const bal_domain *domain;
    bal_notices notices;
    bal_missing policy;
    bool redact;
    bali_column_rules rules;
    bali_table_header header;
    bali_table_columns columns;
    bali_problems problems;
    bal_error failure; /* what ended the reading early */

    uint64_t place;      /* records read */
    uint64_t incomplete; /* those in which a wanted cell is missing */
    uint64_t *missing;   /* one a variable */
    bool ended;          /* there is no further record */

    /* The record being read. */
    size_t record_line;
    size_t n; /* where its codes go */
    bool has_missing, is_comment;
    double weight;        /* 1 without a column of weights */
    bool weight_is_name;  /* its text is the name of the column: a bad weight, unless the record is a second header */
    bali_table_suspect weight_at;
    bali_text group;      /* its label in the fold column */
    bool alike;                                   /* every wanted cell so far is the name of its column */
    bali_table_suspect suspects[BALI_MOST_TOLD];  /* the first of those that are no outcomes */
    size_t n_suspects;

    /* Empty lines that may turn out to stand between records. In a table of one column each is a missing cell. */
    size_t blank_lines, blank_line;
    bali_csv_cell held; /* the cell behind them */
} bali_table_reader;

/** Opens a table and reads its header. domain is borrowed. Fails: as bal_table_open. */
BAL_MUST_CHECK bal_status bali_table_reader_open(bali_table_reader *reader, const bal_domain *domain, const char *path,
                                                 const bal_table_options *options, bal_error *err);

/**
 * Reads one record; its codes go to place n of the columns. reader->ended says that there was none, reader->has_missing
 * that a wanted cell is missing. An unknown label is no failure here: reader->problems holds it.
 *
 * Fails:  as bali_csv_next; SYNTAX "ragged-record", "blank-line", "comment-line"; all in reader->failure.
 */
BAL_MUST_CHECK bal_status bali_table_read_record(bali_table_reader *reader, size_t n);

/** Back to the first record. Fails: as bali_csv_rewind, in reader->failure. */
BAL_MUST_CHECK bal_status bali_table_reader_rewind(bali_table_reader *reader);
/** The record at a place, from 1, and the line on which it begins, found by reading the file once more beside the pass. What cannot be
 *  found is 0. */
void bali_table_reader_find(const bali_table_reader *reader, const char *path, uint64_t place, size_t *record, size_t *line);
void bali_table_reader_close(bali_table_reader *reader);

#endif
