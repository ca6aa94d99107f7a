/* Files in and out: networks with what they carry, and tables of records. */
#ifndef BALLAST_FORMATS_H
#define BALLAST_FORMATS_H

#include "ballast/table.h"

#ifdef __cplusplus
extern "C" {
#endif

/* A document: a network, its name, and the cells and properties a file carried. */
typedef struct bal_document bal_document;

/* Cells that a document may carry, each over the whole network or not at all. */
typedef enum bal_carried {
    BAL_CARRIED_TABLES,       /* conditional probability tables; every row sums to 1 */
    BAL_CARRIED_COUNTS,       /* a tally: ballast.counts */
    BAL_CARRIED_PSEUDO_COUNTS /* the prior that was used: ballast.pseudo-counts */
} bal_carried;

/** A document of a bare network, which it shares. name may be NULL. Fails: MEMORY. */
BAL_API BAL_MUST_CHECK bal_status bal_document_create(const bal_network *network, const char *name, bal_document **out,
                                                      bal_error *err);
/** The same network, name, cells and properties again. Fails: MEMORY. */
BAL_API BAL_MUST_CHECK bal_status bal_document_copy(const bal_document *from, bal_document **out, bal_error *err);
BAL_API void bal_document_free(bal_document *document);

BAL_API const bal_network *bal_document_network(const bal_document *document);
/** The network's name; "" when it has none. */
BAL_API const char *bal_document_name(const bal_document *document);

/** The cells of a kind, borrowed; NULL when the document has none. */
BAL_API const bal_cells *bal_document_cells(const bal_document *document, bal_carried what);
/** Puts a copy of the cells in, in place of what was there; NULL takes them out. Fails: MEMORY; ARGUMENT
 *  when the cells are of another network. */
BAL_API BAL_MUST_CHECK bal_status bal_document_set_cells(bal_document *document, bal_carried what,
                                                         const bal_cells *cells, bal_error *err);

/** ballast.row-ess of a variable: how many cases each of its q rows is worth; NULL when not given. */
BAL_API const double *bal_document_row_ess(const bal_document *document, size_t variable);

/**
 * A property of the network (variable = BAL_NONE), of a VARIABLE, or of a DEFINITION by its name, such as
 * "ballast.records": the text after "name =", or NULL.
 */
typedef enum bal_property_of { BAL_OF_NETWORK, BAL_OF_VARIABLE, BAL_OF_DEFINITION } bal_property_of;
BAL_API const char *bal_document_property(const bal_document *document, bal_property_of of, size_t variable,
                                          const char *name);
/** Sets, replaces or (value NULL) removes such a property. Fails: MEMORY. */
BAL_API BAL_MUST_CHECK bal_status bal_document_set_property(bal_document *document, bal_property_of of,
                                                            size_t variable, const char *name, const char *value,
                                                            bal_error *err);

/** How a network file is read. Start from bal_network_options_defaults(). */
typedef struct bal_network_options {
    size_t max_cells;           /* 0 = BAL_DEFAULT_MAX_CELLS */
    bool for_slowest;           /* TABLE numbers run with the outcomes of FOR slowest */
    const bal_notices *notices; /* warnings: rows renormalised, an external DTD left alone, ... */
} bal_network_options;
BAL_API bal_network_options bal_network_options_defaults(void);

/** A file as provenance needs it. */
typedef struct bal_file_facts {
    char name[256];    /* base name */
    uint64_t bytes;
    char sha256[65];   /* hexadecimal; "" when it was not taken */
} bal_file_facts;

/**
 * Reads a network file (XMLBIF 0.3).
 *
 * facts  may be NULL
 *
 * Fails:  IO when the file cannot be opened or read; SYNTAX when it is not well formed or is not the
 *         expected format; DATA when what it says cannot be; MEMORY. Always with file, and with line
 *         and column where they are known.
 * Cost:   the whole file is held in memory (at most 512 MiB).
 * Source: the Interchange Format for Bayesian Networks, XMLBIF 0.3 (1998).
 */
BAL_API BAL_MUST_CHECK bal_status bal_document_read(const char *path, const bal_network_options *options,
                                                    bal_document **out, bal_file_facts *facts, bal_error *err);

/**
 * Writes a document as XMLBIF 0.3 in UTF-8. The file is complete or untouched.
 * Reading it back gives an equal document, and writing that the same bytes.
 *
 * Fails:  IO, MEMORY.
 */
BAL_API BAL_MUST_CHECK bal_status bal_document_write(const bal_document *document, const char *path, bal_error *err);

/** The same as text: *text has a NUL behind its *length bytes and is given back with bal_text_free. Fails: MEMORY. */
BAL_API BAL_MUST_CHECK bal_status bal_document_print(const bal_document *document, char **text, size_t *length, bal_error *err);
BAL_API void bal_text_free(char *text);

/* What a missing cell means. */
typedef enum bal_missing {
    BAL_MISSING_STOP,  /* refuse the table, saying how many are missing in each column and where the first is */
    BAL_MISSING_DROP,  /* leave out records in which a wanted cell is missing */
    BAL_MISSING_FAMILY /* give them with their missing cells, to be counted in every family they are complete for */
} bal_missing;

/* How a table spells outcomes: a codebook's lines (variable, outcome, code). Read-only once read. */
typedef struct bal_codebook bal_codebook;

/**
 * Reads a codebook: a CSV with the columns variable, outcome and code, one line a spelling; an empty code is the empty cell.
 *
 * facts  may be NULL
 *
 * Fails:  IO, SYNTAX and MEMORY as a table does; DATA for an unknown variable or outcome, or a code that stands for two outcomes
 *         of one variable, with file, line and column.
 */
BAL_API BAL_MUST_CHECK bal_status bal_codebook_read(const bal_domain *domain, const char *path, const bal_notices *notices,
                                                    bal_codebook **out, bal_file_facts *facts, bal_error *err);
BAL_API void bal_codebook_free(bal_codebook *codebook);

/* The labels of a fold column, numbered by first appearance, over all tables that share the object. */
typedef struct bal_groups bal_groups;
BAL_API BAL_MUST_CHECK bal_status bal_groups_create(bal_groups **out, bal_error *err);
BAL_API void bal_groups_free(bal_groups *groups);

/** How a table is read. Start from bal_table_options_defaults(). What it points to outlives the source: the table may be opened
 *  again to be read in parts. */
typedef struct bal_table_options {
    char delimiter;             /* 0 = tab for .tsv or a tab in the header, else comma */
    bool strict;                /* refuse columns that no variable has */
    bool allow_absent;          /* a variable without a column is missing everywhere, instead of a refusal */
    bool redact;                /* messages show no cell's text */
    bal_missing missing;
    const char *weight;         /* the column of case weights; NULL = every weight is 1 */
    const char *fold_column;    /* the column whose labels are blocks' groups; NULL = none */
    bal_groups *groups;         /* where they are numbered; needed with fold_column; outlives the source */
    const bal_codebook *codebook; /* further spellings of outcomes, or NULL; outlives the source */
    const bal_document *document; /* whose ballast.column and ballast.cuts are used, or NULL; outlives the source */
    const char *const *missing_labels; /* further spellings of a missing cell */
    size_t n_missing_labels;
    const bool *wanted;         /* one a variable of the domain: which columns are wanted; NULL = all */
    const bal_notices *notices;
} bal_table_options;
BAL_API bal_table_options bal_table_options_defaults(void);

/**
 * Opens a table (CSV by RFC 4180, with a header; gzip by its first bytes) as a source of blocks over a domain.
 * Nothing but the header is read yet.
 *
 * path   "-" is standard input
 *
 * Fails:  as bal_source_next, and DATA when the header lacks a wanted variable or holds a name twice.
 * Cost:   memory does not depend on the number of records.
 * Source: RFC 4180 (2005) for the quotes.
 */
BAL_API BAL_MUST_CHECK bal_status bal_table_open(const bal_domain *domain, const char *path,
                                                 const bal_table_options *options, bal_source **out, bal_error *err);

/** Facts of the file behind a source that bal_table_open gave, complete after a whole pass: its SHA-256 is taken
 *  up to 8 MiB. All empty for other sources. */
BAL_API void bal_table_facts(const bal_source *source, bal_file_facts *facts);

#ifdef __cplusplus
}
#endif
#endif
