/* Structural zeros: cells that a prior calls impossible. */
#ifndef LEARN_ZEROS_H
#define LEARN_ZEROS_H

#include "ballast/network.h"

/** Records the failure "a record falls in a cell the prior calls impossible". */
bal_status bali_refuse_zero(const bal_network *network, size_t variable, size_t cell, bal_error *err);

#endif
