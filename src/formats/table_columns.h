/* The wanted columns of a table, and the codes of their cells. */
#ifndef FORMATS_TABLE_COLUMNS_H
#define FORMATS_TABLE_COLUMNS_H

#include "formats/csv.h"
#include "formats/label_codes.h"
#include "formats/table_header.h"

/* What a cell is when it is none of the outcomes, of which there are fewer. Cut to one byte or two, BALI_MISSING is that
 * width's code of a missing cell. */
enum { BALI_MISSING = UINT16_MAX, BALI_UNKNOWN };

typedef struct bali_table_column {
    size_t variable;
    const char *name; /* of the variable, and so of the column */
    size_t name_length;
    bali_label_codes labels;
    bool name_unknown; /* its own name is neither an outcome nor a spelling of a missing cell */
    bool contested;    /* an outcome is also a spelling of a missing cell */
    void *codes;       /* one a record of the block */
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

/** Returns false when there is no memory. */
bool bali_table_columns_create(bali_table_columns *columns, const bal_domain *domain, const bali_table_header *header,
                               const bal_table_options *options);
void bali_table_columns_free(bali_table_columns *columns);

/** Whether a text, which stands in a cell, spells a missing one. */
static inline bool bali_table_columns_missing(const bali_table_columns *columns, const bali_csv_cell *cell) {
    return cell->length == 0 || bali_label_codes_find(&columns->missing, cell->text, cell->length) != BALI_NO_CODE;
}

/** The outcome of a cell, BALI_MISSING or BALI_UNKNOWN. An outcome wins over a spelling of a missing cell. */
static inline size_t bali_table_columns_code(const bali_table_columns *columns, const bali_table_column *column,
                                             const bali_csv_cell *cell) {
    if (cell->length == 0) return BALI_MISSING;
    uint32_t code = bali_label_codes_find(&column->labels, cell->text, cell->length);
    if (code != BALI_NO_CODE) return code;
    return bali_table_columns_missing(columns, cell) ? BALI_MISSING : BALI_UNKNOWN;
}

#endif
