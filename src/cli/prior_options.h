/* From --prior, --ess, --scale, --row-ess and --prior-floor to the prior that is wanted. */
#ifndef CLI_PRIOR_OPTIONS_H
#define CLI_PRIOR_OPTIONS_H

#include "ballast.h"
#include "cli/options.h"

/**
 * The expert's document is left NULL: an option that does not fit is refused before anything is read.
 *
 * Fails: ARGUMENT when an option does not go with the prior.
 */
BAL_MUST_CHECK bal_status bali_prior_options_read(const bali_call *call, bal_prior_options *options, bal_error *err);

#endif
