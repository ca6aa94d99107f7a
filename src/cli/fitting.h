/* What every command that fits does: a network, a prior, data, a fit, and records held out. */
#ifndef CLI_FITTING_H
#define CLI_FITTING_H

#include "cli/inputs.h"

/** One fit and what it was made from. Start it with = {0}; bali_fitting_free in any case. */
typedef struct bali_fitting {
    bali_inputs inputs;
    bal_prior_options prior_options;
    bal_prior *prior;
    bal_cells *counts; /* of DATA, and the earlier ones under a carried prior */
    bal_fit *fit;
    bal_other_prior others[BAL_PRIOR_KINDS];
    bal_heldout_options heldout_options;
    bal_heldout heldout;
    bali_fit_facts facts;
} bali_fitting;

/** Reads the network and the options that say how to fit. Fails: as the reading does; ARGUMENT. */
BAL_MUST_CHECK bal_status bali_fitting_prepare(const bali_call *call, bali_console *console, bali_fitting *fitting, bal_error *err);

/** Reads the data, fits, tries the other priors, holds records out. Fails: as these do. */
BAL_MUST_CHECK bal_status bali_fitting_compute(const bali_call *call, bali_fitting *fitting, bal_error *err);

void bali_fitting_free(bali_fitting *fitting);

#endif
