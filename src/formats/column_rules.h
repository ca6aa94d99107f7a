/* What a network's own properties say of the columns of its tables: ballast.column and ballast.cuts. */
#ifndef FORMATS_COLUMN_RULES_H
#define FORMATS_COLUMN_RULES_H

#include "base/names.h"
#include "ballast/formats.h"

#define BALI_COLUMN_PROPERTY "ballast.column"
#define BALI_CUTS_PROPERTY "ballast.cuts"

/** Start it with = {0}. */
typedef struct bali_column_rules {
    size_t n_variables;
    char **columns;  /* one a variable: the name of its column where it differs, else NULL */
    double **cuts;   /* one a variable: ascending, one less than outcomes; NULL where the column holds labels */
    bali_names named; /* those names, without repetition */
    size_t *variables; /* the variable of each of them */
} bali_column_rules;

/**
 * Reads the properties of all variables.
 *
 * document  NULL = no rules
 *
 * Fails:  DATA "bad-column", "bad-cuts" with the variable; ARGUMENT "other-network" when the document follows another domain;
 *         MEMORY.
 */
BAL_MUST_CHECK bal_status bali_column_rules_read(bali_column_rules *rules, const bal_domain *domain, const bal_document *document,
                                                 bal_error *err);
void bali_column_rules_free(bali_column_rules *rules);

/** The variable that says its column has this name, or BAL_NONE. */
size_t bali_column_rules_find(const bali_column_rules *rules, const char *name, size_t length);
/** The name of a variable's column where it differs, or NULL. */
const char *bali_column_rules_column(const bali_column_rules *rules, size_t variable);

/** The outcome of a number: how many of the n cuts are not above it. */
size_t bali_cuts_outcome(const double *cuts, size_t n, double number);

#endif
