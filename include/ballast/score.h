/* Scores of prior and counts, from the counts alone. */
#ifndef BALLAST_SCORE_H
#define BALLAST_SCORE_H

#include "ballast/network.h"

#ifdef __cplusplus
extern "C" {
#endif

/**
 * Log marginal likelihood of one family's counts under its Dirichlet prior.
 *
 *   sum_j [ sum_k ln (alpha_jk)_{n_jk}  -  ln (alpha_j)_{N_j} ]      (a)_n = rising factorial
 *
 * pseudo_counts  q x r; records, >= 0; a zero is a structural zero and must have count 0
 * counts         q x r; records, >= 0
 * score_nats     nats; <= 0 for whole counts; untouched on failure
 *
 * Fails:  DATA when a count is not 0 in a structural zero (the message names row and cell);
 *         ARGUMENT when a number is negative or not finite; NUMERIC when the sum is not finite.
 * Cost:   O(q r), no allocation. Safe from several threads.
 * Source: Cooper & Herskovits, Machine Learning 9 (1992) 309-347; Heckerman, Geiger & Chickering 1995.
 */
BAL_API BAL_MUST_CHECK bal_status bal_log_marginal_likelihood(const bal_cells *pseudo_counts, const bal_cells *counts,
                                                              size_t variable, double *score_nats, bal_error *err);

/**
 * Leave-one-out log-likelihood of one family: every record predicted from all the others.
 *
 *   sum_jk n_jk ln [ (alpha_jk + n_jk - 1) / (alpha_j + N_j - 1) ]
 *
 * Shapes, failures and cost as above; counts must be whole.
 * Source: direct; Geisser, JASA 70 (1975) 320-328 for the idea.
 */
BAL_API BAL_MUST_CHECK bal_status bal_leave_one_out(const bal_cells *pseudo_counts, const bal_cells *counts,
                                                    size_t variable, double *score_nats, bal_error *err);

/** Both scores summed over all families. */
typedef struct bal_scores {
    double log_marginal_likelihood; /* nats */
    double leave_one_out;           /* nats */
} bal_scores;
BAL_API BAL_MUST_CHECK bal_status bal_score(const bal_cells *pseudo_counts, const bal_cells *counts, bal_scores *out,
                                            bal_error *err);

#ifdef __cplusplus
}
#endif
#endif
