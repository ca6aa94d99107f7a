/* A network with the cells and properties a file carried: what formats read and write. */
#ifndef MODEL_DOCUMENT_H
#define MODEL_DOCUMENT_H

#include "ballast/formats.h"

/** One PROPERTY text, as it stood in the file. */
typedef struct bali_property {
    bal_property_of of;
    size_t variable; /* BAL_NONE for the network */
    char *text;
} bali_property;

/** All properties in the order they were added, Ballast's own that are plain text (provenance) included, but not
 *  ballast.counts, ballast.pseudo-counts and ballast.row-ess, which are kept as numbers. */
const bali_property *bali_document_properties(const bal_document *document, size_t *n);

/** Adds a property text; every text is copied. */
BAL_MUST_CHECK bal_status bali_document_add_property(bal_document *document, bal_property_of of, size_t variable,
                                                     const char *text, size_t length, bal_error *err);

/**
 * Puts a copy of tables in of which only some families were given in the file (given[v]); the others' cells are not
 * looked at. bal_document_cells(BAL_CARRIED_TABLES) answers only once every family was given.
 */
BAL_MUST_CHECK bal_status bali_document_set_tables(bal_document *document, const bal_cells *tables, const bool *given,
                                                   bal_error *err);
/** The cells of a family's TABLE, or NULL when it was not given. */
const double *bali_document_table(const bal_document *document, size_t variable);

/** row_ess: one number a row of the variable, copied. */
BAL_MUST_CHECK bal_status bali_document_set_row_ess(bal_document *document, size_t variable, const double *row_ess,
                                                    bal_error *err);

/** The value of a text "name = value" (blanks around both are skipped), or NULL when its name is another. */
const char *bali_property_value(const char *text, const char *name);

#endif
