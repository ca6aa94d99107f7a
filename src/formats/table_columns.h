/* The wanted columns of a table, and the codes of their cells. */
#ifndef FORMATS_TABLE_COLUMNS_H
#define FORMATS_TABLE_COLUMNS_H

#include "base/numbers.h"
#include "formats/column_rules.h"
#include "formats/csv.h"
#include "formats/label_codes.h"
#include "formats/table_header.h"

/* What a cell is when it is none of the outcomes, of which there are fewer. Cut to one byte or two, BALI_MISSING is that
 * width's code of a missing cell. */
enum { BALI_MISSING = UINT16_MAX, BALI_UNKNOWN };

typedef struct bali_table_column {
    size_t variable;
    const char *name;    /* of the variable */
    const char *heading; /* of the column */
    size_t heading_length;
    bali_label_codes labels; /* the outcomes, unless there are cuts, and behind them the codebook's codes */
    const char **texts;      /* of those labels; borrowed */
    size_t n_outcomes;       /* how many of them are outcomes themselves */
    const size_t *outcomes;  /* of the codes behind them; borrowed from the codebook */
    size_t empty;            /* what the empty cell is: BALI_MISSING, or the outcome a codebook gives to it */
    const double *cuts;      /* of a column of numbers, else NULL; borrowed from the rules */
    size_t n_cuts;
    bool heading_unknown; /* its own heading is neither an outcome nor a spelling of a missing cell */
    bool contested;       /* an outcome is also a spelling of a missing cell */
    void *codes;          /* one a record of the block */
} bali_table_column;

/** Start it with = {0}. */
typedef struct bali_table_columns {
    bali_table_column *columns; /* the wanted ones, in the order of the table */
    size_t n_columns;
    bali_table_column **by_place; /* one a column of the table; NULL where it is not wanted */
    const void **by_variable;     /* the codes of each variable of the domain, or NULL: for bal_block */
    unsigned width;
    size_t capacity; /* records that a block may have */
    char **spellings; /* of a missing cell: NA and the caller's; an empty one is missing always */
    size_t n_spellings;
    bali_label_codes missing;
} bali_table_columns;

/**
 * rules  borrowed, as the header and what the options hold
 *
 * Fails:  ARGUMENT "other-network" when the codebook follows another domain; DATA "ambiguous-code" when it gives a number as code
 *         to a column of numbers; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_table_columns_create(bali_table_columns *columns, const bal_domain *domain, const bali_table_header *header,
                                                    const bali_column_rules *rules, const bal_table_options *options, bal_error *err);
void bali_table_columns_free(bali_table_columns *columns);

/** Whether a text, which stands in a cell, spells a missing one. */
static inline bool bali_table_columns_missing(const bali_table_columns *columns, const bali_csv_cell *cell) {
    return cell->length == 0 || bali_label_codes_find(&columns->missing, cell->text, cell->length) != BALI_NO_CODE;
}

/** The outcome of a cell, BALI_MISSING or BALI_UNKNOWN. An outcome wins over a spelling of a missing cell, and that over a number. */
static inline size_t bali_table_columns_code(const bali_table_columns *columns, const bali_table_column *column,
                                             const bali_csv_cell *cell) {
    if (cell->length == 0) return column->empty;
    uint32_t code = bali_label_codes_find(&column->labels, cell->text, cell->length);
    if (code != BALI_NO_CODE) return code < column->n_outcomes ? code : column->outcomes[code - column->n_outcomes];
    if (bali_table_columns_missing(columns, cell)) return BALI_MISSING;
    double number;
    if (!column->cuts || !bali_number_read(cell->text, cell->length, &number)) return BALI_UNKNOWN;
    return bali_cuts_outcome(column->cuts, column->n_cuts, number);
}

#endif
