/* Dirichlet priors: one pseudo-count a cell, and how strong the prior is. */
#ifndef BALLAST_PRIOR_H
#define BALLAST_PRIOR_H

#include "ballast/formats.h"
#include "ballast/network.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef enum bal_prior_kind {
    BAL_PRIOR_BDEU,     /* ESS / (q r): Buntine 1991; Heckerman, Geiger & Chickering 1995 */
    BAL_PRIOR_K2,       /* 1: Cooper & Herskovits 1992 */
    BAL_PRIOR_JEFFREYS, /* 1/2: Jeffreys 1946 */
    BAL_PRIOR_EXPERT,   /* row ESS x the expert's probability */
    BAL_PRIOR_CARRIED   /* the pseudo-counts of an earlier fit */
} bal_prior_kind;

/* Where the strength (the ESS of BDeu, the scale of the others) comes from. */
typedef enum bal_strength_choice {
    BAL_STRENGTH_GIVEN,
    BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD, /* the largest log marginal likelihood */
    BAL_STRENGTH_BY_LEAVE_ONE_OUT        /* the largest leave-one-out log-likelihood */
} bal_strength_choice;

/** What prior is wanted. Start from bal_prior_options_defaults(): BDeu with the ESS of the largest log
 *  marginal likelihood. */
typedef struct bal_prior_options {
    bal_prior_kind kind;
    bal_strength_choice choice;
    double strength;             /* records: the ESS of BDeu, else the factor on every pseudo-count; > 0, finite */
    const bal_document *expert;  /* EXPERT: whose tables and row ESS are used; borrowed during _create */
    const bal_document *carried; /* CARRIED: whose pseudo-counts are used; borrowed during _create */
    double row_ess;              /* EXPERT: cases that every row is worth; 0 = each row's ballast.row-ess */
    double floor;                /* EXPERT: share of the uniform row mixed into every row, in [0, 1) */
} bal_prior_options;
BAL_API bal_prior_options bal_prior_options_defaults(void);

/* A prior whose strength may still have to be chosen from counts. Read-only once made. */
typedef struct bal_prior bal_prior;

/**
 * Makes a prior for a network.
 *
 * Fails:  ARGUMENT for a strength, row ESS or floor out of range, for EXPERT without a
 *         row ESS (err->variable says where), and for CARRIED without pseudo-counts; DATA when the expert's document lacks tables or
 *         holds pseudo-counts, so that its tables are fitted ones, when a document is over another network, and when
 *         the carried pseudo-counts of a row are all 0 (err->variable says where); MEMORY.
 */
BAL_API BAL_MUST_CHECK bal_status bal_prior_create(const bal_network *network, const bal_prior_options *options,
                                                   bal_prior **out, bal_error *err);
BAL_API void bal_prior_free(bal_prior *prior);
BAL_API bal_prior_kind bal_prior_kind_of(const bal_prior *prior);
BAL_API bal_strength_choice bal_prior_choice(const bal_prior *prior);
/** "bdeu", "k2", "jeffreys", "expert", "carried". */
BAL_API const char *bal_prior_kind_name(bal_prior_kind kind);

/**
 * Refuses counts that fall in a structural zero of the prior.
 *
 * source  may be NULL; else it is rewound and gone over, if it can be, to name the first such record
 *
 * Fails:  DATA "structural-zero" with variable, cell and, where it was found, file, line and record; MEMORY.
 */
BAL_API BAL_MUST_CHECK bal_status bal_prior_check(const bal_prior *prior, const bal_cells *counts, bal_source *source,
                                                  bal_error *err);

/* The bounds and the number of points of the grid on which a strength is chosen, log-spaced. */
#define BAL_STRENGTH_LEAST 0.01
#define BAL_STRENGTH_MOST 10000.0
#define BAL_STRENGTH_POINTS 61

/** A strength, and how it came about. */
typedef struct bal_strength {
    double value;  /* records (ESS) or a factor (scale); a chosen one is rounded to three significant digits */
    bool chosen;   /* from the counts; false when it was given, and when the counts say nothing about it */
    int at_end;    /* -1 or +1 when the best lies at the lower or upper end of the grid, else 0 */
} bal_strength;

/**
 * Settles the prior's strength: the one given, or the best for these counts on a log grid of 61 points
 * from 0.01 to 10000, refined to 1e-4 in its logarithm, and rounded to three significant digits. Without
 * records, and where every strength scores the same (a single record), a strength to be chosen is 1.
 *
 * Fails:  NUMERIC when no strength has a finite score; DATA "fractional-weight" for BY_LEAVE_ONE_OUT when some count is not
 *         whole; MEMORY.
 * Cost:   O(61 x distinct counts of a family) for BDEU, K2 and JEFFREYS, O(61 x cells) for EXPERT; none for CARRIED, whose strength is 1.
 */
BAL_API BAL_MUST_CHECK bal_status bal_prior_settle(const bal_prior *prior, const bal_cells *counts,
                                                   bal_strength *strength, bal_error *err);

/**
 * The pseudo-counts at a strength. Zero only where an expert's table or a carried pseudo-count is zero: a structural zero.
 *
 * pseudo_counts  cells of the prior's network, overwritten
 */
BAL_API void bal_prior_fill(const bal_prior *prior, double strength, bal_cells *pseudo_counts);

#ifdef __cplusplus
}
#endif
#endif
