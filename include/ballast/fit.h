/* A fit: a prior, its strength settled, and counts, as tables and scores. */
#ifndef BALLAST_FIT_H
#define BALLAST_FIT_H

#include "ballast/prior.h"
#include "ballast/score.h"

#ifdef __cplusplus
extern "C" {
#endif

typedef struct bal_fit {
    bal_strength strength;
    bal_cells *counts;        /* copies of what went in */
    bal_cells *pseudo_counts; /* at the settled strength */
    bal_cells *mean;          /* posterior means */
    bal_scores scores;        /* over all families; leave-one-out at the settled prior, NaN when some count is not whole */
    double *family_scores;    /* log marginal likelihood of each family, nats */
    double records;           /* of the first family */
} bal_fit;

/**
 * Settles the prior on the counts and computes the posterior means and scores.
 *
 * Fails:  DATA "structural-zero" when a count falls where the prior has none, and "fractional-weight" as bal_prior_settle does;
 *         NUMERIC; MEMORY.
 * Cost:   O(cells), and what settling the prior costs.
 */
BAL_API BAL_MUST_CHECK bal_status bal_fit_create(const bal_prior *prior, const bal_cells *counts, bal_fit **out, bal_error *err);
BAL_API void bal_fit_free(bal_fit *fit);

/** What another prior would have given. */
typedef struct bal_other_prior {
    bal_prior_kind kind;
    double strength;      /* the ESS of BDEU, chosen by the marginal likelihood; 1 for the others */
    double leave_one_out; /* nats, all records; NaN when some count is not whole */
} bal_other_prior;

#define BAL_PRIOR_KINDS 5

/**
 * Leave-one-out of every prior but one and CARRIED, on the same counts. EXPERT is among them when a document is given whose tables and row ESS
 * can serve.
 *
 * used    the kind to leave out
 * expert  options of an expert prior to try, or NULL
 * out     at most BAL_PRIOR_KINDS, *n of them filled
 *
 * Fails:  MEMORY, NUMERIC. A prior that the counts contradict is left out.
 */
BAL_API BAL_MUST_CHECK bal_status bal_other_priors(const bal_network *network, const bal_cells *counts, bal_prior_kind used,
                                                   const bal_prior_options *expert, bal_other_prior *out, size_t *n, bal_error *err);

#ifdef __cplusplus
}
#endif
#endif
