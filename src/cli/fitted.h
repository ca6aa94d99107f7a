/* The fitted network as a document: tables, counts, pseudo-counts, provenance. */
#ifndef CLI_FITTED_H
#define CLI_FITTED_H

#include "cli/inputs.h"

/** The network's document with what the fit found in it. Fails: MEMORY. */
BAL_MUST_CHECK bal_status bali_fitted_document(const bali_fit_facts *facts, const bali_inputs *inputs, bal_document **out,
                                                bal_error *err);

#endif
