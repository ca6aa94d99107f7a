/* The header of a table: its names, and the variable that each column holds. */
#ifndef FORMATS_TABLE_HEADER_H
#define FORMATS_TABLE_HEADER_H

#include "formats/column_rules.h"
#include "formats/csv.h"

#define BALI_MOST_COLUMNS ((size_t)1 << 20)
#define BALI_MOST_HEADER_BYTES ((size_t)1 << 25)

/** Start it with = {0}. */
typedef struct bali_table_header {
    size_t n_columns, capacity;
    char **names;
    size_t *variables;    /* the variable of each column, or BAL_NONE */
    const char **ignored; /* names of the columns that no variable has; borrowed from names */
    size_t n_ignored;
    size_t line; /* where it begins */
    size_t weight, group; /* the columns of weights and of the fold column's labels, or BAL_NONE */
} bali_table_header;

/**
 * Reads the first record and binds its columns to the variables of that exact name, or of that name by ballast.column, which wins
 * where a variable has both. Tells a warning of the columns that are of no use.
 *
 * Fails:  as bali_csv_next; SYNTAX "no-header"; DATA "comment-line", "empty-column", "duplicate-column", "missing-column",
 *         "unexpected-column", "wrong-delimiter", "too-many-columns"; MEMORY.
 */
BAL_MUST_CHECK bal_status bali_table_header_read(bali_table_header *header, bali_csv *csv, const bal_domain *domain,
                                                 const bali_column_rules *rules, const bal_table_options *options, bal_error *err);
void bali_table_header_free(bali_table_header *header);

#endif
