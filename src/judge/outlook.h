/* What one training part says about every cell: Bayes, maximum likelihood (ML) and the prior alone. */
#ifndef JUDGE_OUTLOOK_H
#define JUDGE_OUTLOOK_H

#include "ballast/prior.h"

typedef enum bali_ml_view { BALI_ML_COMPARABLE = 0, BALI_ML_UNDEFINED = 1, BALI_ML_IMPOSSIBLE = 2 } bali_ml_view;

/** How a record that needs this cell is predicted there. */
typedef struct bali_outlook {
    double log_bayes, log_prior;           /* nats; -infinity in a structural zero */
    double log_ml;                         /* nats; 0 unless comparable */
    double quadratic_bayes, quadratic_ml;  /* sum_k (p_k - 1[k])^2; ML's undefined rows taken as uniform */
    bali_ml_view ml;
} bali_outlook;

/**
 * Fits to a training part and fills one outlook a cell of all families.
 *
 * training  counts of the training part
 * strength  the prior's strength, settled on the training part alone
 *
 * Fails: MEMORY, NUMERIC.
 */
BAL_MUST_CHECK bal_status bali_outlook_fill(const bal_prior *prior, const bal_cells *training, bali_outlook *cells,
                                            bal_strength *strength, bal_error *err);

#endif
