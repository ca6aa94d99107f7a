/* Variables, outcomes, parents, and tables of one double a cell. */
#ifndef BALLAST_NETWORK_H
#define BALLAST_NETWORK_H

#include "ballast/error.h"

#include <stdbool.h>

#ifdef __cplusplus
extern "C" {
#endif

#define BAL_DEFAULT_MAX_CELLS ((size_t)1 << 22)
#define BAL_LARGEST_MAX_CELLS ((size_t)1 << 28)
#define BAL_MAX_OUTCOMES ((size_t)65534)
#define BAL_MAX_NAME_BYTES ((size_t)255)

#define BAL_NONE ((size_t)-1) /* "no such index" */

/* A domain: categorical variables and their outcomes, in file order. Read-only once made. Domains and
 * networks count their holders: _free gives one hold back, in any order, from any thread. */
typedef struct bal_domain bal_domain;

/* A network: a domain, the parents of every variable, a topological order. Read-only once made. */
typedef struct bal_network bal_network;

/* One double a cell of every family of a network, in TABLE order: variables in domain order; within a
 * family the first parent slowest and the variable's own outcomes fastest. Tables, counts,
 * pseudo-counts and posterior means are all of this type. */
typedef struct bal_cells bal_cells;

typedef struct bal_variable_spec {
    const char *name;
    const char *const *outcomes;
    size_t n_outcomes;
} bal_variable_spec;

typedef struct bal_family_spec {
    const size_t *parents; /* variables, in the order of the table; NULL when n_parents is 0 */
    size_t n_parents;
} bal_family_spec;

/**
 * Makes a domain of n variables; every text is copied.
 *
 * Fails:  DATA when a name or an outcome is empty, longer than 255 bytes, not UTF-8, holds a control
 *         character or stands twice, when a variable has no outcome or more than 65,534, or n is 0;
 *         MEMORY. err->variable names the variable.
 * Cost:   O(total text).
 */
BAL_API BAL_MUST_CHECK bal_status bal_domain_create(const bal_variable_spec *variables, size_t n, bal_domain **out,
                                                    bal_error *err);
BAL_API void bal_domain_free(bal_domain *domain);

BAL_API size_t bal_domain_variables(const bal_domain *domain);
BAL_API const char *bal_domain_name(const bal_domain *domain, size_t variable);
BAL_API size_t bal_domain_outcomes(const bal_domain *domain, size_t variable);
BAL_API const char *bal_domain_outcome(const bal_domain *domain, size_t variable, size_t outcome);

/** The variable of that exact name, or BAL_NONE. O(1) on average. */
BAL_API size_t bal_domain_find(const bal_domain *domain, const char *name);
/** The outcome of that exact label, or BAL_NONE. O(1) on average. */
BAL_API size_t bal_domain_find_outcome(const bal_domain *domain, size_t variable, const char *label);

/**
 * Makes a network over a domain, which it shares (the caller keeps its own hold).
 *
 * families   one a variable, in domain order
 * max_cells  refuse more cells than this over all families; 0 means BAL_DEFAULT_MAX_CELLS, and more than
 *            BAL_LARGEST_MAX_CELLS means that
 *
 * Fails:  DATA for a cycle (the message gives it as a path; err->variable is on it), a parent named
 *         twice or out of range, more than max_cells cells (err->variable is the first family that
 *         goes over; sizes are multiplied with overflow checks, before anything is allocated);
 *         MEMORY.
 * Cost:   O(variables + arcs).
 */
BAL_API BAL_MUST_CHECK bal_status bal_network_create(const bal_domain *domain, const bal_family_spec *families,
                                                     size_t max_cells, bal_network **out, bal_error *err);
BAL_API void bal_network_free(bal_network *network);

BAL_API const bal_domain *bal_network_domain(const bal_network *network);
BAL_API size_t bal_network_variables(const bal_network *network);
BAL_API size_t bal_network_arcs(const bal_network *network);
/** Cells over all families. */
BAL_API size_t bal_network_cells(const bal_network *network);
/** sum over families of q_i (r_i - 1): cells that may vary when no cell is a structural zero. */
BAL_API size_t bal_network_free_parameters(const bal_network *network);

/** The parents of a variable in table order, n_parents many; borrowed. */
BAL_API const size_t *bal_network_parents(const bal_network *network, size_t variable, size_t *n_parents);
/** q: the number of parent configurations; 1 without parents. */
BAL_API size_t bal_network_rows(const bal_network *network, size_t variable);
/** r: the number of outcomes of the variable. */
BAL_API size_t bal_network_outcomes(const bal_network *network, size_t variable);
/** Where the family's first cell stands among the cells of all families. */
BAL_API size_t bal_network_offset(const bal_network *network, size_t variable);
/** Variables, parents before children; as many as there are variables; borrowed. */
BAL_API const size_t *bal_network_order(const bal_network *network);

/** The outcome of each parent (n_parents many, in table order) in a row; the inverse of _row. */
BAL_API void bal_network_configuration(const bal_network *network, size_t variable, size_t row, size_t *outcomes);
/** The row of a parent configuration; outcomes as above. */
BAL_API size_t bal_network_row(const bal_network *network, size_t variable, const size_t *outcomes);

/** Whether two networks have the same variables, outcomes and parents, all in the same order. */
BAL_API bool bal_network_equal(const bal_network *a, const bal_network *b);

/** Makes cells that are all 0; they share the network (its hold is kept until they are freed). */
BAL_API BAL_MUST_CHECK bal_status bal_cells_create(const bal_network *network, bal_cells **out, bal_error *err);
BAL_API BAL_MUST_CHECK bal_status bal_cells_copy(const bal_cells *from, bal_cells **out, bal_error *err);
BAL_API void bal_cells_free(bal_cells *cells);

BAL_API const bal_network *bal_cells_network(const bal_cells *cells);
/** The q x r cells of a family, to read. */
BAL_API const double *bal_cells_family(const bal_cells *cells, size_t variable);
/** The q x r cells of a family, to write. */
BAL_API double *bal_cells_edit(bal_cells *cells, size_t variable);

#ifdef __cplusplus
}
#endif
#endif
