/* Weighted records as the records they stand for. */
#ifndef MODEL_EXPANDED_H
#define MODEL_EXPANDED_H

#include "ballast/table.h"

/**
 * A view of a source in which a record of whole weight w is w records, each with its own place. A source whose blocks carry no weights
 * comes through as it is.
 *
 * source  borrowed: it lives longer than the view, and is gone over through it
 *
 * Fails:  MEMORY. Reading fails with DATA "fractional-weight" where a weight is not whole.
 */
BAL_MUST_CHECK bal_status bali_expanded_open(bal_source *source, bal_source **out, bal_error *err);

#endif
