/* What prior and counts together say about a cell, a row, a family. */
#ifndef BALLAST_POSTERIOR_H
#define BALLAST_POSTERIOR_H

#include "ballast/network.h"

#ifdef __cplusplus
extern "C" {
#endif

/**
 * Posterior means, which are the predictive probabilities: (alpha_ijk + n_ijk) / (alpha_ij + N_ij).
 *
 * Only + and / are used, in a fixed order, so that the tables are the same bytes everywhere.
 *
 * pseudo_counts, counts  cells of one network; counts may be NULL (no record)
 * mean                   overwritten; may be the same cells as neither input
 *
 * Source: Heckerman, Geiger & Chickering, Machine Learning 20 (1995) 197-243.
 */
BAL_API void bal_posterior_mean(const bal_cells *pseudo_counts, const bal_cells *counts, bal_cells *mean);

/**
 * Maximum likelihood: n_ijk / N_ij; a row without records is uniform.
 * undefined_rows  may be NULL; gets how many rows were without records
 */
BAL_API void bal_maximum_likelihood(const bal_cells *counts, bal_cells *tables, size_t *undefined_rows);

/**
 * Equal-tailed credible interval of one cell: the (1 - level)/2 and (1 + level)/2 quantiles of
 * Beta(a, b), a = alpha_ijk + n_ijk, b = the rest of its row.
 *
 * a, b   > 0, finite;  level in (0, 1)
 * Exact to 1e-10 for shapes from 1e-6 to 1e9; 0 and 1 are right answers where the quantile is closer to
 * them than a double can say.
 *
 * Fails:  ARGUMENT for values out of range; NUMERIC when a quantile cannot be found. Outputs untouched.
 * Source: the marginal of a Dirichlet distribution is a Beta distribution.
 */
BAL_API BAL_MUST_CHECK bal_status bal_credible_interval(double a, double b, double level, double *low, double *high,
                                                        bal_error *err);

/** What a row rests on: no record, 1 to 4 of them, more. */
typedef enum bal_basis { BAL_BASIS_PRIOR, BAL_BASIS_FEW, BAL_BASIS_DATA } bal_basis;
BAL_API bal_basis bal_row_basis(double records);
/** "prior", "few", "data". */
BAL_API const char *bal_basis_name(bal_basis basis);

/** N_ij / (alpha_ij + N_ij); 0 when both are 0. */
BAL_API double bal_data_share(double pseudo_records, double records);

#ifdef __cplusplus
}
#endif
#endif
