/* What a network file says, before its names are resolved: every statement with its place. */
#ifndef FORMATS_DRAFT_H
#define FORMATS_DRAFT_H

#include "ballast/formats.h"
#include "formats/number_list.h"
#include "formats/remarks.h"

/** A name or a label, and where its element begins; text is NULL when there is none. */
typedef struct bali_draft_text {
    char *text;
    size_t at;
} bali_draft_text;

typedef struct bali_draft_variable {
    size_t at;
    bali_draft_text name;
    size_t first_outcome, n_outcomes; /* in the draft's outcomes */
} bali_draft_variable;

/** The lists of numbers that a definition may have. */
typedef enum bali_draft_list {
    BALI_LIST_TABLE,
    BALI_LIST_COUNTS,
    BALI_LIST_PSEUDO_COUNTS,
    BALI_LIST_ROW_ESS,
    BALI_N_LISTS
} bali_draft_list;

typedef struct bali_draft_definition {
    size_t at;
    bali_draft_text child;
    size_t first_parent, n_parents; /* in the draft's parents */
    bali_number_list lists[BALI_N_LISTS];
} bali_draft_definition;

typedef struct bali_draft_property {
    bal_property_of of;
    size_t owner; /* which variable or definition of the draft; 0 for the network */
    size_t at;
    char *text;
    size_t length;
} bali_draft_property;

typedef struct bali_draft_texts {
    bali_draft_text *texts;
    size_t n, capacity;
} bali_draft_texts;

/** Start with = {.xml = ...}. */
typedef struct bali_draft {
    bali_xml *xml;
    bali_draft_text name;
    bali_draft_texts outcomes, parents; /* of all variables, of all definitions, one after another */
    bali_draft_variable *variables;
    size_t n_variables, variable_capacity;
    bali_draft_definition *definitions;
    size_t n_definitions, definition_capacity;
    bali_draft_property *properties;
    size_t n_properties, property_capacity;
} bali_draft;

/** One more variable or definition at an offset, the last of its array; NULL when there is no memory. */
bali_draft_variable *bali_draft_add_variable(bali_draft *draft, size_t at);
bali_draft_definition *bali_draft_add_definition(bali_draft *draft, size_t at);
/** One more outcome or parent of the last variable or definition; the text is taken. False when there is no memory. */
bool bali_draft_add_outcome_take(bali_draft *draft, bali_draft_text outcome);
bool bali_draft_add_parent_take(bali_draft *draft, bali_draft_text parent);
void bali_draft_free(bali_draft *draft);

/** The name of a list as it stands in messages and files: "TABLE", "ballast.counts", ... */
const char *bali_draft_list_name(bali_draft_list which);

/**
 * Fails with code and message at an offset of the draft's file.
 * variable  may be NULL
 */
bal_status bali_draft_fail(const bali_draft *draft, size_t at, const char *variable, const char *code, bal_error *err,
                           const char *format, ...) BAL_FORMAT(6, 7);

/** Fails for a name that is empty, too long, or holds a control character: the rules of bal_domain_create, with a place.
 *  what is the element that holds it; variable may be NULL. */
BAL_MUST_CHECK bal_status bali_draft_check_name(const bali_draft *draft, const char *what, const char *name,
                                                size_t length, size_t at, const char *variable, bal_error *err);

/**
 * Makes the document that a draft describes.
 *
 * Fails:  DATA with file, line and column for a name that is missing, unknown or given twice, a cycle, a list of the
 * wrong length, a row that does not sum to 1; MEMORY. Cost:   O(text + cells).
 */
BAL_MUST_CHECK bal_status bali_draft_resolve(const bali_draft *draft, const bal_network_options *options,
                                             bali_remarks *remarks, bal_document **out, bal_error *err);

/**
 * Puts a draft's lists of numbers into its document; definition_of[v] is the definition of variable v, or NULL.
 * Fails as above.
 */
BAL_MUST_CHECK bal_status bali_draft_fill(const bali_draft *draft, const bali_draft_definition *const *definition_of,
                                          bool for_slowest, bali_remarks *remarks, bal_document *document,
                                          bal_error *err);

/** Checks what a draft's properties say of the columns of tables, which its document holds already. Fails: DATA "bad-column", "bad-cuts",
 *  "duplicate-property" with file, line and column; MEMORY. */
BAL_MUST_CHECK bal_status bali_draft_check_columns(const bali_draft *draft, const bal_document *document, bal_error *err);

#endif
